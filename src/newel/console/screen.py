"""Where a command speaks: results to stdout, everything else to stderr."""

from __future__ import annotations

import contextlib
import json
import math
import os
import sys
import warnings
from collections.abc import Iterator, Mapping
from io import StringIO
from typing import TYPE_CHECKING, Any, TextIO

from newel.errors import NewelWarning, OutputFailed

if TYPE_CHECKING:
    from rich.console import Console

__all__ = ["NobodyReads", "Screen", "plain"]


class NobodyReads(Exception):
    """Stdout is a pipe that its reader has closed: enough was seen."""


class _Page(StringIO):
    """What rich draws on in the place of a stream: it asks the stream what it is, and never writes to it."""

    def __init__(self, stream: TextIO) -> None:
        super().__init__()
        self._stream = stream

    @property
    def encoding(self) -> str:  # type: ignore[override]  # StringIO has None here
        return getattr(self._stream, "encoding", None) or "utf-8"

    def isatty(self) -> bool:
        return self._stream.isatty()

    def take(self) -> str:
        """Return what was drawn since the last time."""
        text = self.getvalue()
        self.seek(0)
        self.truncate()
        return text


class Screen:
    """The two streams of a command.

    Results are gathered as text and written at once, so that a pipe that is closed early is noticed here and
    nowhere else.

    Args:
        out: for results. err: for notices.
        settings: passed to `rich.console.Console`, such as `width`; by default what `out` can do.
    """

    def __init__(self, out: TextIO, err: TextIO, **settings: Any) -> None:
        self.out, self.err = out, err
        self._settings = settings
        self._page = _Page(out)
        self._console: Console | None = None
        self._said: set[str] = set()

    @classmethod
    def standard(cls) -> Screen:
        """Return the screen of this process; what its streams cannot encode is written as an escape."""
        for stream in (sys.stdout, sys.stderr):
            reconfigure = getattr(stream, "reconfigure", None)
            if reconfigure is not None:
                reconfigure(errors="backslashreplace")
        return cls(sys.stdout or StringIO(), sys.stderr or StringIO())

    @property
    def console(self) -> Console:
        """The console that draws; square brackets in labels and trees are not markup."""
        if self._console is None:
            from rich.console import Console

            usual = {"markup": False, "highlight": False, "emoji": False, "force_jupyter": False}
            self._console = Console(file=self._page, **{**usual, **self._settings})
        return self._console

    def draw(self, *things: Any) -> None:
        """Draw rich renderables, or texts, as results; the lines of a text stay as they are."""
        from rich.text import Text

        for thing in things:
            self.console.print(thing, soft_wrap=isinstance(thing, (str, Text)))
        self._put("\n".join(line.rstrip() for line in self._page.take().split("\n")))

    def write(self, text: str) -> None:
        """Write a text as a result, as it is."""
        self._put(text if text.endswith("\n") else text + "\n")

    def document(self, schema: str, data: Mapping[str, Any]) -> None:
        """Write one JSON document as the result; NaN and infinity are texts."""
        everything = {"schema": schema, **data}
        self.write(json.dumps(plain(everything), ensure_ascii=False, indent=1, allow_nan=False))

    def notice(self, text: str) -> None:
        """Write a text to stderr; where nobody can read it, nothing is said."""
        with contextlib.suppress(OSError, ValueError):
            self.err.write(text.rstrip("\n") + "\n")
            self.err.flush()

    def flush(self) -> None:
        """Hand over what was written. Raises NobodyReads or OutputFailed."""
        self._put("")

    def _put(self, text: str) -> None:
        try:
            self.out.write(text)
            self.out.flush()
        except BrokenPipeError:
            self._give_up()
            raise NobodyReads from None
        except OSError as error:
            self._give_up()
            raise OutputFailed("stdout", f"{error.strerror or error}; the result is not complete") from None

    def _give_up(self) -> None:
        """Keep the interpreter from complaining at its end that stdout is closed."""
        with contextlib.suppress(OSError, ValueError):
            descriptor = os.open(os.devnull, os.O_WRONLY)
            os.dup2(descriptor, self.out.fileno())
            os.close(descriptor)

    @contextlib.contextmanager
    def notices(self) -> Iterator[None]:
        """Show each warning of newel once, as a notice; other warnings are shown as usual."""
        with warnings.catch_warnings():
            usual = warnings.showwarning

            def show(
                message: Warning | str,
                category: type[Warning],
                filename: str,
                lineno: int,
                file: TextIO | None = None,
                line: str | None = None,
            ) -> None:
                if not issubclass(category, NewelWarning):
                    usual(message, category, filename, lineno, file, line)
                elif str(message) not in self._said:
                    self._said.add(str(message))
                    self.notice(f"notice: {message}")

            warnings.simplefilter("always", NewelWarning)
            warnings.showwarning = show
            yield

    @contextlib.contextmanager
    def model_prints_aside(self) -> Iterator[None]:
        """Send what a model's own code prints to stderr, so that stdout holds results alone."""
        with contextlib.redirect_stdout(self.err):
            yield


def plain(value: Any) -> Any:
    """Return a value as JSON has it: floats that are not finite, and what JSON lacks, as texts."""
    if isinstance(value, Mapping):
        return {str(key): plain(item) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [plain(item) for item in value]
    if isinstance(value, float):
        return float(value) if math.isfinite(value) else str(float(value))
    if value is None or isinstance(value, (bool, int, str)):
        return value
    return str(value)
