"""Orders and error constants of the methods of order 5 and up, against their papers.

The claimed orders are those of the papers named in the table; papers and labels are quoted from memory.
Each order is tested by `tests.independent.tree_formulas`, which shares no code with newel. The norms are
A^(p+1)_2, the 2-norm over the trees of order p+1 of (b Phi - 1/gamma)/sigma (J. R. Dormand and P. J. Prince,
J. Comput. Appl. Math. 6 (1980) 19-26). Where a paper prints one it stands in PRINTED_NORMS, from memory, with
the digits printed; the ten digits in CLAIMS were computed in exact fractions and surds by other code,
written for that purpose alone.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from fractions import Fraction
from functools import cache
from pathlib import Path
from typing import Any, NamedTuple

import mpmath
import pytest

from tests.independent import tree_formulas as formulas
from tests.published.claims_more import MORE_CLAIMS

TABLEAUX = Path(__file__).parents[2] / "tableaux"
FOLDERS = tuple(f"order-{order}" for order in range(5, 17))


class Claim(NamedTuple):
    """What a paper claims, and the error norms of the main and the embedded solution."""

    slug: str
    paper: str
    order: int
    norm: str
    embedded_order: int | None = None
    embedded_norm: str | None = None


CLAIMS = (
    Claim("bogacki-shampine-5-4", "Bogacki & Shampine 1996", 5, "2.216932778e-05", 4, "1.061549778e-04"),
    Claim("butcher-2003-5", "Butcher 2003", 5, "1.369768562e-03"),
    Claim("butcher-5", "Butcher 1964", 5, "9.801727249e-04"),
    Claim("cash-karp-5-4", "Cash & Karp 1990", 5, "9.482886175e-04", 4, "5.390749137e-04"),
    Claim("cassity-5", "Cassity 1966", 5, "1.356506211e-02"),
    Claim("dormand-prince-5-4", "Dormand & Prince 1980", 5, "3.990801609e-04", 4, "1.182957151e-03"),
    Claim(
        "dormand-prince-six-stage-5-4", "Dormand & Prince 1980", 5, "1.226633454e-03", 4, "2.226575597e-03"
    ),
    Claim("dormand-prince-stable-5-4", "Dormand & Prince 1980", 5, "1.813084927e-03", 4, "4.206902756e-04"),
    Claim("england-5-4", "England 1969", 5, "7.360752961e-03", 4, "1.313032667e-02"),
    Claim("fehlberg-5-4", "Fehlberg 1969", 5, "3.355744693e-03", 4, "1.839243418e-03"),
    Claim("fehlberg-5-6", "Fehlberg 1968", 5, "6.691198577e-04", 6, "1.192300077e-03"),
    Claim("fehlberg-formula-one-5-4", "Fehlberg 1969", 5, "1.448108938e-03", 4, "3.078573166e-03"),
    Claim("higham-hall-5-4", "Higham & Hall 1990", 5, "1.797083638e-03", 4, "2.043078163e-03"),
    Claim("kutta-5", "Kutta 1901", 5, "4.043299594e-03"),
    Claim("lawson-5", "Lawson 1966", 5, "1.480791850e-03"),
    Claim("nystrom-5", "Nyström 1925", 5, "3.840684488e-03"),
    Claim("owren-zennaro-5", "Owren & Zennaro 1992", 5, "1.086231574e-03"),
    Claim(
        "papakostas-papageorgiou-5-4",
        "Papakostas & Papageorgiou 1996",
        5,
        "1.489411271e-03",
        4,
        "7.479014032e-04",
    ),
    Claim(
        "papakostas-papageorgiou-second-5-4",
        "Papakostas & Papageorgiou 1996",
        5,
        "9.379167867e-04",
        4,
        "2.291119697e-03",
    ),
    Claim("tsitouras-2011-5-4", "Tsitouras 2011", 5, "1.385149964e-04", 4, "1.064972833e-03"),
    Claim("butcher-6", "Butcher 1964", 6, "1.501965818e-03"),
    Claim("butcher-lobatto-6", "Butcher 1964", 6, "2.372032917e-03"),
    Claim("butcher-sixths-6", "Butcher 1964", 6, "4.944017076e-03"),
    Claim(
        "calvo-montijano-randez-6-5",
        "Calvo, Montijano & Rández 1990",
        6,
        "6.005272641e-05",
        5,
        "3.393143748e-04",
    ),
    Claim("fehlberg-6-5", "Fehlberg 1968", 6, "1.192300077e-03", 5, "6.691198577e-04"),
    Claim("fehlberg-6-7", "Fehlberg 1968", 6, "4.292760480e-04", 7, "3.492492134e-04"),
    Claim("huta-6", "Huťa 1956", 6, "8.977454010e-03"),
    Claim("luther-6", "Luther 1968", 6, "4.525878382e-03"),
    Claim("prince-dormand-6-5", "Prince & Dormand 1981", 6, "2.326287006e-04", 5, "1.845470108e-04"),
    Claim("prince-dormand-stable-6-5", "Prince & Dormand 1981", 6, "1.230825570e-03", 5, "1.336871557e-03"),
    Claim("verner-1978-6-5", "Verner 1978", 6, "2.072401101e-03", 5, "6.955820586e-04"),
    Claim("verner-2010-6-5", "Verner 2010", 6, "1.010283654e-04", 5, "5.494612310e-04"),
    Claim("butcher-7", "Butcher 1965", 7, "7.187784730e-04"),
    Claim("fehlberg-7-6", "Fehlberg 1968", 7, "3.492492134e-04", 6, "4.292760480e-04"),
    Claim("fehlberg-7-8", "Fehlberg 1968", 7, "1.100651234e-05", 8, "1.090585251e-05"),
    Claim("verner-1978-7-6", "Verner 1978", 7, "1.973449219e-04", 6, "5.511718483e-04"),
    Claim("cooper-verner-8", "Cooper & Verner 1972", 8, "1.226396827e-04"),
    Claim("fehlberg-8-7", "Fehlberg 1968", 8, "1.090585251e-05", 7, "1.100651234e-05"),
    Claim(
        "hairer-norsett-wanner-8-5",
        "Hairer, Nørsett & Wanner 1993",
        8,
        "6.263412404e-06",
        5,
        "1.480374149e-04",
    ),
    Claim("prince-dormand-8-7", "Prince & Dormand 1981", 8, "4.507447200e-06", 7, "2.879665418e-05"),
    Claim("verner-1978-8-7", "Verner 1978", 8, "1.742114340e-05", 7, "3.823592641e-05"),
    Claim("verner-1978-9-8", "Verner 1978", 9, "6.111339725e-05", 8, "1.157354232e-04"),
)
NAMES = [claim.slug for claim in CLAIMS]

PRINTED_NORMS = {
    # Dormand & Prince 1980 for their own pair, the others as quoted in later papers; all from memory.
    ("dormand-prince-5-4", "weights"): "3.99e-4",
    ("dormand-prince-5-4", "embedded"): "1.18e-3",
    ("fehlberg-5-4", "weights"): "3.36e-3",
    ("fehlberg-5-4", "embedded"): "1.84e-3",
    ("cash-karp-5-4", "weights"): "9.48e-4",
    # Prince & Dormand 1981, from memory.
    ("prince-dormand-8-7", "weights"): "4.51e-6",
}

STABILITY_COEFFICIENTS = {
    # Of the order's weights beyond the Taylor part, by power of z; computed by other code in exact fractions.
    "fehlberg-5-4": {6: "1/2080"},
    "cash-karp-5-4": {6: "1/800"},
    "dormand-prince-5-4": {6: "1/600", 7: "0"},
    "bogacki-shampine-5-4": {6: "17291/12418560", 7: "269/1379840"},
    "lawson-5": {6: "1/1280"},
    "butcher-6": {7: "-1/2160"},
    "huta-6": {7: "1/4480", 8: "1/483840"},
    "verner-1978-6-5": {7: "1/5400", 8: "0"},
}
EMBEDDED_STABILITY_COEFFICIENTS = {
    "fehlberg-5-4": {5: "1/104", 6: "0"},
    "cash-karp-5-4": {5: "10517/1228800", 6: "1771/1638400"},
    "dormand-prince-5-4": {5: "1097/120000", 6: "161/120000", 7: "1/24000"},
    "verner-1978-6-5": {6: "1/540"},
}
REAL_LIMITS = {
    # Largest x with |R(-t)| <= 1 on [0, x]; computed by other code to 40 digits.
    ("fehlberg-5-4", "weights"): "3.677706621322",
    ("fehlberg-5-4", "embedded"): "3.020017543971",
    ("cash-karp-5-4", "weights"): "3.734359607235",
    ("cash-karp-5-4", "embedded"): "4.207827305833",
    ("dormand-prince-5-4", "weights"): "3.306567892635",
    ("dormand-prince-5-4", "embedded"): "4.384986320802",
}
QUALITY = {
    # B, C, E and D as Dormand & Prince define them; they print D = 11.6 for their pair (from memory), the
    # rest was computed by other code in exact fractions.
    "dormand-prince-5-4": ("1.5416912", "1.6653347", "0.337358", "11.5957933"),
    "cash-karp-5-4": ("2.1392863", "1.3784556", "1.7591", "2.59259"),
    "fehlberg-5-4": ("3.156261", "1.3641503", "1.82452", "8"),
    "verner-1978-6-5": ("3.7491074", "1.4801549", "2.97938", "9.1667"),
}


@cache
def document(slug: str) -> dict[str, Any]:
    (path,) = TABLEAUX.glob(f"order-*/{slug}.toml")
    return tomllib.loads(path.read_text(encoding="utf-8"))


@cache
def numbers(slug: str) -> dict[str, Any]:
    return formulas.from_document(document(slug), dps=60)


def same_digits(value: mpmath.mpf, printed: str) -> bool:
    """Whether `value`, rounded to as many digits as printed, is the printed number."""
    digits = len(printed.lower().split("e")[0].replace(".", "").lstrip("-0"))
    half_unit = mpmath.mpf(10) ** (mpmath.floor(mpmath.log10(abs(mpmath.mpf(printed)))) - digits + 1) / 2
    return bool(abs(value - mpmath.mpf(printed)) <= half_unit * (1 + mpmath.mpf(10) ** -6))


def stability_coefficients(data: Mapping[str, Any], weights: Sequence[Any]) -> list[mpmath.mpf]:
    """Coefficients of R(z) = 1 + sum of b A^(k-1) 1 z^k."""
    powers, coefficients = [mpmath.mpf(1)] * len(weights), [mpmath.mpf(1)]
    for _ in weights:
        coefficients.append(mpmath.fdot(weights, powers))
        powers = [mpmath.fdot(row, powers) for row in data["matrix"]]
    return coefficients


def tree_errors(data: Mapping[str, Any], weights: Sequence[Any], order: int) -> list[mpmath.mpf]:
    """(b Phi - 1/gamma)/sigma of each tree of that order."""
    phi = formulas.stage_values(data["matrix"])
    return [
        (mpmath.fdot(weights, phi(tree)) - mpmath.mpf(1) / formulas.density(tree)) / formulas.symmetry(tree)
        for tree in formulas.rooted_trees(order)
    ]


def polynomial(coefficients: Sequence[Any], place: mpmath.mpf) -> mpmath.mpf:
    """The polynomial whose constant comes first."""
    return mpmath.fsum(entry * place**power for power, entry in enumerate(coefficients))


def two_norm(values: Sequence[Any]) -> mpmath.mpf:
    return mpmath.sqrt(mpmath.fsum(value**2 for value in values))


def changed(slug: str, part: str, row: int, column: int | None, change: Fraction) -> dict[str, Any]:
    """The numbers of a file with one entry changed (places counted from 1) and nodes as row sums."""
    copy = dict(numbers(slug))
    added = mpmath.mpf(change.numerator) / change.denominator
    if column is None:
        copy[part] = [value + added * (place == row) for place, value in enumerate(copy[part], start=1)]
        return copy
    copy["matrix"] = [list(entries) for entries in copy["matrix"]]
    copy["matrix"][row - 1][column - 1] += added
    copy["nodes"] = [mpmath.fsum(entries) for entries in copy["matrix"]]
    return copy


def test_every_file_of_these_orders_stands_in_a_table_once() -> None:
    files = sorted(path.stem for folder in FOLDERS for path in (TABLEAUX / folder).glob("*.toml"))
    assert sorted([*NAMES, *(slug for slug, claim in MORE_CLAIMS.items() if claim[0] >= 5)]) == files


@pytest.mark.parametrize("claim", CLAIMS, ids=NAMES)
def test_the_orders_are_those_of_the_paper_and_no_higher(claim: Claim) -> None:
    data, year = numbers(claim.slug), claim.paper.split()[-1]
    report = formulas.orders(data)
    assert (report.weights.order, data["order"]) == (claim.order, claim.order)
    assert str(document(claim.slug)["year"]) == year
    assert report.row_sums <= report.tolerance
    assert data["embedded_order"] == claim.embedded_order
    if claim.embedded_order is not None:
        assert report.embedded is not None
        assert report.embedded.order == claim.embedded_order
    if data["continuous"] is not None:
        assert report.continuous is not None
        assert report.continuous.order == data["continuous_order"]


@pytest.mark.parametrize("claim", CLAIMS, ids=NAMES)
def test_the_principal_error_norms_are_those_computed_elsewhere(claim: Claim) -> None:
    data = numbers(claim.slug)
    assert same_digits(formulas.error_norm(data, data["weights"], claim.order + 1), claim.norm)
    if claim.embedded_order is not None and claim.embedded_norm is not None:
        norm = formulas.error_norm(data, data["embedded"], claim.embedded_order + 1)
        assert same_digits(norm, claim.embedded_norm)


@pytest.mark.parametrize(("slug", "part"), PRINTED_NORMS, ids=str)
def test_the_principal_error_norms_are_those_in_print(slug: str, part: str) -> None:
    data = numbers(slug)
    order = data["order"] if part == "weights" else data["embedded_order"]
    assert same_digits(formulas.error_norm(data, data[part], order + 1), PRINTED_NORMS[slug, part])


@pytest.mark.parametrize(
    ("part", "slug", "wanted"),
    [("weights", *item) for item in STABILITY_COEFFICIENTS.items()]
    + [("embedded", *item) for item in EMBEDDED_STABILITY_COEFFICIENTS.items()],
)
def test_stability_polynomials_go_beyond_the_exponential_as_computed_elsewhere(
    part: str, slug: str, wanted: Mapping[int, str]
) -> None:
    with mpmath.workdps(50):
        coefficients = stability_coefficients(numbers(slug), numbers(slug)[part])
        for power, text in wanted.items():
            assert abs(coefficients[power] - formulas.evaluate(text)) < 1e-40


@pytest.mark.parametrize(("slug", "part"), REAL_LIMITS, ids=str)
def test_real_stability_limits_are_those_computed_elsewhere(slug: str, part: str) -> None:
    printed = mpmath.mpf(REAL_LIMITS[slug, part])
    with mpmath.workdps(30):
        coefficients = stability_coefficients(numbers(slug), numbers(slug)[part])
        radius = [abs(polynomial(coefficients, -printed * k / 400)) for k in range(1, 400)]
        assert max(radius) < 1
        assert abs(polynomial(coefficients, -printed * (1 - mpmath.mpf(10) ** -11))) < 1
        assert abs(polynomial(coefficients, -printed * (1 + mpmath.mpf(10) ** -11))) > 1


@pytest.mark.parametrize("slug", QUALITY)
def test_the_quality_figures_of_pairs_are_those_of_dormand_and_prince(slug: str) -> None:
    data = numbers(slug)
    low = data["embedded_order"]
    first = two_norm(tree_errors(data, data["embedded"], low + 1))
    second = tree_errors(data, data["embedded"], low + 2)
    main_error = tree_errors(data, data["weights"], low + 2)
    largest = max(abs(entry) for row in [*data["matrix"], data["weights"]] for entry in row)
    apart = two_norm([main - other for main, other in zip(main_error, second, strict=True)])
    figures = (two_norm(second) / first, apart / first, two_norm(main_error) / first, largest)
    for figure, printed in zip(figures, QUALITY[slug], strict=True):
        assert same_digits(figure, printed)


def test_dormand_prince_output_between_steps_has_the_error_norms_of_the_quartic() -> None:
    # A^(5)_2 of the order 4 extension of Shampine, Math. Comp. 46 (1986), over theta; computed by other code.
    data = numbers("dormand-prince-5-4")
    for theta, printed in (("0.25", "8.350e-4"), ("0.5", "4.0426e-4"), ("0.75", "6.097e-4")):
        place = mpmath.mpf(theta)
        phi = formulas.stage_values(data["matrix"])
        weights = [polynomial([0, *row], place) for row in data["continuous"]]
        residuals = [
            (mpmath.fdot(weights, phi(tree)) - place**5 / formulas.density(tree)) / formulas.symmetry(tree)
            for tree in formulas.rooted_trees(5)
        ]
        assert same_digits(two_norm(residuals), printed)


def test_dormand_prince_passes_through_the_midpoint_of_shampine() -> None:
    # L. F. Shampine, Math. Comp. 46 (1986) 135-150: weights of y at the middle of the step, from memory.
    texts = (
        "6025192743/30085553152", "0", "51252292925/65400821598", "-2691868925/45128329728",
        "187940372067/1594534317056", "-1776094331/19743644256", "11237099/235043384",
    )  # fmt: skip
    half = mpmath.mpf("0.5")
    for row, text in zip(numbers("dormand-prince-5-4")["continuous"], texts, strict=True):
        assert abs(polynomial([0, *row], half) - formulas.evaluate(text) / 2) < 1e-14


@pytest.mark.parametrize("slug", ["dormand-prince-5-4", "tsitouras-2011-5-4", "owren-zennaro-5"])
def test_output_between_steps_joins_its_ends_smoothly(slug: str) -> None:
    data = numbers(slug)
    with mpmath.workdps(50):
        for stage, (row, weight) in enumerate(zip(data["continuous"], data["weights"], strict=True), start=1):
            assert abs(mpmath.fsum(row) - weight) < 1e-36
            assert row[0] == (stage == 1)
            slope = mpmath.fsum(power * entry for power, entry in enumerate(row, start=1))
            assert abs(slope - (stage == len(data["weights"]))) < 1e-36


@pytest.mark.parametrize(
    "slug", ["fehlberg-5-6", "fehlberg-6-5", "fehlberg-6-7", "fehlberg-7-6", "fehlberg-7-8"]
)
def test_the_high_pairs_of_fehlberg_are_blind_to_pure_quadrature(slug: str) -> None:
    # Fehlberg 1968: the weight vectors differ only at nodes 0 and 1, where stages repeat (computed).
    data = numbers(slug)
    for power in range(9):
        columns = [node**power for node in data["nodes"]]
        assert abs(mpmath.fdot(data["weights"], columns) - mpmath.fdot(data["embedded"], columns)) < 1e-40
    assert "pure quadrature" in " ".join(document(slug)["notes"]["known_failures"])


@pytest.mark.parametrize("slug", ["verner-1978-6-5", "verner-1978-7-6", "verner-1978-8-7", "verner-1978-9-8"])
def test_the_pairs_of_verner_see_pure_quadrature(slug: str) -> None:
    # The embedded rules of Verner 1978 miss the first power beyond their order (computed).
    data = numbers(slug)
    columns = [node ** data["embedded_order"] for node in data["nodes"]]
    assert abs(mpmath.fdot(data["weights"], columns) - mpmath.fdot(data["embedded"], columns)) > 1e-6


def test_the_fractions_of_prince_and_dormand_are_roundings() -> None:
    # Prince & Dormand 1981, RK8(7)13M; the defects of the printed fractions were computed by other code.
    data = numbers("prince-dormand-8-7")
    with mpmath.workdps(40):
        assert same_digits(mpmath.fsum(data["weights"]) - 1, "-3.685314673e-18")
        assert same_digits(mpmath.fsum(data["embedded"]) - 1, "7.710972675e-19")
    report = formulas.orders(data)
    assert report.embedded is not None
    assert same_digits(report.weights.worst, "6.5e-18")
    assert same_digits(max(report.embedded.residuals[order] for order in range(1, 8)), "6.4e-18")
    assert same_digits(report.row_sums, "1.0e-17")


@pytest.mark.parametrize(
    ("row", "order"), [(2, 4), (3, 1), (4, 2), (5, 1), (6, 1)], ids=lambda value: str(value)
)
def test_a_misprint_of_one_eighty_first_spoils_every_row_of_nystrom(row: int, order: int) -> None:
    # Nyström 1925 corrects slips of Kutta 1901; the orders left by such a slip were computed by other code.
    for column in range(1, row):
        data = changed("nystrom-5", "matrix", row, column, Fraction(1, 81))
        assert formulas.orders(data).weights.order == order


def test_a_misprint_in_any_weight_of_nystrom_is_seen_at_once() -> None:
    for place in range(1, 7):
        data = changed("nystrom-5", "weights", place, None, Fraction(1, 192))
        assert formulas.orders(data).weights.order == 0
    lost_sign = list(numbers("nystrom-5")["weights"])
    lost_sign[4] = abs(lost_sign[4])
    assert abs(mpmath.fsum(lost_sign) - formulas.evaluate("59/32")) < 1e-12


@pytest.mark.parametrize("row", [4, 5, 6])
def test_the_two_fifth_order_tables_of_butcher_do_not_mix(row: int) -> None:
    first, second = numbers("butcher-5"), numbers("butcher-2003-5")
    assert first["nodes"] == second["nodes"]
    assert first["weights"] == second["weights"]
    mixed = dict(first)
    mixed["matrix"] = [*first["matrix"][: row - 1], second["matrix"][row - 1], *first["matrix"][row:]]
    assert formulas.orders(mixed).weights.order == 3


@pytest.mark.parametrize(
    ("carried", "other"),
    [("fehlberg-5-6", "fehlberg-6-5"), ("fehlberg-6-7", "fehlberg-7-6"), ("fehlberg-7-8", "fehlberg-8-7")],
)
def test_a_pair_run_the_other_way_round_has_the_same_numbers(carried: str, other: str) -> None:
    first, second = document(carried), document(other)
    assert (first["nodes"], first["matrix"]) == (second["nodes"], second["matrix"])
    assert first["weights"] == second["embedded"]["weights"]
    assert first["embedded"]["weights"] == second["weights"]


TSITOURAS_PRINTED = {
    # Ch. Tsitouras, Comput. Math. Appl. 62 (2011) 770-775, table 1, from memory: 15 or 16 digits in print.
    "nodes": ["0", "0.161", "0.327", "0.9", "0.9800255409045097", "1", "1"],
    "weights": [
        "0.09646076681806523", "0.01", "0.4798896504144996", "1.379008574103742", "-3.290069515436081",
        "2.324710524099774", "0",
    ],
    "row 6": [
        "5.325864828439257", "-11.74888356406283", "7.495539342889836", "-0.09249506636175525",
    ],
}  # fmt: skip


def test_the_refined_numbers_of_tsitouras_round_to_those_in_print() -> None:
    data = numbers("tsitouras-2011-5-4")
    pairs = [*zip(data["nodes"], TSITOURAS_PRINTED["nodes"], strict=True)]
    pairs += zip(data["weights"], TSITOURAS_PRINTED["weights"], strict=True)
    pairs += zip(data["matrix"][4][:4], TSITOURAS_PRINTED["row 6"], strict=True)
    assert max(abs(number - mpmath.mpf(text)) for number, text in pairs) < 3e-15


def test_the_refined_numbers_of_tsitouras_meet_the_conditions_to_35_digits() -> None:
    report = formulas.orders(numbers("tsitouras-2011-5-4"), tolerance=1e-35)
    assert report.embedded is not None
    assert report.continuous is not None
    assert (report.weights.order, report.embedded.order, report.continuous.order) == (5, 4, 4)


def test_the_weights_of_hairer_norsett_and_wanner_are_the_quadrature_rule_of_their_nodes() -> None:
    # With b2..b5 = 0 and eight nodes left, order 8 leaves one rule: Lagrange's on those nodes (closed form).
    data = numbers("hairer-norsett-wanner-8-5")
    with mpmath.workdps(50):
        nodes = [node for node, weight in zip(data["nodes"], data["weights"], strict=True) if weight]
        powers = mpmath.matrix([[node**power for node in nodes] for power in range(8)])
        rule = mpmath.lu_solve(powers, mpmath.matrix([mpmath.mpf(1) / (power + 1) for power in range(8)]))
        carried = [weight for weight in data["weights"] if weight]
        assert max(abs(a - b) for a, b in zip(carried, rule, strict=True)) < 2e-28
