"""`newel export`: take a method's numbers away, in the language of the program that uses them."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace

from newel.console.lookup import method_name, registry_of
from newel.console.screen import Screen

__all__ = ["PASTE", "WHAT", "add", "run"]

WHAT = "Write a method as LaTeX, TOML, C, Fortran, Python or BibTeX."
PASTE = ("newel export kutta-4 --as latex", "newel export dormand-prince-5-4 --as c --with-step --digits 17")


def add(parser: ArgumentParser) -> None:
    """Add the method, the language and what it takes."""
    parser.add_argument("method", metavar="METHOD", help="a slug, or a file that ends in .toml")
    parser.add_argument(
        "--as",
        dest="language",
        required=True,
        metavar="LANGUAGE",
        help="latex, toml, c, fortran, python or bibtex",
    )
    parser.add_argument(
        "--digits", type=int, metavar="N", help="significant digits; exact numbers where it is left out"
    )
    parser.add_argument(
        "--with-step", action="store_true", help="add one step as a routine (c, fortran, python)"
    )
    parser.add_argument("--to", metavar="FILE", help="write to this file")
    parser.add_argument("--force", action="store_true", help="replace FILE if it is there")


def run(options: Namespace, screen: Screen) -> int:
    """Write the text to stdout or to a file."""
    from newel import export

    registry = registry_of(options)
    method = method_name(options.method, registry)
    text = export(method, options.language, options.digits, options.with_step, registry=registry)
    if options.to is not None:
        from newel.methods.text_file import write_text

        write_text(text, options.to, overwrite=options.force)
    if options.json:
        facts = {"method": options.method, "language": options.language, "digits": options.digits}
        facts |= {"with_step": options.with_step, "path": options.to, "text": text}
        screen.document("newel-export/1", facts)
    elif options.to is not None:
        screen.write(f"wrote {options.to}")
    else:
        screen.write(text)
    return 0
