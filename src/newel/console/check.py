"""`newel check`: is a tableau what it claims to be?"""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import attrs

from newel.console.lookup import method_name, proof_progress, registry_of
from newel.console.screen import Screen
from newel.console.words import OUTCOME_STYLES, claims, count, filled, float_floor, orders
from newel.errors import BadRequest, BadTableau, NewelError, SlugTaken

if TYPE_CHECKING:
    from rich.table import Table

    from newel.catalogue.registry import Registry
    from newel.methods.order_conditions import Verdict
    from newel.methods.repairs import Repair

__all__ = ["PASTE", "WHAT", "add", "draw", "draw_details", "run"]

WHAT = "Prove what methods claim; show what fails, and the nearest repair."
MOST_SHOWN = 20
"""How many coefficients that no condition sees are named one by one."""

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
    parser.add_argument("--all", action="store_true", help="every known method, and some of each family")
    parser.add_argument("--anew", action="store_true", help="prove even what was proved here before")
    parser.add_argument("--write", action="store_true", help="write the nearest repair into the file")


def run(options: Namespace, screen: Screen) -> int:
    """Check each method; the status is 1 if one falls short, 2 if one cannot be read."""
    if options.all and options.methods:
        raise BadRequest("--all and methods are given together\n  Give one of them.", argument="all")
    if not (options.all or options.methods):
        raise BadRequest("no method\n  newel check FILE.toml, newel check SLUG, or newel check --all")
    registry = registry_of(options)
    if options.write:
        return _repair(registry, options, screen)
    checked = _check_all(registry, options, screen) if options.all else _check_each(registry, options, screen)
    if options.json:
        screen.document("newel-check/1", {"methods": [_data(each) for each in checked]})
    else:
        draw(screen, checked)
    for each in checked:
        if each.error is not None:
            screen.notice(str(each.error))
    return max((each.status for each in checked), default=0)


def _repair(registry: Registry, options: Namespace, screen: Screen) -> int:
    """Write the one nearest repair into a file, and check it again."""
    from newel.methods.repair_file import write_repair

    if options.all or len(options.methods) != 1 or not options.methods[0].endswith(".toml"):
        raise BadRequest("--write repairs one file\n  newel check FILE.toml --write", argument="write")
    (text,) = options.methods
    before = _check(text, registry, options.anew, None)
    if before.error is not None:
        raise before.error
    if before.verdict is not None and not before.verdict:
        repair = _the_nearest(text, before.verdict.repairs)
        write_repair(text, repair)
        screen.notice(f"{text}: {', '.join(map(str, repair.changes))}: written")
    options.write = False
    return run(options, screen)


def _the_nearest(text: str, repairs: Sequence[Repair]) -> Repair:
    if not repairs:
        error = BadRequest(f"{text}: no repair was found; nothing was written\n  newel check {text}")
        error.exit_status = 1
        raise error
    nearest = [each for each in repairs if each.distance == repairs[0].distance]
    if len(nearest) > 1:
        lines = [f"  {each.text}" for each in nearest]
        listed = "\n".join([f"{text}: {len(nearest)} repairs are equally near; nothing was written", *lines])
        raise BadRequest(f"{listed}\n  Look at the source, and change the file by hand.", argument="write")
    return repairs[0]


def _check_each(registry: Registry, options: Namespace, screen: Screen) -> list[_Checked]:
    found = []
    for text in options.methods:
        with proof_progress(screen, f"proving {text}") as progress:
            found.append(_check(text, registry, options.anew, progress))
    return found


def _check_all(registry: Registry, options: Namespace, screen: Screen) -> list[_Checked]:
    from newel.catalogue.shipped import FAMILY_SAMPLES

    slugs = [*registry.names(), *(slug for slug in FAMILY_SAMPLES if slug not in registry.names())]
    found = []
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
    """Draw one method in full; of several a table, what is wrong with those that fail, and the sums."""
    from rich.text import Text

    proved = [(each.slug or "", each.verdict) for each in checked if each.verdict is not None]
    if len(checked) == 1:
        for slug, verdict in proved:
            digits = "" if verdict.digits is None else f", {verdict.digits} digits are trusted"
            said = f"order {claims(verdict)}{digits}{float_floor(verdict, ',')}"
            outcome = (verdict.outcome, OUTCOME_STYLES[verdict.outcome])
            screen.draw(Text.assemble((slug, "bold"), "\n  ", outcome, ": ", said))
            draw_details(screen, verdict)
        return
    if proved:
        screen.draw(_table(proved), "")
    for slug, verdict in proved:
        if not verdict:
            screen.draw(Text.assemble((slug, "bold"), "  ", (verdict.outcome, OUTCOME_STYLES["fails"])))
            draw_details(screen, verdict)
    exact, rounded = (sum(v.outcome == name for _, v in proved) for name in ("exact", "rounded"))
    failing, unread = sum(not verdict for _, verdict in proved), len(checked) - len(proved)
    words = [f"{exact} exact", f"{rounded} rounded", f"{failing} {'fails' if failing == 1 else 'fail'}"]
    words += [f"{unread} cannot be read"] if unread else []
    screen.write(f"{count(len(checked), 'method')}: {', '.join(words)}.")


def _table(proved: Sequence[tuple[str, Verdict]]) -> Table:
    from rich import box
    from rich.table import Table
    from rich.text import Text

    table = Table(box=box.SIMPLE_HEAD, pad_edge=False, padding=(0, 1, 0, 0), show_edge=False)
    table.add_column("slug", style="bold", overflow="fold")
    table.add_column("proof", no_wrap=True)
    for title in ("order", "cont.", "floor", "digits"):
        table.add_column(title, justify="right", no_wrap=True)
    for slug, verdict in proved:
        table.add_row(
            slug,
            Text(verdict.outcome, style=OUTCOME_STYLES[verdict.outcome]),
            orders(verdict.order, verdict.embedded_order),
            "" if verdict.continuous_order is None else str(verdict.continuous_order),
            f"{verdict.working_floor:.1e}" if verdict else "",
            "" if verdict.digits is None else str(verdict.digits),
        )
    return table


def draw_details(screen: Screen, verdict: Verdict) -> None:
    """Draw each failing condition, what would repair it, and what a reader would trip over."""
    from rich.text import Text

    width = screen.console.width
    for failure in verdict.failures:
        bound = f" (at most {failure.bound:.1e} is allowed)" if failure.bound else ""
        screen.draw(Text(filled(f"{failure.message}{bound}", width, "  ! ", "    "), style="red"))
    for repair in verdict.repairs:
        screen.draw(Text(filled(repair.text, width, "  > ", "    "), style="green"))
    for line in verdict.undecided:
        screen.draw(filled(line, width, "  ? ", "    "))
    remarks = [*verdict.remarks]
    if verdict.undetermined:
        shown, more = verdict.undetermined[:MOST_SHOWN], len(verdict.undetermined) - MOST_SHOWN
        rest = f" and {more} more (all of them: --json)" if more > 0 else ""
        remarks.append(f"not determined by the claimed orders: {', '.join(shown)}{rest}")
    for line in remarks:
        screen.draw(filled(line, width, "  - ", "    "))


def _data(each: _Checked) -> dict[str, Any]:
    verdict = None if each.verdict is None else each.verdict.to_data()
    error = None if each.error is None else str(each.error)
    return {"method": each.method, "slug": each.slug, "verdict": verdict, "error": error}
