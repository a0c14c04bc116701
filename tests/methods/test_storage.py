"""Storage forms: multiplied out they are the method, a wrong digit fails the proof, files keep them."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import attrs
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from newel.catalogue.shipped import tableau_files
from newel.errors import BadTableau
from newel.methods.exact import Exact
from newel.methods.order_conditions import proof_key, prove
from newel.methods.storage import FORMS, Storage
from newel.methods.tableau import Tableau
from newel.methods.tableau_file import format_tableau, parse_tableau

pytestmark = pytest.mark.core

# J. H. Williamson, J. Comput. Phys. 35 (1980) 48-56, case 7; from memory.
WILLIAMSON = {"A": ["0", "-5/9", "-153/128"], "B": ["1/3", "15/16", "8/15"]}


def williamson(**changes: Any) -> Tableau:
    return Tableau(
        "williamson",
        order=3,
        matrix=[[], ["1/3"], ["-3/16", "15/16"]],
        weights=["1/6", "3/10", "8/15"],
        storage=Storage("williamson", **{**WILLIAMSON, **changes}),
    )


def built_in(slug: str) -> Tableau:
    return parse_tableau(tableau_files()[slug].read_text(encoding="utf-8"))


SLUGS = [slug for slug, file in tableau_files().items() if "[storage]" in file.read_text(encoding="utf-8")]


def test_all_three_forms_are_among_the_files() -> None:
    assert {built_in(slug).storage.form for slug in SLUGS} == set(FORMS)  # type: ignore[union-attr]  # they have one


@pytest.mark.parametrize("slug", SLUGS)
def test_a_step_in_the_storage_form_is_the_step_of_the_tableau(slug: str) -> None:
    """The form is run as its source describes it, and its rates and result held against the Butcher form."""
    tableau = built_in(slug)
    form = tableau.storage
    assert form is not None
    y, h = 0.7, 0.3

    def rate(u: float) -> float:
        return u * u - u / 3 + 1

    rates: list[float] = []
    for row in tableau.A:
        rates.append(rate(y + h * sum(a * k for a, k in zip(row, rates, strict=False))))
    wanted = y + h * sum(b * k for b, k in zip(tableau.b, rates, strict=True))
    assert run(form, rate, y, h) == pytest.approx(wanted, rel=1e-12)


def run(form: Storage, rate: Any, u: float, h: float) -> float:
    if form.form == "williamson":
        register = 0.0
        for a, b in zip(form.A or (), form.B or (), strict=True):
            register = float(a) * register + h * rate(u)
            u += float(b) * register
        return u
    if form.form == "van-der-houwen":
        weights, stage = [float(b) for b in form.weights or ()], u
        for b, below in zip(weights, [*(float(a) for a in form.subdiagonal or ()), 0.0], strict=True):
            k = rate(stage)
            stage = u + h * below * k
            u += h * b * k
        return u
    states = [u]
    rates: list[float] = []
    for alpha, beta in zip(form.alpha or (), form.beta or (), strict=True):
        rates.append(rate(states[-1]))
        states.append(
            sum(float(a) * y for a, y in zip(alpha, states, strict=True))
            + h * sum(float(b) * k for b, k in zip(beta, rates, strict=True))
        )
    return states[-1]


@pytest.mark.parametrize("slug", SLUGS)
def test_a_file_keeps_its_form(slug: str) -> None:
    tableau = built_in(slug)
    assert parse_tableau(format_tableau(tableau)) == tableau
    assert tableau.storage is not None


def test_a_right_form_is_proved_exactly() -> None:
    assert prove(williamson()).outcome == "exact"


@pytest.mark.parametrize(
    ("changes", "place"),
    [
        ({"A": ["0", "5/9", "-153/128"]}, "matrix[3][1]"),
        ({"B": ["1/3", "15/16", "8/16"]}, "weights[1]"),
        ({"B": ["0.33333", "15/16", "8/15"], "digits": 6}, "matrix[2][1]"),
    ],
)
def test_a_wrong_number_fails_the_proof_and_is_placed(changes: dict[str, Any], place: str) -> None:
    verdict = prove(williamson(**changes))
    assert verdict.outcome == "fails"
    assert {failure.part for failure in verdict.failures} == {"storage"}
    assert verdict.failures[0].condition == place
    assert place in verdict.failures[0].message


def test_decimals_hold_within_their_digits_alone() -> None:
    decimals = {"A": ["0", "-0.5555555555555556", "-153/128"], "B": ["0.3333333333333333", "15/16", "8/15"]}
    verdict = prove(williamson(**decimals, digits=16))
    assert (verdict.outcome, verdict.digits) == ("rounded", 16)
    assert prove(williamson(**decimals, digits=30)).outcome == "fails"


small = st.fractions(-2, 2, max_denominator=9)


@settings(deadline=None, derandomize=True, max_examples=40)
@given(st.lists(st.tuples(small, small), min_size=1, max_size=4))
def test_williamsons_form_multiplied_out_takes_the_same_step(pairs: list[tuple[Fraction, Fraction]]) -> None:
    a, b = [Fraction(0), *(x for x, _ in pairs[1:])], [y for _, y in pairs]
    matrix, weights = Storage("williamson", A=a, B=b).butcher()

    def rate(u: Fraction) -> Fraction:
        return u * u + 1

    u, register, h = Fraction(1, 3), Fraction(0), Fraction(1, 2)
    y, rates = u, []
    for x, z in zip(a, b, strict=True):
        register = x * register + h * rate(u)
        u += z * register
    for row in matrix:
        rates.append(
            rate(y + h * sum((m.rational * k for m, k in zip(row, rates, strict=True)), Fraction(0)))
        )
    assert u == y + h * sum((w.rational * k for w, k in zip(weights, rates, strict=True)), Fraction(0))


def test_the_form_takes_no_part_in_the_digest_but_in_the_key_of_the_proof() -> None:
    with_form = williamson()
    without = attrs.evolve(with_form, storage=None)
    assert with_form.digest == without.digest
    assert len({proof_key(x) for x in (with_form, without, williamson(digits=20))}) == 3


@pytest.mark.parametrize(
    ("arguments", "key"),
    [
        (("two-registers",), "storage.form"),
        (("williamson",), "storage.A"),
        (("williamson", ["0"], ["1"], [["1"]]), "storage.alpha"),
        (("williamson", ["1"], ["1"]), "storage.A[1]"),
        (("williamson", ["0", "1"], ["1"]), "storage.A"),
        (("williamson", [], []), "storage.B"),
        (("williamson", ["0"], ["0.5"]), "storage.B"),
    ],
)
def test_a_form_that_is_none_is_refused_by_key(arguments: tuple[Any, ...], key: str) -> None:
    names = ("A", "B", "alpha")
    with pytest.raises(BadTableau) as caught:
        Storage(arguments[0], **dict(zip(names, arguments[1:], strict=False)))
    assert caught.value.key == key


def test_shu_oshers_rows_are_held_to_their_lengths_and_sums() -> None:
    with pytest.raises(BadTableau, match=r"row 2 has 2"):
        Storage("shu-osher", alpha=[[1], [1]], beta=[[1], [0, 1]])
    with pytest.raises(BadTableau, match=r"1/2; a row of alpha sums to 1"):
        Storage("shu-osher", alpha=[["1/2"]], beta=[[1]])
    with pytest.raises(BadTableau, match=r"2 rows; 1 are needed"):
        Storage("shu-osher", alpha=[[1], [0, 1]], beta=[[1]])


def test_a_form_of_other_stages_is_refused() -> None:
    with pytest.raises(BadTableau, match="1 stages, but 2 weights"):
        Tableau("t", order=1, matrix=[[], [1]], weights=[1, 0], storage=Storage("williamson", A=[0], B=[1]))
    with pytest.raises(BadTableau, match="is no Storage"):
        Tableau("t", order=1, matrix=[[]], weights=[1], storage="williamson")  # type: ignore[arg-type]  # on purpose


HEAD = format_tableau(attrs.evolve(williamson(), storage=None))


@pytest.mark.parametrize(
    ("section", "key"),
    [
        ("A = ['0']", "storage.form"),
        ("form = 'williamson'\nA = ['0', '1', '1']\nB = ['1', '1', 0.5]", "storage.B[3]"),
        ("form = 'williamson'\nAA = ['0']", "AA"),
        (
            "form = 'williamson'\nA = ['0', '1', '1']\nB = ['1', '1', '0.5']\ndigits = {A = 3}",
            "storage.digits",
        ),
        ("form = 3", "storage.form"),
    ],
)
def test_a_bad_section_of_a_file_is_refused_by_key(section: str, key: str) -> None:
    with pytest.raises(BadTableau) as caught:
        parse_tableau(f"{HEAD}\n[storage]\n{section}\n")
    assert caught.value.key == key


def test_exact_numbers_with_roots_are_bounded_too() -> None:
    form = Storage("williamson", A=["0", "sqrt(2)"], B=["1/2", "0.25"], digits=3)
    bound = form.bounded()[2][0][1]
    assert float(bound) == pytest.approx(2**0.5 * 0.0005, rel=1e-6)
    assert form.butcher()[1][0] == Exact.of("1/2 + sqrt(2)/4")
