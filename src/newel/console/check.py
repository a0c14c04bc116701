"""`newel check`: is a tableau what it claims to be?"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import attrs

from newel.console.lookup import method_name, proof_progress, registry_of
from newel.console.screen import Screen
from newel.console.words import OUTCOME_STYLES, claims, count, filled
from newel.errors import BadRequest, BadTableau, NewelError, SlugTaken

if TYPE_CHECKING:
    from newel.catalogue.registry import Registry
    from newel.methods.order_conditions import Verdict

__all__ = ["PASTE", "WHAT", "add", "draw", "draw_details", "run"]

WHAT = "Prove what methods claim, and show each condition that fails."
PASTE = ("newel check kutta-4", "newel check --all")


@attrs.frozen
class _Checked:
    """One method with its verdict, or with the error that kept it from being proved."""

    method: str
    slug: str | None = None
    verdict: Verdict | None = None
    error: NewelError | None = None

    @property
    def status(self) -> int:
        if self.error is not None:
            return self.error.exit_status
        return 0 if self.verdict else 1


def add(parser: ArgumentParser) -> None:
    """Add the methods."""
    parser.add_argument("methods", nargs="*", metavar="METHOD", help="a slug, or a file that ends in .toml")
    parser.add_argument("--all", action="store_true", help="every method that is known")
    parser.add_argument("--anew", action="store_true", help="prove even what was proved here before")


def run(options: Namespace, screen: Screen) -> int:
    """Check each method; the status is 1 if one falls short, 2 if one cannot be read."""
    if options.all and options.methods:
        raise BadRequest("--all and methods are given together\n  Give one of them.", argument="all")
    if not (options.all or options.methods):
        raise BadRequest("no method\n  newel check FILE.toml, newel check SLUG, or newel check --all")
    registry = registry_of(options)
    checked = _check_all(registry, options, screen) if options.all else _check_each(registry, options, screen)
    if options.json:
        screen.document("newel-check/1", {"methods": [_data(each) for each in checked]})
    else:
        draw(screen, checked)
    for each in checked:
        if each.error is not None:
            screen.notice(str(each.error))
    return max((each.status for each in checked), default=0)


def _check_each(registry: Registry, options: Namespace, screen: Screen) -> list[_Checked]:
    found = []
    for text in options.methods:
        with proof_progress(screen, f"proving {text}") as progress:
            found.append(_check(text, registry, options.anew, progress))
    return found


def _check_all(registry: Registry, options: Namespace, screen: Screen) -> list[_Checked]:
    slugs, found = registry.names(), []
    with proof_progress(screen, "proving all methods") as progress:
        for number, slug in enumerate(slugs, 1):
            each = _check(slug, registry, options.anew, None)
            if isinstance(each.error, (BadTableau, SlugTaken)):  # nobody asked for this one by name
                each.error.exit_status = 1
            found.append(each)
            if progress is not None:
                progress(number, len(slugs))
    return found


def _check(text: str, registry: Registry, anew: bool, progress: Any) -> _Checked:
    from newel import check

    try:
        tableau = registry.load(method_name(text, registry))
        return _Checked(text, tableau.slug, check(tableau, registry, progress, anew))
    except NewelError as error:
        return _Checked(text, error=error)


def draw(screen: Screen, checked: Sequence[_Checked]) -> None:
    """Draw a line for each method, what one must know of it, and the sum of several."""
    from rich.text import Text

    proved = [(each.slug or "", each.verdict) for each in checked if each.verdict is not None]
    widest = max((len(slug) for slug, _ in proved), default=0)
    for slug, verdict in proved:
        said = f"  order {claims(verdict)}, float64 to {verdict.working_floor:.1e}"
        digits = "" if verdict.digits is None else f", {verdict.digits} digits trusted"
        outcome = (f"{verdict.outcome:<7}", OUTCOME_STYLES[verdict.outcome])
        screen.draw(Text.assemble((f"{slug:<{widest}}", "bold"), "  ", outcome, said, digits))
        draw_details(screen, verdict, all_remarks=len(checked) == 1)
    if len(checked) > 1:
        sums = [f"{sum(v.outcome == name for _, v in proved)} {name}" for name in ("exact", "rounded")]
        bad = len(checked) - len(proved)
        unread = f", {bad} cannot be read" if bad else ""
        failing = sum(not verdict for _, verdict in proved)
        screen.write(
            f"{count(len(checked), 'method')}: {', '.join(sums)}, {failing} {_fail(failing)}{unread}."
        )


def _fail(number: int) -> str:
    return "fails" if number == 1 else "fail"


def draw_details(screen: Screen, verdict: Verdict, all_remarks: bool = True) -> None:
    """Draw each failing condition, and the remarks where they are wanted or something fails."""
    from rich.text import Text

    width = screen.console.width
    for failure in verdict.failures:
        bound = f" (at most {failure.bound:.1e} is allowed)" if failure.bound else ""
        screen.draw(Text(filled(f"{failure.message}{bound}", width, "  ! ", "    "), style="red"))
    remarks = [*verdict.remarks]
    if verdict.undetermined:
        remarks.append(f"not determined by the claimed orders: {', '.join(verdict.undetermined)}")
    for line in remarks if all_remarks or not verdict else ():
        screen.draw(filled(line, width, "  - ", "    "))


def _data(each: _Checked) -> dict[str, Any]:
    verdict = None if each.verdict is None else each.verdict.to_data()
    error = None if each.error is None else str(each.error)
    return {"method": each.method, "slug": each.slug, "verdict": verdict, "error": error}
