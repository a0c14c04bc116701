"""How many digits of a coefficient are to be trusted, and what that leaves open.

Papers print coefficients as exact fractions or as decimals rounded to some length. A tableau says which, by
array or by entry, and the proof takes a rounded entry as known to half a unit in its last trusted digit.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from difflib import get_close_matches
from fractions import Fraction
from functools import cached_property
from typing import Any, Literal, TypeAlias

import attrs

from newel.errors import BadTableau
from newel.methods.exact import Exact

__all__ = [
    "ARRAYS",
    "Digits",
    "Trust",
    "check_digits",
    "decimal_exponent",
    "half_unit",
    "read_digits",
    "shown",
    "with_node_digits",
]

ARRAYS = ("nodes", "matrix", "weights", "embedded", "continuous")
"""The arrays of a tableau, by the names that `digits` and `half_units` know them."""

MOST_STATED = 1000
_LONG_DENOMINATOR = 10**6

Trust: TypeAlias = int | Literal["exact"]
_ENTRY = re.compile(r"(nodes|matrix|weights|embedded|continuous)\[(\d{1,4})\](?:\[(\d{1,4})\])?")


def shown(value: object) -> str:
    """Return `value` as it is named in an error: its repr, cut to 60 characters.

    >>> shown("x" * 100)[-5:]
    'xxxx…'
    """
    try:
        text = repr(value)
    except ValueError:  # Python refuses to print integers of more than some thousand digits
        text = f"({type(value).__name__} of thousands of digits)"
    return text if len(text) <= 60 else text[:59] + "…"


@attrs.frozen(eq=False, slots=False)
class Digits(Mapping[str, Trust]):
    """How many significant digits are trusted, by array (`matrix`) or entry (`matrix[5][2]`, from 1).

    An immutable, hashable mapping whose keys stand in the order of the arrays, entries after their array.

    >>> dict(Digits.of({"weights[1]": "exact", "weights": 18}))
    {'weights': 18, 'weights[1]': 'exact'}
    """

    pairs: tuple[tuple[str, Trust], ...]

    @classmethod
    def of(cls, given: Mapping[Any, Any]) -> Digits:
        """Check the keys and values of `given`; raises BadTableau for a bad one."""
        return cls(tuple(sorted(((_key(k), _trust(k, v)) for k, v in given.items()), key=_rank)))

    def __getitem__(self, key: str) -> Trust:
        return self._found[key]

    def __iter__(self) -> Iterator[str]:
        return (key for key, _ in self.pairs)

    def __len__(self) -> int:
        return len(self.pairs)

    def __hash__(self) -> int:
        return hash(self.pairs)

    @cached_property
    def _found(self) -> dict[str, Trust]:
        return dict(self.pairs)


def read_digits(given: Any) -> int | Digits | None:
    """Return what a tableau holds as `digits`; raises BadTableau for what is none of its three forms.

    >>> read_digits({"matrix": 16})["matrix"]
    16
    """
    if given is None or (isinstance(given, Mapping) and not given):
        return None
    if isinstance(given, Mapping):
        return Digits.of(given)
    if given == "exact":
        raise BadTableau(
            '"exact" is for one array or entry; leave digits out where all is exact', key="digits"
        )
    return int(_trust(None, given))


def half_unit(digits: int | Digits | None, array: str, place: str, value: Exact) -> Fraction:
    """Return how far `value`, the entry of `array` at `place` (such as `[5][2]`), may be from what was meant.

    >>> half_unit(4, "weights", "[1]", Exact.of("0.3333"))
    Fraction(1, 20000)
    """
    if digits is None or not value:
        return Fraction(0)
    own = digits.get(array + place) if isinstance(digits, Digits) else None
    stated = digits.get(array) if isinstance(digits, Digits) else digits
    trusted = own if own is not None else stated if _looks_rounded(value) else None
    if trusted is None or trusted == "exact":
        return Fraction(0)
    return Fraction(10) ** (decimal_exponent(value) - trusted + 1) / 2


def decimal_exponent(value: Exact) -> int:
    """Return the integer e with 10^e ≤ |value| < 10^(e+1), exactly; `value` is not zero.

    >>> decimal_exponent(Exact.of("0.0123")), decimal_exponent(Exact.of("sqrt(101)"))
    (-2, 1)
    """
    size = abs(value)
    bits = 256
    while (floor := size.scaled_floor(bits)) < 2**64:
        bits *= 2
    # 0.30103 is log10(2); the two loops put right an estimate that is off by one or two.
    exponent = int((floor.bit_length() - bits) * 0.30103)
    while size < Fraction(10) ** exponent:
        exponent -= 1
    while size >= Fraction(10) ** (exponent + 1):
        exponent += 1
    return exponent


def with_node_digits(digits: Digits, stages: int) -> Digits:
    """Let nodes that are row sums be trusted as far as the least trusted entry of their row."""
    added: dict[str, Trust] = {}
    if "matrix" in digits:
        added["nodes"] = digits["matrix"]
    for key, value in digits.items():
        entry = _ENTRY.fullmatch(key)
        if entry and entry[1] == "matrix" and isinstance(value, int) and 1 <= int(entry[2]) <= stages:
            node = f"nodes[{int(entry[2])}]"
            before = added.get(node, value)
            added[node] = min(value, before) if isinstance(before, int) else value
    return Digits.of({**added, **digits})


def check_digits(digits: int | Digits | None, arrays: Mapping[str, tuple[Any, ...]]) -> None:
    """Raise BadTableau where `digits` names what is not there, or leaves a decimal without digits."""
    if isinstance(digits, int):
        return
    stated: Mapping[str, Trust] = {} if digits is None else digits
    for key in stated:
        _check_place(key, arrays)
    for array, values in arrays.items():
        if array not in stated:
            for place, x in _entries(array, values):
                if x.form == "decimal" and place not in stated:
                    raise BadTableau(
                        f"{shown(str(x))} is a decimal, and no digits are stated for {array}\n"
                        "  Write it as a fraction or with sqrt(n) where it is exact, or state how many "
                        f"significant digits are to be trusted: digits = {{ {array} = 16 }}",
                        key=place,
                    )


def _entries(array: str, values: tuple[Any, ...]) -> Iterator[tuple[str, Exact]]:
    for i, value in enumerate(values, 1):
        if isinstance(value, tuple):
            yield from ((f"{array}[{i}][{j}]", x) for j, x in enumerate(value, 1))
        else:
            yield f"{array}[{i}]", value


def _check_place(key: str, arrays: Mapping[str, tuple[Any, ...]]) -> None:
    array, *indices = _parts(key)
    values: Any = arrays[array]
    if not values:
        raise BadTableau(f"this tableau has no {array} array", key=f"digits[{key!r}]")
    for index in map(int, indices):
        if not isinstance(values, tuple) or not 1 <= index <= len(values):
            raise BadTableau(f"there is no entry {key}; indices count from 1", key=f"digits[{key!r}]")
        values = values[index - 1]
    if indices and isinstance(values, tuple):
        raise BadTableau(f"{key} is a row; name an entry, such as {key}[1]", key=f"digits[{key!r}]")


def _parts(key: str) -> list[str]:
    return re.split(r"[\[\]]+", key.rstrip("]"))


def _rank(pair: tuple[str, Any]) -> tuple[int, ...]:
    array, *indices = _parts(pair[0])
    return (ARRAYS.index(array), *map(int, indices))


def _looks_rounded(value: Exact) -> bool:
    if value.form == "decimal":
        return True
    return not value.surd and value.rational.denominator >= _LONG_DENOMINATOR


def _key(key: Any) -> str:
    if isinstance(key, str) and (key in ARRAYS or _ENTRY.fullmatch(key)):
        return key
    near = get_close_matches(str(key).split("[")[0], ARRAYS, 1, 0.5)
    hint = f"; near: {near[0]}" if near else ""
    raise BadTableau(
        f"unknown key {shown(key)}{hint}\n"
        f"  Allowed are {', '.join(ARRAYS)} and entries such as matrix[5][2], counted from 1.",
        key="digits",
    )


def _trust(key: Any, value: Any) -> Trust:
    if key is not None and isinstance(value, str) and value == "exact":
        return "exact"
    if isinstance(value, int) and not isinstance(value, bool) and 1 <= value <= MOST_STATED:
        return int(value)
    kind = "an integer" if key is None else '"exact" or an integer'
    raise BadTableau(
        f"{shown(value)} is no number of digits\n"
        f"  Write {kind} from 1 to {MOST_STATED}: the significant digits that are to be trusted.",
        key="digits" if key is None else f"digits[{str(key)!r}]",
    )
