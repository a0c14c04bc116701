"""From an offer to the thing itself: loading, with every failure put down to whom it belongs."""

from __future__ import annotations

import inspect
import re
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any

import attrs

from newel.errors import BadRequest, BadTableau, NewelError, UnknownName

if TYPE_CHECKING:
    from newel.catalogue.plugins import Offer
    from newel.methods.tableau import Tableau

__all__ = ["call_with", "family_arguments", "load_method", "load_named", "usual_names"]

_MOST_DIGITS = 9
_PLACEHOLDER = re.compile(r"\{([a-z_]+)\}")


def load_method(offer: Offer, slug: str, arguments: tuple[Tableau | int, ...] = ()) -> Tableau:
    """Return the tableau that an offer stands for, with its origin; a family is handed `arguments`.

    Raises:
        BadTableau: if the file is wrong, the loader raises, or what it returns is not that method.
        BadRequest: from a family, if a size is out of its range.
    """
    from newel.methods.tableau import Tableau
    from newel.methods.tableau_file import load_tableau

    loader = offer.loader
    if isinstance(loader, Path) or (isinstance(loader, str) and loader.endswith(".toml")):
        made: object = load_tableau(Path(loader))
    else:
        made = _call_loader(offer, slug, arguments)
    if not isinstance(made, Tableau):
        raise _bad(offer, slug, f"its loader returned {type(made).__name__}, not a newel Tableau")
    if made.slug != slug:
        raise _bad(offer, slug, f"its loader returned another slug, {made.slug!r}; both must be the same")
    return attrs.evolve(made, origin=offer.place if offer.origin.kind == "folder" else str(offer.origin))


def _call_loader(offer: Offer, slug: str, arguments: tuple[Tableau | int, ...]) -> object:
    from newel.catalogue.blame import blame, said
    from newel.catalogue.plugins import load_object

    try:
        return load_object(offer.loader)(*arguments)
    except (Exception, SystemExit) as error:
        if arguments and isinstance(error, BadRequest):  # a family's own words about a size
            raise
        place = "" if isinstance(error, NewelError) else f" ({blame(error)})"
        raise _bad(offer, slug, f"its loader raised {said(error)}{place}") from error


def _bad(offer: Offer, slug: str, rule: str) -> BadTableau:
    return BadTableau(f"{rule}\n  Offered by {offer.from_text}. Everything else works.", file=slug)


def load_named(offer: Offer) -> Any:
    """Return the controller or sink factory of an offer.

    Raises:
        UnknownName: if it cannot be loaded or cannot be called.
    """
    from newel.catalogue.blame import blame, said
    from newel.catalogue.plugins import load_object

    try:
        made = load_object(offer.loader)
        rule = None if callable(made) else f"its loader gives {type(made).__name__}, which cannot be called"
    except (Exception, SystemExit) as error:
        rule = f"its loader raised {said(error)} ({blame(error)})"
    if rule is not None:
        text = f"{offer.kind} {offer.name!r} cannot be used: {rule}"
        whose = f"Offered by {offer.from_text}. Everything else works."
        raise UnknownName(f"{text}\n  {whose}", kind=offer.kind, name=offer.name)
    return made


def call_with(factory: Callable[..., Any], what: str, arguments: dict[str, Any]) -> Any:
    """Call a factory with keyword arguments; arguments that it does not take are named.

    Raises:
        BadRequest: if the arguments do not fit its signature.
    """
    try:
        signature: inspect.Signature | None = inspect.signature(factory)
    except (TypeError, ValueError):
        signature = None
    try:
        return factory(**arguments)
    except TypeError as error:
        given = ", ".join(f"{name}={value!r}" for name, value in arguments.items()) or "no arguments"
        takes = "what its documentation says" if signature is None else signature
        raise BadRequest(f"{what}: {error}; given {given}\n  It takes {takes}.") from error


@cache
def _family_pattern(family: str) -> tuple[re.Pattern[str], tuple[str, ...]]:
    """Return the pattern of a family's slugs and its words in their order."""
    words = tuple(_PLACEHOLDER.findall(family))
    pieces = _PLACEHOLDER.split(family)
    text = "".join(
        re.escape(piece) if number % 2 == 0 else ("([a-z0-9-]+)" if piece == "method" else "(-?[0-9]+)")
        for number, piece in enumerate(pieces)
    )
    return re.compile(text), words


def family_arguments(family: str, slug: str) -> tuple[str | int, ...] | None:
    """Return what stands in a slug for each word of a family, slugs as text and sizes as int, or None.

    Raises:
        BadRequest: if a size has too many digits for any family, or is not written in the plain way.
    """
    pattern, words = _family_pattern(family)
    match = pattern.fullmatch(slug)
    if match is None:
        return None
    found: list[str | int] = []
    for word, text in zip(words, match.groups(), strict=True):
        if word == "method":
            found.append(text)
            continue
        if len(text) > _MOST_DIGITS:
            raise BadRequest(
                f"{slug[:60]}…: {word} has {len(text)} digits; no method is that large\n"
                f"  Give a size below 10^{_MOST_DIGITS}.",
                argument=word,
            )
        if text != str(int(text)):
            raise BadRequest(f"{slug}: write {word} as {int(text)}, in the plain way", argument=word)
        found.append(int(text))
    return tuple(found)


def usual_names(offer: Offer) -> tuple[str, ...]:
    """Return the usual names in a tableau file, which is not judged; nothing where there is no file."""
    import tomllib

    loader = offer.loader
    if not (isinstance(loader, Path) or (isinstance(loader, str) and loader.endswith(".toml"))):
        return ()
    try:
        if Path(loader).stat().st_size > 1_000_000:
            return ()
        data = tomllib.loads(Path(loader).read_text(encoding="utf-8"))
        names = [data.get("name"), *data.get("also_called", ())]
    except (OSError, ValueError, TypeError, RecursionError):
        return ()
    return tuple(name for name in names if isinstance(name, str))
