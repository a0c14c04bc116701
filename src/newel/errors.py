"""Every error and warning that newel raises on purpose.

Each error is also the builtin that a caller would catch without knowing newel, and carries its facts as
attributes. The text follows one pattern: first what and the value, then what is kept, last what to do.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from newel.results.run import Run

__all__ = [
    "BadModel",
    "BadNumber",
    "BadRequest",
    "BadTableau",
    "ClashWarning",
    "MarchFailed",
    "MarchInterrupted",
    "NewelError",
    "NewelWarning",
    "NotKept",
    "NotProved",
    "NotRecovered",
    "OutputExists",
    "OutputFailed",
    "PluginWarning",
    "SlugTaken",
    "UnknownMethod",
    "UnknownName",
]


class NewelError(Exception):
    """The base of every error that newel raises on purpose.

    `exit_status` is what the `newel` command returns for it: 1 when the thing examined fell short,
    2 when the request was wrong.
    """

    exit_status: int = 2


class BadNumber(NewelError, ValueError):
    """A text is not one of the exact numbers that a tableau may hold.

    Attributes: `text`, `column` (counted from 1, or None), `reason`.
    """

    def __init__(self, text: str, reason: str, column: int | None = None) -> None:
        self.text, self.reason, self.column = text, reason, column
        shown = text if len(text) <= 60 else text[:57] + "…"
        place = "" if column is None else f" at column {column}"
        super().__init__(f"{shown!r}: {reason}{place}")


class BadTableau(NewelError, ValueError):
    """A tableau, or the file that holds it, breaks a rule of the format.

    Attributes: `file` (a path or slug), `key` (such as `matrix[5][2]`, or None), `reason`.
    """

    def __init__(self, reason: str, *, file: str | None = None, key: str | None = None) -> None:
        self.file, self.key, self.reason = file, key, reason
        super().__init__(": ".join(part for part in (file, key, reason) if part))


class NotProved(NewelError, ValueError):
    """A method was asked for whose claims do not hold.

    Attributes: `slug`, `verdict` (a `newel.methods.order_conditions.Verdict`).
    """

    exit_status = 1

    def __init__(self, message: str, *, slug: str, verdict: Any) -> None:
        self.slug, self.verdict = slug, verdict
        super().__init__(message)


class NotRecovered(NewelError, ValueError):
    """A step function is no explicit Runge–Kutta step, or cannot be read.

    Attribute: `reason`, such as "memory", "branch", "overwritten", "raises" or "never calls".
    """

    exit_status = 1

    def __init__(self, message: str, *, reason: str) -> None:
        self.reason = reason
        super().__init__(message)


class UnknownMethod(NewelError, LookupError):
    """No method has this slug. Attributes: `slug`, `near` (slugs close to it)."""

    def __init__(self, message: str, *, slug: str, near: tuple[str, ...] = ()) -> None:
        self.slug, self.near = slug, near
        super().__init__(message)


class UnknownName(NewelError, LookupError):
    """No controller, sink, file ending, label or guide has this name. Attributes: `kind`, `name`, `near`."""

    def __init__(self, message: str, *, kind: str, name: str, near: tuple[str, ...] = ()) -> None:
        self.kind, self.name, self.near = kind, name, near
        super().__init__(message)


class SlugTaken(NewelError, ValueError):
    """A slug already names another method. Attributes: `slug`, `origins` (where each comes from)."""

    def __init__(self, message: str, *, slug: str, origins: tuple[str, ...]) -> None:
        self.slug, self.origins = slug, origins
        super().__init__(message)


class BadModel(NewelError, ValueError):
    """A model, or a function that it holds, is not what a march needs.

    Attributes: `argument` (the argument or function concerned), `reason`.
    """

    def __init__(self, reason: str, *, argument: str | None = None) -> None:
        self.argument, self.reason = argument, reason
        super().__init__(reason)


class BadRequest(NewelError, ValueError):
    """The arguments of a call contradict each other or are out of range. Attribute: `argument`."""

    def __init__(self, reason: str, *, argument: str | None = None) -> None:
        self.argument = argument
        super().__init__(reason)


class NotKept(NewelError, LookupError):
    """A run is asked for states that none of its sinks kept in memory."""


class OutputExists(NewelError, FileExistsError):
    """A file is there already and was not to be overwritten. Attribute: `path`."""

    def __init__(self, path: str, remedy: str = "Give another name, or overwrite=True (--force).") -> None:
        self.path = path
        super().__init__(f"{path} exists already; nothing was written.\n  {remedy}")


class OutputFailed(NewelError, OSError):
    """A sink could not open, write or close its output.

    Attributes: `path`, `reason`, `run` (what was computed until then, or None where nothing was run).
    """

    exit_status = 1
    run: Run | None = None

    def __init__(self, path: str, reason: str) -> None:
        self.path, self.reason = path, reason
        super().__init__(f"{path}: {reason}")


class MarchFailed(NewelError, ArithmeticError):
    """A march could not go on. Attributes: `run` (all that was computed), `time` (where), `reason`."""

    exit_status = 1

    def __init__(self, message: str, *, run: Run, time: float, reason: str) -> None:
        self.run, self.time, self.reason = run, time, reason
        super().__init__(message)


class MarchInterrupted(KeyboardInterrupt):
    """Ctrl-C stopped a march; its sinks are closed. Attribute: `run` (all that was computed)."""

    exit_status = 3

    def __init__(self, message: str, *, run: Run) -> None:
        self.run = run
        super().__init__(message)


class NewelWarning(UserWarning):
    """The base of every warning that newel gives; what concerns a run is kept in `run.notes` too."""


class ClashWarning(NewelWarning):
    """Two origins offer different things under one name; the text names both."""


class PluginWarning(NewelWarning):
    """A plugin broke a rule of its hook and was left out; everything else still works."""
