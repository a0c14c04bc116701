"""What the terminal shows of a run."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING, Any

import attrs

from newel.console.words import count, filled, orders

if TYPE_CHECKING:
    from newel.console.screen import Screen
    from newel.methods.tableau import Tableau
    from newel.models.model import Model
    from newel.results.run import Run

__all__ = ["Summary", "draw", "farewell"]

_MOST_ENTRIES = 12
_MOST_EVENTS = 12


@attrs.frozen
class Summary:
    """A run beside what was asked for: model, method and files; and the error that ended it, or None."""

    named: str
    model: Model
    tableau: Tableau
    run: Run
    outputs: tuple[str, ...]
    error: BaseException | None

    def to_data(self) -> dict[str, Any]:
        """Return the run in a form fit for JSON; states are flat, in the order of `labels`."""
        run, t = self.run, self.tableau
        return {
            "model": self.named,
            "method": {
                "slug": t.slug,
                "name": t.name,
                "order": t.order,
                "embedded_order": t.embedded_order,
                "digest": t.digest,
                "outcome": "unproven" if t.proof is None else t.proof.outcome,
            },
            "settings": run.settings,
            "estimator": run.estimator,
            "start": self.model.start,
            "stop": self.model.stop,
            "time_unit": run.time_unit,
            "ended": None if run.ended is None else attrs.asdict(run.ended),
            "error": None if self.error is None else str(self.error),
            "accepted": run.accepted,
            "rejected": run.rejected,
            "calls": run.calls,
            "labels": run.labels,
            "units": run.units,
            "last_time": run.last_time,
            "last_state": run.last_state.reshape(-1).tolist(),
            "events": [
                {"label": e.label, "time": e.time, "state": e.state.reshape(-1).tolist()} for e in run.events
            ],
            "notes": [attrs.asdict(note) for note in run.notes],
            "outputs": self.outputs,
            "machine": run.machine,
        }


def draw(screen: Screen, shown: Summary) -> None:
    """Draw the run: what was marched how, how it ended, what it cost, where the rows are."""
    from rich.text import Text

    tableau, width = shown.tableau, screen.console.width
    title = Text.assemble((shown.named, "bold"), " by ", (tableau.slug, "bold"))
    screen.draw(title)
    for label, text in _facts(shown):
        screen.draw(filled(text, width, f"  {label:<9} ", " " * 12))
    for line in _state(shown):
        screen.draw(line)
    for note in shown.run.notes:
        at = "" if note.time is None else f"at t = {_time(shown, note.time)}: "
        text = " ".join(f"{at}{note.text}".split())
        screen.draw(Text(filled(text, width, "  note      ", " " * 12), style="yellow"))


def _facts(shown: Summary) -> Iterator[tuple[str, str]]:
    run, tableau = shown.run, shown.tableau
    order = orders(tableau.order, tableau.embedded_order)
    proof = "unproven" if tableau.proof is None else f"proof: {tableau.proof.outcome}"
    estimator = "no error estimate" if run.estimator == "none" else f"error estimate: {run.estimator}"
    yield "method", f"{tableau.name}, order {order}, {proof}"
    yield "steps", f"{_rule(run)}; {estimator}"
    yield "time", f"{_time(shown, shown.model.start)} to {_time(shown, run.last_time)}"
    yield "ended", _ending(shown)
    rejected = f", {run.rejected:,} rejected" if run.rejected else ""
    yield "cost", f"{count(run.accepted, 'step')}{rejected}; {count(run.calls, 'call')} of rate"
    for event in run.events[:_MOST_EVENTS]:
        yield "event", f"{event.label}, t = {_time(shown, event.time)}"
    if len(run.events) > _MOST_EVENTS:
        yield "", f"and {len(run.events) - _MOST_EVENTS:,} more events"
    if shown.outputs:
        yield "rows in", ", ".join(shown.outputs)
    else:
        yield "rows", "not kept; --to FILE keeps them"


def _rule(run: Run) -> str:
    """Return the step rule in words."""
    rule = run.settings
    if rule["steps"] != "adaptive":
        return f"{rule['steps']}, {rule['step']}"
    listed = rule["abs_tol"] if isinstance(rule["abs_tol"], list) else [rule["abs_tol"]]
    few = ", ".join(f"{value:g}" for value in listed[:3]) + (", …" if len(listed) > 3 else "")
    bounds = [f"{name} {rule[name]:g}" for name in ("first", "smallest", "largest") if rule[name] is not None]
    words = [f"adaptive, rel_tol {rule['rel_tol']:g}, abs_tol {few}", str(rule["controller"]), *bounds]
    return ", ".join(words)


def _ending(shown: Summary) -> str:
    ended = shown.run.ended
    if ended is None:
        return "not at all"
    words = {
        "stop": "at its stop",
        "event": f"by the event {ended.label!r}",
        "interrupted": f"by Ctrl-C, before its stop at {_time(shown, shown.model.stop)}",
        "failed": f"by a failure, before its stop at {_time(shown, shown.model.stop)}",
    }
    return words.get(ended.reason, f"by its {ended.reason}")


def _time(shown: Summary, time: float) -> str:
    unit = f" {shown.run.time_unit}" if shown.run.time_unit else ""
    return f"{float(time):.9g}{unit}"


def _state(shown: Summary) -> Iterator[str]:
    """Yield the first entries of the last state, numbers under one another."""
    run = shown.run
    values = [_number(value) for value in run.last_state.reshape(-1)[:_MOST_ENTRIES].tolist()]
    labels = run.labels[:_MOST_ENTRIES]
    units = run.units[:_MOST_ENTRIES] or ("",) * len(labels)
    wide, high = max(map(len, labels), default=0), max(map(len, values), default=0)
    yield f"  last state, at t = {_time(shown, run.last_time)}"
    for label, text, unit in zip(labels, values, units, strict=False):
        yield f"    {label:<{wide}}  {text:>{high}} {unit}".rstrip()
    left = run.last_state.size - len(values)
    if left > 0:
        yield f"    and {left:,} more"


def _number(value: Any) -> str:
    return f"{value:.9g}" if isinstance(value, (float, complex)) else str(value)


def farewell(shown: Summary) -> str:
    """Return what stopped the run, and whether it can be resumed."""
    lines = [str(shown.error)]
    if shown.run.ended is not None and shown.run.ended.reason == "interrupted":
        where = (
            f"The rows so far are in {', '.join(shown.outputs)}." if shown.outputs else "No rows were kept."
        )
        lines.append(f"  It cannot be resumed.  {where}")
    return "\n".join(lines)
