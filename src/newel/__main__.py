"""`python -m newel` is the command `newel`."""

import sys

from newel.console.main import main

if __name__ == "__main__":
    sys.exit(main())
