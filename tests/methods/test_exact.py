"""Exact numbers a + b·√d and the text that they are read from."""

from __future__ import annotations

import copy
import operator
import pickle
from decimal import Decimal, localcontext
from fractions import Fraction
from math import inf, nextafter

import pytest
from hypothesis import assume, example, given, settings
from hypothesis import strategies as st

from newel.errors import BadNumber
from newel.methods.exact import Exact, parse_exact

pytestmark = pytest.mark.core

calm = settings(deadline=None, derandomize=True)
rationals = st.fractions(max_denominator=10**6)
radicands = st.sampled_from([2, 3, 5, 6, 7, 21, 999_983])


@st.composite
def fields(draw: st.DrawFn, count: int = 1) -> list[Exact]:
    """Draw numbers of one field Q(√d), rational ones among them."""
    d = draw(radicands)
    surds = st.one_of(st.just(Fraction(0)), rationals)
    return [Exact(draw(rationals), draw(surds), d) for _ in range(count)]


@calm
@given(fields(3))
def test_addition_and_multiplication_form_a_commutative_ring(numbers: list[Exact]) -> None:
    x, y, z = numbers
    assert (x + y) + z == x + (y + z)
    assert (x * y) * z == x * (y * z)
    assert x * (y + z) == x * y + x * z
    assert x + y == y + x
    assert x * y == y * x
    assert x + 0 == x == x * 1
    assert x - x == 0


@calm
@given(fields(2))
def test_division_undoes_multiplication(numbers: list[Exact]) -> None:
    x, y = numbers
    assume(y)
    assert x * y / y == x
    assert x / y * y == x
    assert y**-2 * y**3 == y


@calm
@given(fields(2))
def test_a_root_multiplied_by_itself_is_its_radicand(numbers: list[Exact]) -> None:
    d = numbers[0].radicand
    assert Exact(0, 1, d) ** 2 == d


@calm
@given(fields(2))
def test_order_agrees_with_fifty_digits_of_decimal_arithmetic(numbers: list[Exact]) -> None:
    x, y = numbers
    with localcontext() as context:
        context.prec = 200
        difference = _decimal(x) - _decimal(y)
        if abs(difference) < Decimal(10) ** -50:
            difference = Decimal(0)
    assert (x < y, x == y, x > y) == (difference < 0, difference == 0, difference > 0)
    assert (x <= y, x >= y) == (difference <= 0, difference >= 0)


def _decimal(x: Exact) -> Decimal:
    def quotient(part: Fraction) -> Decimal:
        return Decimal(part.numerator) / Decimal(part.denominator)

    return quotient(x.rational) + quotient(x.surd) * Decimal(x.radicand).sqrt()


def test_numbers_of_two_fields_are_ordered_though_they_cannot_be_added() -> None:
    # 17/12 > √2 by 0.0024; 99/70 − √2 is 7e-5; √3 − √2 = 0.3178
    assert Exact.of("sqrt(2)") < Exact.of("sqrt(3)")
    assert Exact.of("sqrt(3)") > Exact.of("sqrt(2)")
    assert Exact.of("sqrt(2) - 99/70 + sqrt(2)") < Exact.of("sqrt(3)")
    assert Exact.of("sqrt(2)") != Exact.of("sqrt(3)")


def test_two_numbers_of_different_fields_that_floats_cannot_part_are_ordered() -> None:
    root_two = Exact.of("sqrt(2)")
    near = Exact.of("sqrt(3)") - Fraction(3178372451957822, 10**16)  # within 1e-16 of √2
    below = Decimal(3).sqrt() - Decimal("0.3178372451957822") < Decimal(2).sqrt()
    assert (near < root_two) is below
    assert float(near) == pytest.approx(float(root_two), abs=5e-16)


@calm
@given(fields(1))
@example([Exact(Fraction(1, 3))])
@example([Exact(-4, 1, 2)])
@example([Exact(0, -1, 999_983)])
def test_text_reads_back_to_the_same_number(numbers: list[Exact]) -> None:
    (x,) = numbers
    assert parse_exact(str(x)) == x
    assert parse_exact(x.canonical).canonical == x.canonical
    assert eval(repr(x), {"Exact": Exact}) == x


@calm
@given(fields(1))
@example([Exact(Fraction(1, 10))])
@example([Exact(1 - 2**53 - 1, 1, 2)])
@example([Exact(Fraction(2**53 + 1))])
@example([Exact(2**53 + 3)])
@example([Exact(Fraction(3, 2**1075))])
@example([Exact(0, Fraction(1, 2**1073), 2)])
@example([Exact(0, Fraction(-1, 10**200), 3)])
@example([Exact(Fraction(131836323, 93222358), -1, 2)])  # a convergent of √2: cancels all but 1e-17
def test_float_is_the_nearest_float(numbers: list[Exact]) -> None:
    (x,) = numbers
    found = float(x)
    below, above = Fraction(nextafter(found, -inf)), Fraction(nextafter(found, inf))
    middle = Fraction(found)
    assert (below + middle) / 2 <= x <= (middle + above) / 2


def test_float_breaks_ties_to_even() -> None:
    assert float(Exact(2**53 + 1)) == 2.0**53
    assert float(Exact(2**53 + 3)) == 2.0**53 + 4


def test_float_of_a_surd_next_to_a_tie_goes_to_its_own_side() -> None:
    tiny = Exact(0, Fraction(1, 10**60), 2)
    assert float(2**53 + 1 + tiny) == 2.0**53 + 2
    assert float(2**53 + 1 - tiny) == 2.0**53
    assert float(2**53 + 3 - tiny) == 2.0**53 + 2


def test_float_of_a_surd_agrees_with_the_square_root_of_the_standard_library() -> None:
    assert float(Exact.of("sqrt(2)")) == 2.0**0.5
    assert float(Exact.of("-sqrt(21)/14")) == pytest.approx(-(21**0.5) / 14, rel=1e-15)


@calm
@given(rationals)
def test_a_rational_number_equals_and_hashes_like_its_fraction(value: Fraction) -> None:
    x = Exact(value)
    assert x == value
    assert value == x
    assert hash(x) == hash(value)
    assert {x: "here"}[value] == "here"
    if value.denominator == 1:
        assert x == int(value)
    assert x + Fraction(1, 7) == Fraction(1, 7) + x == Exact(value + Fraction(1, 7))
    assert 2 - x == Exact(2 - value)
    assert Fraction(1, 3) * x == Exact(value / 3)
    if value:
        assert 1 / x == Exact(1 / value)


@calm
@given(rationals, st.integers(1, 5000), st.integers(1, 40))
def test_the_radicand_is_square_free_and_a_perfect_square_folds_away(
    surd: Fraction, free: int, square: int
) -> None:
    assert Exact(0, surd, free * square**2) == Exact(0, surd * square, free)
    assert Exact(1, surd, square**2) == 1 + surd * square
    kept = Exact(0, 1, free).radicand
    assert all(kept % (p * p) for p in range(2, 71))


def test_large_radicands_are_reduced_too() -> None:
    assert parse_exact("sqrt(999966000289)") == 999_983  # the square of a prime
    assert parse_exact("sqrt(999999999989)").radicand == 999_999_999_989  # a prime
    assert parse_exact("sqrt(8)").canonical == "2*sqrt(2)"


@pytest.mark.parametrize(
    ("text", "canonical", "form"),
    [
        ("35/384", "35/384", "fraction"),
        ("6/3", "2", "fraction"),
        ("(5 - sqrt(5))/10", "(5 - sqrt(5))/10", "surd"),
        ("0.1", "1/10", "decimal"),
        (".5", "1/2", "decimal"),
        ("5.", "5", "decimal"),
        ("-1.25e-2", "-1/80", "decimal"),
        ("1E3", "1000", "decimal"),
        ("0.5*sqrt(2)", "sqrt(2)/2", "decimal"),
        ("+7", "7", "integer"),
        ("−3⁄4", "-3/4", "fraction"),
        ("-2^2", "-4", "integer"),
        ("(-2)**3", "-8", "integer"),
        ("2^-3", "1/8", "fraction"),
        ("2^3^2", "512", "integer"),
        ("1 - 2 - 3", "-4", "integer"),
        ("8/4/2", "1", "fraction"),
        ("2*-3", "-6", "integer"),
        ("--3", "3", "integer"),
        ("sqrt(1/2)", "sqrt(2)/2", "surd"),
        ("sqrt(0)", "0", "integer"),
        ("sqrt(4)", "2", "integer"),
        ("(1+sqrt(5))*(1-sqrt(5))", "-4", "integer"),
        ("1/(1+sqrt(2))", "-1 + sqrt(2)", "surd"),
        ("((((1))))", "1", "integer"),
        ("  1/2  ", "1/2", "fraction"),
        ("3*sqrt(2) - 3*sqrt(2)", "0", "integer"),
    ],
)
def test_texts_are_read_as_mathematics_reads_them(text: str, canonical: str, form: str) -> None:
    x = parse_exact(text)
    assert (x.canonical, x.form) == (canonical, form)
    assert str(x) == text.strip()


@pytest.mark.parametrize(
    ("text", "column", "words"),
    [
        ("1\u2009234", 2, "THIN SPACE at column 2; write the digits without spaces"),
        ("0.12\u00a03", 5, "NO-BREAK SPACE at column 5; write the digits without spaces"),
        ("1\u200b2", 2, "ZERO WIDTH SPACE"),
        ("0,5", 2, "a decimal comma at column 2; write a point, as in 0.5"),
        ("１２", 1, "FULLWIDTH DIGIT ONE at column 1; write the plain digits 0 to 9"),
        ("1/٣", 3, "ARABIC-INDIC DIGIT THREE"),
        ("√5", 1, "SQUARE ROOT"),
        ("1–2", 2, "EN DASH"),
        ("1\n", 2, "the character U+000A"),
        ("1\x00", 2, "the character U+0000"),
        ("pi", 1, "'p'"),
        ("__import__('os')", 1, "'_'"),
        ("1/0", 2, "division by zero"),
        ("1/(2-2)", 2, "division by zero"),
        ("0^-1", 2, "division by zero"),
        ("2^999999999", 2, "powers are integers from -64 to 64"),
        ("2^65", 2, "powers are integers"),
        ("2^(1/2)", 2, "powers are integers"),
        ("2^sqrt(2)", 2, "powers are integers"),
        ("9^9^9", 2, "powers are integers"),
        ("(2^64)^64", 7, "a number too large"),
        ("1e999999999", 2, "an exponent too large"),
        ("1e" + "9" * 3000, 2, "an exponent too large"),
        ("9" * 1025, 1, "1025 digits"),
        ("1/3" + "/7" * 2000, 2426, "a number too large"),
        ("(" * 2000 + "1" + ")" * 2000, 32, "nested too deeply"),
        ("2^" * 1500 + "1", 63, "nested too deeply"),
        ("1 2", 3, "write the digits without spaces"),
        ("2 sqrt(5)", 3, "write an operator between two numbers"),
        ("(1", 3, "a parenthesis is left open"),
        ("1)", 2, "unexpected ')'"),
        ("1+", 3, "the number ends"),
        ("*2", 1, "unexpected '*'"),
        ("1.2.3", 4, "a second decimal point"),
        (".", 1, "a point without digits"),
        ("5e", 2, "an exponent without digits"),
        ("sqrt5", 1, "write sqrt(5)"),
        ("sqrt(-1)", 1, "out of range"),
        ("sqrt(1e13)", 1, "out of range"),
        ("sqrt(sqrt(2))", 1, "a root of a root"),
        ("sqrt(2)+1/3-sqrt(3)", 12, "sqrt(2) and sqrt(3)"),
    ],
)
def test_a_bad_text_is_refused_with_its_column_and_a_remedy(text: str, column: int, words: str) -> None:
    with pytest.raises(BadNumber) as caught:
        parse_exact(text)
    assert words in caught.value.reason
    assert caught.value.column == column
    assert f"at column {column}" in str(caught.value)


@pytest.mark.parametrize("text", ["", "   "])
def test_an_empty_text_is_refused(text: str) -> None:
    with pytest.raises(BadNumber, match="an empty text"):
        parse_exact(text)


def test_a_text_of_ten_megabytes_is_refused_by_its_length_and_not_repeated_in_the_message() -> None:
    with pytest.raises(BadNumber, match="10000000 characters") as caught:
        parse_exact("9" * 10_000_000)
    assert len(str(caught.value)) < 200


@settings(deadline=None, derandomize=True, max_examples=300)
@given(st.text(alphabet="0123456789.+-*/^() eEsqrt,−⁄", max_size=40))
def test_any_text_gives_a_number_that_reads_back_or_a_bad_number(text: str) -> None:
    try:
        x = parse_exact(text)
    except BadNumber:
        return
    assert parse_exact(str(x)) == x == parse_exact(x.canonical)


@pytest.mark.parametrize("value", [True, None, 1j, [1], float("nan"), float("inf")])
def test_what_is_no_exact_number_is_refused(value: object) -> None:
    with pytest.raises(BadNumber):
        Exact.of(value)  # type: ignore[arg-type]  # the wrong type is the point


def test_a_float_counts_as_the_decimal_that_python_prints() -> None:
    assert Exact.of(0.1) == Fraction(1, 10)
    assert Exact.of(0.1) != 0.1  # the float itself is a little more
    assert Exact.of(0.5) == 0.5
    assert Exact.of(1e-7).form == "decimal"


def test_of_keeps_an_exact_number_as_it_is_and_takes_python_numbers() -> None:
    x = Exact.of("2/4")
    assert Exact.of(x) is x
    assert Exact.of(3) == 3
    assert Exact.of(Fraction(3, 4)) == Fraction(3, 4)


def test_the_text_takes_no_part_in_equality_and_is_lost_in_arithmetic() -> None:
    assert Exact.of("2/4") == Exact.of("0.5")
    assert hash(Exact.of("2/4")) == hash(Exact.of("0.5"))
    assert str(Exact.of("2/4") + 0) == "1/2"


def test_a_text_that_is_another_number_is_refused() -> None:
    with pytest.raises(BadNumber, match="is not the number 1/3"):
        Exact(Fraction(1, 3), text="0.33")


@pytest.mark.parametrize("operation", [operator.add, operator.sub, operator.mul, operator.truediv])
def test_two_radicands_in_one_operation_are_refused_by_name(operation: object) -> None:
    with pytest.raises(BadNumber, match=r"sqrt\(2\) and sqrt\(3\)"):
        operation(Exact.of("sqrt(2)"), Exact.of("1 + sqrt(3)"))  # type: ignore[operator]  # one of four operators


def test_a_radicand_out_of_range_is_refused() -> None:
    for radicand in (0, -2, 10**12 + 1):
        with pytest.raises(BadNumber, match=f"radicand {radicand}"):
            Exact(0, 1, radicand)


def test_division_by_zero_raises_the_usual_error() -> None:
    with pytest.raises(ZeroDivisionError):
        Exact(1) / 0
    with pytest.raises(ZeroDivisionError):
        Exact(0) ** -1


def test_numbers_are_immutable_and_survive_copies() -> None:
    x = Exact.of("(5 - sqrt(5))/10")
    with pytest.raises(AttributeError):
        x.rational = Fraction(1)  # type: ignore[misc]  # the refusal is the point
    for twin in (pickle.loads(pickle.dumps(x)), copy.deepcopy(x)):
        assert twin == x
        assert str(twin) == str(x)


def test_signs_and_truth() -> None:
    x = Exact.of("7/5 - sqrt(2)")  # −0.0142…
    assert abs(x) == -x == Exact.of("sqrt(2) - 7/5")
    assert +x == x
    assert x
    assert not Exact(0)
    assert x != "7/5"
    with pytest.raises(TypeError):
        x < 0.5  # noqa: B015 - floats compare only for equality, as their rounding would decide


@calm
@given(fields(1), st.integers(0, 200))
def test_scaled_floor_is_the_floor(numbers: list[Exact], bits: int) -> None:
    (x,) = numbers
    floor = x.scaled_floor(bits)
    assert floor <= x * 2**bits < floor + 1
