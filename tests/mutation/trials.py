"""One mutant put before the project's proof, and the second opinion where the two might part."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

from newel.errors import BadTableau
from newel.methods.exact import Exact
from newel.methods.order_conditions import Verdict, prove
from newel.methods.tableau import Tableau
from tests.independent.documents import ARRAYS, Document, open_document
from tests.independent.judging import judge
from tests.mutation.moves import COMPENSATED, HALF_UNIT, Move, moves
from tests.mutation.mutants import Mutant, Workshop

TABLEAUX = Path(__file__).parents[2] / "tableaux"
SECOND_OPINION_EVERY = 64
"""One in so many rejected mutants, drawn by digest, is judged independently too."""
MANY_STAGES = 16
MOST_MOVES = 100
"""Of methods with more than `MANY_STAGES` stages so many moves are tried, drawn by digest."""

exactly = lru_cache(maxsize=100_000)(Exact.of)


@dataclass(frozen=True)
class Trial:
    """What became of a mutant.

    `outcome` is "rejected", "refused" (it is no tableau: two square roots) or "accepted"; `finding` the
    independent judgement, empty where it was not asked for; `agreed` whether the two are of one mind, or the
    proof did what is expected of it; `by_cap` whether half a unit was refused by the limit of 1e-12 alone.
    """

    move: Move
    mutant: str
    outcome: str
    finding: str = ""
    agreed: bool = True
    by_cap: bool = False
    units: float = 0.0

    @property
    def survived(self) -> bool:
        return self.outcome == "accepted" and self.move.kind != HALF_UNIT

    @property
    def half_unit_rejected(self) -> bool:
        return self.outcome != "accepted" and self.move.kind == HALF_UNIT


def files() -> dict[str, Path]:
    """The built-in tableau files by slug."""
    return {file.stem: file for file in sorted(TABLEAUX.glob("order-*/*.toml"))}


@lru_cache(maxsize=8)
def workshop(file: Path) -> Workshop:
    """The workshop for a file."""
    return Workshop(open_document(file))


@lru_cache(maxsize=8)
def all_moves(file: Path) -> tuple[Move, ...]:
    """Every move on a file; with more than `MANY_STAGES` stages, a fixed draw of `MOST_MOVES` of them."""
    document = workshop(file).document
    found = tuple(moves(document))
    if document.stages <= MANY_STAGES:
        return found
    return tuple(sorted(sorted(found, key=lambda move: move.draw)[:MOST_MOVES], key=found.index))


def drawn(file: Path, one_in: int) -> list[Move]:
    """One in so many moves on a file, drawn by digest, and at least one."""
    return [move for move in all_moves(file) if move.draw % one_in == 0] or [
        min(all_moves(file), key=lambda move: move.draw)
    ]


def as_tableau(document: Document) -> Tableau:
    """The project's own object for a document."""
    nodes, matrix, weights, embedded, continuous = (document.nested(array) for array in ARRAYS)
    return Tableau(
        document.slug,
        order=document.claims["weights"],
        nodes=map(exactly, nodes or ()),
        matrix=[list(map(exactly, row)) for row in matrix or ()],
        weights=map(exactly, weights or ()),
        embedded_weights=embedded and [exactly(text) for text in embedded],
        embedded_order=document.claims.get("embedded"),
        continuous_weights=continuous and [list(map(exactly, row)) for row in continuous],
        continuous_order=document.claims.get("continuous"),
        digits=document.digits,
    )


def verdict_of(document: Document) -> Verdict:
    """What the project's proof says of a document."""
    return prove(as_tableau(document))


def outcome(mutant: Mutant) -> tuple[str, bool]:
    """What the project's proof says of a mutant (see `Trial`), and whether a tree condition failed."""
    try:
        verdict = verdict_of(mutant.document)
    except BadTableau:
        return "refused", False
    by_tree = any(
        failure.part not in ("row sum", "claim") and not failure.condition.startswith("end of")
        for failure in verdict.failures
    )
    return ("accepted" if verdict else "rejected"), by_tree


def tried(shop: Workshop, move: Move, every: int = SECOND_OPINION_EVERY) -> Trial | None:
    """Put a move to the test; None where it leads nowhere.

    The independent judgement is asked for what is not as expected, and for one in `every` of the rest.
    """
    mutant = shop.mutant(move)
    if mutant is None:
        return None
    found, by_tree = outcome(mutant)
    # Ends of continuous weights catch many a compensated change too; the trees are to catch it by themselves.
    trees_only = move.kind == COMPENSATED and found == "rejected" and not by_tree
    expected = (found == "accepted") == (move.kind == HALF_UNIT) and not trees_only
    if found == "refused" or (expected and move.draw % every):
        return Trial(move, str(mutant), found, units=mutant.units)
    judgement = judge(mutant.document, trees_only)
    agreed = judgement.valid == (found == "accepted" or trees_only)
    return Trial(move, str(mutant), found, judgement.finding, agreed, judgement.by_cap, mutant.units)
