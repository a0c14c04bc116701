"""What a method must have, said in a line: `order>=4, ssp>0, imag/stages>0.7, embedded, exact`.

    needs     = need, {",", need}
    need      = ["not"], quantity, [comparison, value]
    quantity  = name, {"/", name}
    comparison = ">=" | "<=" | ">" | "<" | "=" | "!="
    value     = number | word

A quantity without a comparison asks whether the method has it: a number that is not 0, a yes, a word. A
method that lacks what is compared does not fit.
"""

from __future__ import annotations

import operator
import re
from collections.abc import Callable, Iterable
from typing import Any

import attrs

from newel.catalogue.suggestions import near_names
from newel.errors import BadRequest

__all__ = ["FACTS", "Need", "Quantity", "parse_columns", "parse_needs"]

FACTS = {
    "slug": "word",
    "order": "number",
    "stages": "number",
    "embedded_order": "number",
    "continuous_order": "number",
    "year": "number",
    "working_floor": "number",
    "outcome": "word",
}
"""What a summary knows without the numbers of a method, by kind."""

_SHORT = {"embedded": "embedded_order", "continuous": "continuous_order", "floor": "working_floor"}
_OUTCOMES = ("exact", "rounded", "unproven")
_EXAMPLE = "order>=4, ssp>0, imag/stages>0.7, embedded, exact"
_COMPARISONS: dict[str, Callable[[Any, Any], bool]] = {
    ">=": operator.ge,
    "<=": operator.le,
    ">": operator.gt,
    "<": operator.lt,
    "=": operator.eq,
    "!=": operator.ne,
}
_TOKEN = re.compile(
    r"\s*(?:(?P<number>[-+−]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?)|(?P<name>[A-Za-z_][\w-]*)"
    r"|(?P<sign>>=|<=|≥|≤|!=|≠|==|[><=,/]))"
)
_ALIKE = {"≥": ">=", "≤": "<=", "≠": "!=", "==": "="}
_LONGEST = 1000

Lookup = Callable[[str], Any]
"""Takes the full name of a fact or property and returns its value for one method."""


@attrs.frozen
class Quantity:
    """A property, or the ratio of several.

    Attributes:
        text: as it was written.
        names: full names of facts and properties; the first is divided by the others.
        kind: "number", "yes or no", "word" or "polynomial".
    """

    text: str
    names: tuple[str, ...]
    kind: str

    @property
    def is_fact(self) -> bool:
        """Whether a summary knows it."""
        return all(name in FACTS for name in self.names)

    def value(self, lookup: Lookup) -> Any:
        """Return its value; None where the method has no such thing, or where it is divided by 0."""
        first = lookup(self.names[0])
        for name in self.names[1:]:
            other = lookup(name)
            if first is None or not other:
                return None
            first = float(first) / float(other)
        return first


@attrs.frozen
class Need:
    """One need. Attributes: quantity, comparison ("" for having it), value, negated."""

    quantity: Quantity
    comparison: str
    value: Any
    negated: bool

    def fits(self, lookup: Lookup) -> bool:
        """Return whether a method has what is needed."""
        found = self.quantity.value(lookup)
        if not self.comparison:
            return bool(found) != self.negated
        return found is not None and _COMPARISONS[self.comparison](found, self.value) != self.negated


def parse_needs(text: str) -> tuple[Need, ...]:
    """Return the needs that a line states.

    Raises:
        BadRequest: it breaks the grammar, or names no property; the text tells the column, counted from 1.

    >>> [need.quantity.names for need in parse_needs("order>=4, imag/stages > 0.7")]
    [('order',), ('imaginary_limit', 'stages')]
    """
    reader = _Reader(text, "needs")
    found = [reader.need()]
    while reader.kind == "sign" and reader.word == ",":
        reader.next()
        found.append(reader.need())
    reader.end()
    return tuple(found)


def parse_columns(columns: str | Iterable[str]) -> tuple[Quantity, ...]:
    """Return the quantities of `"imag/stages, ssp"`, or of a sequence of such texts.

    Raises:
        BadRequest: as for `parse_needs`.

    >>> [column.text for column in parse_columns("imag/stages, ssp")]
    ['imag/stages', 'ssp']
    """
    reader = _Reader(columns if isinstance(columns, str) else ", ".join(columns), "columns")
    found = [reader.quantity()]
    while reader.kind == "sign" and reader.word == ",":
        reader.next()
        found.append(reader.quantity())
    reader.end()
    return tuple(found)


class _Reader:
    """The words of a line, one after the other: `kind` ("number", "name", "sign", ""), `word`, `column`."""

    def __init__(self, text: str, argument: str) -> None:
        if not isinstance(text, str):
            raise BadRequest(f"{argument} is a text such as {_EXAMPLE!r}", argument=argument)
        self._text, self._argument, self._place = text, argument, 0
        self.kind, self.word, self.column = "", "", 1
        if len(text) > _LONGEST:
            raise self._wrong(f"the text has {len(text)} characters; {_LONGEST} are enough")
        self.next()

    def next(self) -> None:
        """Go on to the next word."""
        rest = self._text[self._place :]
        self.column = self._place + len(rest) - len(rest.lstrip()) + 1
        if not rest.strip():
            self.kind = self.word = ""
            return
        token = _TOKEN.match(rest)
        if token is None or token.lastgroup is None:
            raise self._wrong(f"{self._text[self.column - 1]!r} has no place here")
        self.kind, self.word = token.lastgroup, _ALIKE.get(token[token.lastgroup], token[token.lastgroup])
        self._place += token.end()

    def end(self) -> None:
        """Check that nothing is left."""
        if self.kind:
            raise self._wrong(f"{self.word!r} has no place here; a comma joins two of them")

    def need(self) -> Need:
        """Read one need."""
        negated = self.word == "not"
        if negated:
            self.next()
        if self.word in _OUTCOMES:
            outcome = self.word
            self.next()
            return Need(Quantity(outcome, ("outcome",), "word"), "=", outcome, negated)
        quantity = self.quantity()
        if self.word not in _COMPARISONS:
            if self.kind == "number" or self.kind == "name":
                raise self._wrong(
                    f"a comparison is missing before {self.word!r}; there are {' '.join(_COMPARISONS)}"
                )
            return Need(quantity, "", None, negated)
        comparison = self.word
        if quantity.kind not in ("number", "polynomial") and comparison not in ("=", "!="):
            raise self._wrong(f"{quantity.text} is a {quantity.kind}; it is compared by = or !=")
        if quantity.kind == "polynomial":
            raise self._wrong(f"{quantity.text} is a polynomial; it is not compared")
        self.next()
        return Need(quantity, comparison, self._value(quantity), negated)

    def _value(self, quantity: Quantity) -> Any:
        kind, word = self.kind, self.word
        if quantity.kind == "number" and kind == "number":
            value: Any = float(word.replace("−", "-"))
        elif quantity.kind == "yes or no" and word in ("yes", "no"):
            value = word == "yes"
        elif quantity.kind == "word" and kind == "name":
            value = word
        else:
            wanted = {"number": "a number", "yes or no": "yes or no", "word": "a word"}[quantity.kind]
            given = repr(word) if word else "nothing"
            raise self._wrong(f"{quantity.text} is compared with {wanted}, not with {given}")
        self.next()
        return value

    def quantity(self) -> Quantity:
        """Read a property, or a ratio of some."""
        start = self.column - 1
        named = [self._name()]
        while self.word == "/":
            if named[0][1] != "number":
                raise self._wrong(f"{named[0][0]} is a {named[0][1]}; only numbers are divided")
            self.next()
            named.append(self._name(ratio=True))
        # The written text ends where the word after it begins.
        text = self._text[start : self.column - 1] if self.kind else self._text[start:]
        return Quantity("".join(text.split()), tuple(name for name, _ in named), named[0][1])

    def _name(self, ratio: bool = False) -> tuple[str, str]:
        from newel.methods.analysis.properties import PROPERTIES

        if self.kind != "name":
            raise self._wrong(
                f"a property belongs here, not {self.word!r}" if self.word else "it ends too early"
            )
        kinds = {each.name: each.kind for each in PROPERTIES} | FACTS
        short = {each.short: each.name for each in PROPERTIES if each.short} | _SHORT
        word = self.word.replace("-", "_").lower()
        name = short.get(word, word)
        if name not in kinds:
            near = near_names(word, [*kinds, *short])
            hint = f"; the nearest is {near[0]}" if near else ""
            known = ", ".join([*short, *(each for each in kinds if each not in short.values())])
            raise self._wrong(f"{self.word[:60]!r} is no property{hint}", f"There are {known}.")
        if ratio and kinds[name] != "number":
            raise self._wrong(f"{name} is a {kinds[name]}; only numbers are divided")
        self.next()
        return name, kinds[name]

    def _wrong(self, reason: str, remedy: str = "") -> BadRequest:
        shown = f"\n  {self._text}\n  {' ' * (self.column - 1)}^" if 0 < len(self._text) <= 200 else ""
        advice = remedy or (
            f"For example: {_EXAMPLE}" if self._argument == "needs" else "For example: imag/stages, ssp"
        )
        return BadRequest(
            f"{self._argument}, column {self.column}: {reason}{shown}\n  {advice}", argument=self._argument
        )
