"""Words of the expression grammar: numbers, names and operators, each with its column."""

from __future__ import annotations

import re
from dataclasses import dataclass
from fractions import Fraction
from typing import Literal, TypeAlias

from engine.errors import DesignError

Kind: TypeAlias = Literal["number", "name", "operator", "end"]

_SPACE = re.compile(r"[\s\u00a0\u2009\u202f]+")
_NUMBER = re.compile(r"(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][-+−]?[0-9]+)?")
_NAME = re.compile("[A-Za-z_Α-Ωα-ω][A-Za-z0-9_Α-Ωα-ω]*")
_RAISED = re.compile("[⁰¹²³⁴⁵⁶⁷⁸⁹]+")
_RAISED_DIGITS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹", "0123456789")
_OPERATORS = {"*": "*", "·": "*", "⋅": "*", "×": "*", "−": "-", **{c: c for c in "+-/^()"}}
_LONGEST_NUMBER = 400


@dataclass(frozen=True, slots=True)
class Token:
    """One word; `value` is set for numbers only."""

    kind: Kind
    text: str
    column: int
    value: Fraction = Fraction(0)


def refusal(column: int, what: str) -> DesignError:
    """The error of an expression, with the column (counted from 1) that it is about."""
    return DesignError("text", f"column {column}: {what}")


def tokens_of(text: str) -> list[Token]:
    """The words of `text`, an "end" token last. A raised digit such as ² comes out as ^ and a number.

    Raises DesignError `text` with the column of what is not part of the grammar.
    """
    found: list[Token] = []
    at = 0
    while at < len(text):
        if space := _SPACE.match(text, at):
            at = space.end()
            continue
        column = at + 1
        if number := _NUMBER.match(text, at):
            found.append(Token("number", number.group(), column, _value(number.group(), column)))
            at = number.end()
        elif raised := _RAISED.match(text, at):
            digits = raised.group().translate(_RAISED_DIGITS)
            found += [Token("operator", "^", column), Token("number", digits, column, _value(digits, column))]
            at = raised.end()
        elif name := _NAME.match(text, at):
            found.append(Token("name", name.group(), column))
            at = name.end()
        elif text.startswith("**", at):
            found.append(Token("operator", "^", column))
            at += 2
        elif (operator := _OPERATORS.get(text[at])) is not None:
            found.append(Token("operator", operator, column))
            at += 1
        else:
            raise refusal(column, _stranger(text[at]))
    return [*found, Token("end", "", len(text) + 1)]


def _stranger(character: str) -> str:
    if character == ",":
        return "',' is not part of a formula; write decimals with a point, as 3.2"
    if character in "[]{}":
        return f"'{character}' is not part of a formula; group with ( and )"
    return f"{character!r} is not part of a formula; use numbers, s, + - * / ^, ( ) and exp(-0.002*s)"


def _value(text: str, column: int) -> Fraction:
    if len(text) > _LONGEST_NUMBER:
        raise refusal(column, f"a number of {len(text)} characters is too long; 17 digits are enough")
    text = text.replace("−", "-")
    approximate = float(text)
    if approximate in (float("inf"), 0.0):
        # Decided in floating point first: the exact 1e999999999 would fill the memory.
        if approximate or any(c in "123456789" for c in re.split("[eE]", text)[0]):
            raise refusal(column, f"{text[:40]} is beyond the range of numbers, 1e-308 to 1e308")
        return Fraction(0)
    return Fraction(text)
