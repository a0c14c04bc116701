"""`newel march`: a model from its start to its stop."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from functools import partial
from typing import TYPE_CHECKING, Any

from newel.console.lookup import add_model, method_name, model_of, proof_progress, registry_of
from newel.console.ranges import number, numbers, whole
from newel.console.screen import Screen
from newel.errors import BadRequest, MarchFailed, MarchInterrupted, OutputFailed

if TYPE_CHECKING:
    from newel.catalogue.registry import Registry
    from newel.protocols import Sink

__all__ = ["PASTE", "WHAT", "add", "run"]

WHAT = "March a model and write its rows to files."
PASTE = (
    "newel march example:lock --method dormand-prince-5-4 --rel-tol 1e-6 --abs-tol 1e-9 --to lock.csv",
    "newel march example:lock --set paddle=0.6 --method kutta-4 --step 0.5 --every-time 30 --to slow.jsonl",
)

_ADAPTIVE = ("controller", "first", "smallest", "largest")
_THINNING = ("at", "every_steps", "every_time")
_FORMS = """
  On the command line: --step 0.01, or --rel-tol 1e-6 --abs-tol 1e-9"""


def add(parser: ArgumentParser) -> None:
    """Add the model, the method, the step rule and the output."""
    add_model(parser)
    parser.add_argument("--method", required=True, help="a slug, or a tableau file that ends in .toml")
    rule = parser.add_argument_group("step rule, one of: --step; --rel-tol with --abs-tol")
    rule.add_argument("--step", metavar="H", help="every step has this length, in time units")
    rule.add_argument("--rel-tol", metavar="R", help="relative tolerance of the error in a step")
    rule.add_argument(
        "--abs-tol", metavar="A", help="absolute tolerance, in state units: one number, or 1e-9,1e-6,…"
    )
    rule.add_argument(
        "--controller", metavar="NAME", help="adaptive: what chooses the steps; see newel plugins"
    )
    rule.add_argument("--first", metavar="H", help="adaptive: the first step")
    rule.add_argument("--smallest", metavar="H", help="adaptive: fail rather than go below")
    rule.add_argument("--largest", metavar="H", help="adaptive: never go above")
    output = parser.add_argument_group("output")
    output.add_argument(
        "--to",
        action="append",
        default=[],
        metavar="FILE",
        help="where the rows go; the ending chooses the form (repeatable)",
    )
    output.add_argument("--at", metavar="TIMES", help="rows at these times: 0,10,20 or 0..60/7")
    output.add_argument("--every-steps", metavar="N", help="a row each N steps")
    output.add_argument("--every-time", metavar="T", help="a row each span of time")
    output.add_argument("--force", action="store_true", help="replace files that exist")


def run(options: Namespace, screen: Screen) -> int:
    """March the model and show the run; 1 if it could not finish, 3 if it was stopped by Ctrl-C."""
    from newel import march
    from newel.console import march_summary as summary

    rule, thinning = _rule(options), _thinning(options)
    model = model_of(options, screen)
    registry = registry_of(options)
    method = method_name(options.method, registry)
    with proof_progress(screen, f"proving {method}") as progress:
        tableau = registry.find(method, progress)
    sinks = [_sink(target, registry, thinning, options.force) for target in options.to]
    status, error = 0, None
    try:
        with screen.model_prints_aside():
            ended = march(model, method, **rule, sinks=sinks, progress=True, registry=registry)
    except (MarchFailed, MarchInterrupted, OutputFailed) as problem:
        if problem.run is None:
            raise
        ended, error, status = problem.run, problem, problem.exit_status
    except BadRequest as problem:
        if problem.argument in ("step", "rel_tol", "abs_tol", "steps") and "give one of" in str(problem):
            raise BadRequest(f"{problem}{_FORMS}", argument=problem.argument) from None
        raise
    if ended.ended is not None and ended.ended.reason == "memory":
        status = 1
    shown = summary.Summary(options.model, model, tableau, ended, tuple(options.to), error)
    if options.json:
        screen.document("newel-march/1", shown.to_data())
    else:
        summary.draw(screen, shown)
    if error is not None:
        screen.notice(summary.farewell(shown))
    return status


def _rule(options: Namespace) -> dict[str, Any]:
    """Return the step rule as arguments of `march`.

    Raises:
        BadRequest: for no number, or where a setting of adaptive steps stands without tolerances.
    """
    rule: dict[str, Any] = {}
    for name in ("step", "rel_tol"):
        if getattr(options, name) is not None:
            rule[name] = number(getattr(options, name), _option(name))
    if options.abs_tol is not None:
        tolerances = numbers(options.abs_tol, "--abs-tol")
        rule["abs_tol"] = tolerances[0] if len(tolerances) == 1 else tolerances
    extra: dict[str, Any] = {n: getattr(options, n) for n in _ADAPTIVE if getattr(options, n) is not None}
    if not extra:
        return rule
    given = _option(next(iter(extra)))
    if set(rule) != {"rel_tol", "abs_tol"}:
        remedy = "Give --rel-tol and --abs-tol, and no --step."
        raise BadRequest(f"{given} belongs to adaptive steps\n  {remedy}", argument=next(iter(extra)))
    from newel import Adaptive

    settings: dict[str, Any] = {
        n: v if n == "controller" else number(v, _option(n)) for n, v in extra.items()
    }
    return {"steps": Adaptive(**rule, **settings)}


def _thinning(options: Namespace) -> dict[str, Any]:
    """Return which rows the files get, as arguments of a sink."""
    thinning: dict[str, Any] = {}
    if options.at is not None:
        thinning["at"] = numbers(options.at, "--at")
    if options.every_steps is not None:
        thinning["every_steps"] = whole(options.every_steps, "--every-steps")
    if options.every_time is not None:
        thinning["every_time"] = number(options.every_time, "--every-time")
    if thinning and not options.to:
        name = next(iter(thinning))
        raise BadRequest(
            f"{_option(name)} without an output\n  Give --to FILE, such as --to rows.csv.", argument=name
        )
    if options.force and not options.to:
        raise BadRequest("--force without an output\n  Give --to FILE, or leave it away.", argument="force")
    return thinning


def _option(name: str) -> str:
    return "--" + name.replace("_", "-")


def _sink(target: str, registry: Registry, thinning: dict[str, Any], force: bool) -> Sink:
    """Return the sink for a file, made by the one that writes its ending."""
    from newel.catalogue.offers import call_with

    settings = dict(thinning) | ({"overwrite": True} if force else {})
    sink: Sink = call_with(partial(registry.sink_for(target), target), f"the sink of {target}", settings)
    return sink
