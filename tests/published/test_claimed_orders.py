"""Every tableau file attains the order that its paper claims, and no more.

Judged by `tests.independent.tree_formulas`, which shares no code with newel. The table below holds, for the
files of orders 1 to 4, what the publications claim: the order carried on, the order of the embedded solution,
and where. All of it is from memory, none was seen; the orders themselves are proved here.
"""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest

from tests.independent.tree_formulas import load, orders
from tests.published.claims_more import MORE_CLAIMS

TABLEAUX = Path(__file__).parents[2] / "tableaux"
FILES = sorted(TABLEAUX.glob("order-*/*.toml"), key=lambda path: path.stem)

EXACT, ROUNDED = 1e-40, 1e-12
"""A residual counts as zero up to these: for files without, and with, a stated number of trusted digits."""

MOST_NODES = 11
"""Trees have at most so many nodes here; `python -m tests.independent.tree_formulas` looks at all of them."""

HIGHER_THAN_CLAIMED: dict[str, str] = {}
"""Slugs of methods whose true order is above the published claim, each with the reason."""

CLAIMS: dict[str, tuple[int, int | None, str]] = {
    "euler-1": (1, None, "Euler 1768"),
    "fehlberg-1-2": (1, 2, "Fehlberg, NASA TR R-315, 1969"),
    "midpoint-2": (2, None, "Runge 1895"),
    "heun-2": (2, None, "Heun 1900"),
    "ralston-2": (2, None, "Ralston 1962"),
    "heun-euler-2-1": (2, 1, "textbooks"),
    "ssp-2-stages-3": (2, None, "Spiteri and Ruuth 2002"),
    "ssp-2-stages-4": (2, None, "Spiteri and Ruuth 2002"),
    "fehlberg-2-3": (2, 3, "Fehlberg, NASA TR R-315, 1969"),
    "sofroniou-spaletta-2-1": (2, 1, "Sofroniou and Spaletta 2004"),
    "jameson-schmidt-turkel-2": (2, None, "Jameson, Schmidt and Turkel 1981"),
    "kutta-3": (3, None, "Kutta 1901"),
    "heun-3": (3, None, "Heun 1900"),
    "ralston-3": (3, None, "Ralston 1962"),
    "nystrom-3": (3, None, "Nyström 1925"),
    "runge-3": (3, None, "Runge 1895"),
    "ssp-3-stages-3": (3, None, "Shu and Osher 1988"),
    "ssp-3-stages-4": (3, None, "Kraaijevanger 1991; Spiteri and Ruuth 2002"),
    "ssp-3-stages-5": (3, None, "Ruuth 2006"),
    "ssp-3-stages-9": (3, None, "Ketcheson 2008"),
    "bogacki-shampine-3-2": (3, 2, "Bogacki and Shampine 1989"),
    "sofroniou-spaletta-3-2": (3, 2, "Sofroniou and Spaletta 2004"),
    "owren-zennaro-3-2": (3, 2, "Owren and Zennaro 1992"),
    "fehlberg-3-4": (3, 4, "Fehlberg, NASA TR R-315, 1969"),
    "williamson-3": (3, None, "Williamson 1980"),
    "wray-3": (3, None, "Spalart, Moser and Rogers 1991"),
    "kennedy-carpenter-lewis-3-2": (3, 2, "Kennedy, Carpenter and Lewis 2000"),
    "kutta-4": (4, None, "Kutta 1901"),
    "kutta-three-eighths-4": (4, None, "Kutta 1901"),
    "gill-4": (4, None, "Gill 1951"),
    "ralston-4": (4, None, "Ralston 1962"),
    "kuntzmann-4": (4, None, "Kuntzmann 1959"),
    "hull-johnston-4": (4, None, "Hull and Johnston 1964"),
    "merson-4-3": (4, 3, "Merson 1957; that the comparison is of order 3 in general: later textbooks"),
    "england-4-5": (4, 5, "England 1969"),
    "fehlberg-4-5": (4, 5, "Fehlberg, NASA TR R-315, 1969"),
    "fehlberg-formula-one-4-5": (4, 5, "Fehlberg, NASA TR R-315, 1969"),
    "zonneveld-4-3": (4, 3, "Zonneveld 1963"),
    "sofroniou-spaletta-4-3": (4, 3, "Sofroniou and Spaletta 2004"),
    "ceschino-4-2": (4, 2, "Ceschino 1962"),
    "scraton-4": (4, None, "Scraton 1964"),
    "ssp-4-stages-5": (4, None, "Kraaijevanger 1991; Spiteri and Ruuth 2002"),
    "ssp-4-stages-10": (4, None, "Ketcheson 2008"),
    "carpenter-kennedy-4": (4, None, "Carpenter and Kennedy, NASA TM 109112, 1994"),
    "berland-bogey-bailly-4": (4, None, "Berland, Bogey and Bailly 2006"),
    "kennedy-carpenter-lewis-4-3": (4, 3, "Kennedy, Carpenter and Lewis 2000"),
    "niegemann-diehl-busch-4-stages-12": (4, None, "Niegemann, Diehl and Busch 2012"),
    "niegemann-diehl-busch-4-stages-13": (4, None, "Niegemann, Diehl and Busch 2012"),
    "niegemann-diehl-busch-4-stages-14": (4, None, "Niegemann, Diehl and Busch 2012"),
    "toulorge-desmet-4-stages-8": (4, None, "Toulorge and Desmet 2012"),
}


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.stem)
def test_each_weight_vector_attains_its_claimed_order_and_no_higher(path: Path) -> None:
    data = load(path)
    looked_at = None if data["order"] < MOST_NODES else MOST_NODES
    report = orders(data, up_to=looked_at, tolerance=EXACT if data["digits"] is None else ROUNDED)
    assert report.row_sums <= report.tolerance
    for part in (report.weights, report.embedded, report.continuous):
        if part is None:
            continue
        higher = path.stem in HIGHER_THAN_CLAIMED and part is report.weights
        expected = part.claimed + higher if looked_at is None else min(part.claimed, looked_at)
        assert part.order == expected, {order: float(r) for order, r in part.residuals.items()}


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.stem)
def test_each_file_lies_in_the_folder_of_its_order_under_its_own_slug(path: Path) -> None:
    data = load(path)
    assert path.parent.name == f"order-{data['order']}"
    assert path.stem == data["slug"]


def test_no_two_files_hold_the_same_method() -> None:
    numbers: dict[tuple[object, ...], str] = {}
    for path in FILES:
        data = load(path, dps=20)
        entries = [
            *data["weights"],
            *(data["embedded"] or []),
            *(entry for row in data["matrix"] for entry in row),
        ]
        key = (data["embedded"] is None, data["continuous"] is None, *(round(float(x), 12) for x in entries))
        assert key not in numbers, f"{path.stem} repeats {numbers[key]}"
        numbers[key] = path.stem


def test_the_tables_of_claims_name_every_file_of_orders_one_to_four_once() -> None:
    files = sorted(path.stem for path in FILES if int(path.parent.name.removeprefix("order-")) <= 4)
    assert sorted([*CLAIMS, *(slug for slug, claim in MORE_CLAIMS.items() if claim[0] <= 4)]) == files


@pytest.mark.parametrize("slug", [*CLAIMS, *MORE_CLAIMS])
def test_the_file_claims_what_its_paper_claims(slug: str) -> None:
    order, embedded_order, paper = (CLAIMS | MORE_CLAIMS)[slug]
    data = tomllib.loads((TABLEAUX / f"order-{order}" / f"{slug}.toml").read_text(encoding="utf-8"))
    assert (data["order"], data.get("embedded", {}).get("order")) == (order, embedded_order), paper
    if slug in MORE_CLAIMS:
        assert str(data["year"]) == paper.split()[-1]
