"""What a name that nobody knows may have meant."""

from __future__ import annotations

import difflib
import unicodedata
from collections.abc import Iterable, Mapping

from newel.errors import UnknownMethod, UnknownName

__all__ = ["folded", "near_names", "unknown_method", "unknown_name"]

_LONGEST = 120


def folded(name: str) -> str:
    """Return a usual name without case, accents, spaces and punctuation, so that spellings compare equal."""
    plain = unicodedata.normalize("NFKD", name).casefold()
    return "".join(character for character in plain if character.isalnum())


def near_names(name: str, known: Iterable[str], least: float = 0.55) -> tuple[str, ...]:
    """Return the three names closest to one, the closest first; `least` is the ratio of letters in common."""
    return tuple(difflib.get_close_matches(name[:_LONGEST].lower(), list(known), n=3, cutoff=least))


def unknown_method(slug: str, known: Iterable[str], usual: Mapping[str, Iterable[str]]) -> UnknownMethod:
    """Return the error for a slug that names no method.

    Args:
        slug: what was asked for.
        known: all slugs, with families by their pattern.
        usual: usual names of methods, by slug.
    """
    known = list(known)
    wanted = folded(slug[:_LONGEST])
    owners = [owner for owner, names in usual.items() if wanted and wanted in map(folded, [owner, *names])]
    near = _near_slugs(slug, known, usual, owners)
    advice = []
    if owners:
        advice.append(f"That usual name belongs to {' and '.join(owners)}.")
    if near:
        advice.append(f"Near slugs: {', '.join(near)}.")
    word = (owners or list(near) or [""])[0].partition("-")[0]
    advice.append(f"    newel list --text {word}" if word else "No slug is near it.     newel list")
    shown = slug if len(slug) <= _LONGEST else slug[:_LONGEST] + "…"
    return UnknownMethod(f"unknown method {shown!r}\n  {' '.join(advice)}", slug=slug, near=(*owners, *near))


def _near_slugs(
    slug: str, known: list[str], usual: Mapping[str, Iterable[str]], owners: list[str]
) -> tuple[str, ...]:
    """Return near slugs: near to the method that is meant, else to the text, by slug or by usual name."""
    if owners:
        author = owners[0].partition("-")[0] + "-"
        others = [other for other in known if other not in owners]
        kin = near_names(owners[0], [other for other in others if other.startswith(author)], least=0.0)
        return tuple(dict.fromkeys([*kin, *near_names(owners[0], others)]))[:3]
    direct = near_names(slug, known)
    if len(direct) == 3:
        return direct
    by_name = {folded(name): owner for owner, names in usual.items() for name in names}
    further = [by_name[name] for name in near_names(folded(slug), by_name)]
    return tuple(dict.fromkeys([*direct, *further]))[:3]


def unknown_name(kind: str, name: str, known: Iterable[str], remedy: str = "") -> UnknownName:
    """Return the error for a controller, sink or file ending that nobody offers."""
    known = sorted(known)
    near = near_names(name, known)
    lines = [f"unknown {kind} {name[:_LONGEST]!r}", f"Near names: {', '.join(near)}." if near else ""]
    lines.append(f"Known: {', '.join(known) or 'none'}.{'  ' + remedy if remedy else ''}")
    return UnknownName("\n  ".join(line for line in lines if line), kind=kind, name=name, near=near)
