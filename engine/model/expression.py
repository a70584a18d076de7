"""Models written as a formula in s, read by a grammar of their own and never evaluated as code.

    sum     = product { ("+" | "-") product }
    product = sign { ("*" | "/") sign | signless }          a missing * counts, except after a division
    sign    = [ "-" | "+" ] ... power
    power   = atom [ "^" exponent ]
    exponent= [ "-" | "+" ] ... power                        a whole number
    atom    = number | "s" | "(" sum ")" | "exp" "(" sum ")" | "e" "^" ...

Everything is exact until the roots are taken: products stay products, sums are expanded in integers, and common
factors of numerator and denominator stay where they are.
"""

from __future__ import annotations

from collections.abc import Callable
from fractions import Fraction

import numpy as np

from engine.errors import DesignError
from engine.model.factored import ComplexArray, Factored
from engine.model.factored_entry import dead_time
from engine.model.limits import DEFAULT_LIMITS, Limits
from engine.model.polynomial import gain_number
from engine.model.ratio import (
    VARIABLE,
    Budget,
    Factors,
    Ratio,
    TooLargeError,
    power,
    product,
    quotient,
    total,
)
from engine.model.roots import roots_of_exact
from engine.model.tokens import Token, refusal, tokens_of

_ONE = Ratio(Fraction(1))
_MINUS_ONE = Ratio(Fraction(-1))
_GREATEST_POWER = 1000  # of a number: 2^1000 is within a double's range
_ALLOWED = "use numbers, s, + - * / ^, ( ) and exp(-0.002*s)"


def from_expression(text: object, limits: Limits = DEFAULT_LIMITS) -> Factored:
    """The model that a formula such as ``3.2*(s+40)/(s*(s^2+2*s+900)) * exp(-0.002*s)`` stands for.

    Parameters
    ----------
    text : numbers, s, + - * / ^ or **, parentheses, exp(-θ*s) as a factor; also · × − ² and e^(-θ*s).
        3s and 2(s+1) are products; 1/2s is refused, as it can be read two ways.
    limits : greatest order, length and nesting

    Raises DesignError `text`, with the column (from 1) where there is one.
    """
    if not isinstance(text, str):
        raise DesignError("text", f"must be a text, is {str(text)[:40]!r}")
    if len(text) > limits.text_length:
        raise DesignError("text", f"has {len(text)} characters; at most {limits.text_length} are accepted")
    if not text.strip():
        raise DesignError("text", "is empty; write a formula in s, as 4/(s*(s+2))")
    return _factored(_Parser(tokens_of(text), limits).whole())


def _factored(ratio: Ratio) -> Factored:
    if ratio.content == 0:
        raise DesignError("text", "comes to 0; a model needs a gain other than 0")
    if ratio.dead_time < 0:
        raise DesignError("text", "looks ahead in time; write the dead time as exp(-0.002*s), with a minus sign")
    gain = ratio.content
    for factors, sign in ((ratio.top, 1), (ratio.bottom, -1)):
        for factor, multiplicity in factors.items():
            gain *= Fraction(factor[0]) ** (sign * multiplicity)
    try:
        delay = dead_time(_as_float(ratio.dead_time))
        zeros, poles = _roots(ratio.top), _roots(ratio.bottom)
    except DesignError as error:
        raise DesignError("text", error.faults[0].what) from None
    return Factored(gain_number(gain, "text"), zeros, poles, delay)


def _as_float(number: Fraction) -> float:
    try:
        return float(number)
    except OverflowError:
        return float("inf")


def _roots(factors: Factors) -> ComplexArray:
    parts = [np.tile(roots_of_exact(factor), multiplicity) for factor, multiplicity in factors.items()]
    return np.concatenate([np.empty(0, dtype=np.complex128), *parts])


class _Parser:
    """Recursive descent over the tokens; every method leaves the position after what it read."""

    def __init__(self, tokens: list[Token], limits: Limits) -> None:
        self._tokens = tokens
        self._at = 0
        self._depth = 0
        self._limits = limits
        self._budget = Budget(limits.order)

    def whole(self) -> Ratio:
        """The value of the whole text."""
        value = self._sum()
        token = self._next
        if token.kind != "end":
            # Only a closing parenthesis ends a sum early.
            raise refusal(token.column, "')' has no '(' before it; remove it or open one")
        return value

    @property
    def _next(self) -> Token:
        return self._tokens[self._at]

    def _take(self) -> Token:
        self._at += 1
        return self._tokens[self._at - 1]

    def _is(self, *operators: str) -> bool:
        return self._next.kind == "operator" and self._next.text in operators

    def _compute(self, column: int, work: Callable[[Ratio, Ratio, Budget], Ratio], left: Ratio, right: Ratio) -> Ratio:
        try:
            return work(left, right, self._budget)
        except TooLargeError as error:
            raise refusal(column, str(error)) from None

    def _sum(self) -> Ratio:
        value = self._product()
        while self._is("+", "-"):
            operator = self._take()
            right = self._product()
            if operator.text == "-":
                right = self._compute(operator.column, product, _MINUS_ONE, right)
            if value.dead_time != right.dead_time and value.content and right.content:
                raise refusal(
                    operator.column,
                    "dead time must multiply the whole model; these two terms have different dead times",
                )
            value = self._compute(operator.column, total, value, right)
        return value

    def _product(self) -> Ratio:
        value = self._signed()
        divided = False
        while True:
            token = self._next
            if self._is("*", "/"):
                self._take()
                divided = token.text == "/"
                right = self._signed()
                if divided and right.content == 0:
                    raise refusal(token.column, "division by 0")
                value = self._compute(token.column, quotient if divided else product, value, right)
            elif token.kind in ("number", "name") or self._is("("):
                self._refuse_doubtful(token, divided)
                value = self._compute(token.column, product, value, self._power())
            else:
                return value

    def _refuse_doubtful(self, token: Token, divided: bool) -> None:
        if token.kind == "number":
            raise refusal(token.column, f"an operator is missing before {token.text[:40]}")
        if divided:
            raise refusal(
                token.column,
                f"what follows '/' can be read two ways; put * before {token.text[:40]!r}, "
                "or parentheses around the denominator",
            )

    def _signed(self) -> Ratio:
        negative, column = self._sign()
        value = self._power()
        return self._compute(column, product, _MINUS_ONE, value) if negative else value

    def _sign(self) -> tuple[bool, int]:
        negative = False
        column = self._next.column
        while self._is("+", "-"):
            negative ^= self._take().text == "-"
        return negative, column

    def _power(self) -> Ratio:
        token = self._next
        base = self._atom()
        if not self._is("^"):
            return base
        sign = self._take()
        exponent = self._exponent(sign.column, _GREATEST_POWER if base.is_constant else self._limits.order)
        if base.content == 0 and exponent <= 0:
            raise refusal(token.column, "division by 0" if exponent < 0 else "0^0 has no value")
        return self._compute(sign.column, lambda b, _, budget: power(b, exponent, budget), base, _ONE)

    def _exponent(self, column: int, most: int) -> int:
        self._enter(column)
        negative, _ = self._sign()
        value = self._power()
        self._depth -= 1
        if not value.is_constant or value.content.denominator != 1:
            raise refusal(column, "a power must be a whole number, as in s^2")
        if abs(value.content) > most:
            raise refusal(column, f"the power is beyond {most}")
        return int(-value.content if negative else value.content)

    def _enter(self, column: int) -> None:
        self._depth += 1
        if self._depth > self._limits.depth:
            raise refusal(column, f"nested deeper than {self._limits.depth} levels")

    def _atom(self) -> Ratio:
        token = self._take()
        if token.kind == "number":
            return Ratio(token.value)
        if token.kind == "name":
            return self._named(token)
        if token.kind == "operator" and token.text == "(":
            return self._group(token)
        if token.kind == "end":
            raise refusal(token.column, "the formula ends where a number, s or ( should follow")
        raise refusal(token.column, f"a number, s or ( should stand here, not '{token.text}'")

    def _named(self, token: Token) -> Ratio:
        if token.text == "s":
            return VARIABLE
        if token.text in ("exp", "e"):
            return self._exponential(token)
        if token.text in ("S", "j", "i", "pi", "π"):
            remedy = {"S": "the variable is a small s", "pi": "write 3.141592653589793", "π": "write 3.141592653589793"}
            raise refusal(
                token.column,
                f"unknown name '{token.text}'; "
                + remedy.get(token.text, "a complex pair is written as s^2 + 2*s + 900"),
            )
        raise refusal(token.column, f"unknown name '{token.text[:40]}'; {_ALLOWED}")

    def _group(self, opening: Token) -> Ratio:
        self._enter(opening.column)
        value = self._sum()
        if not self._is(")"):
            raise refusal(opening.column, "this '(' is never closed")
        self._take()
        self._depth -= 1
        return value

    def _exponential(self, token: Token) -> Ratio:
        if token.text == "e":
            if not self._is("^"):
                raise refusal(token.column, "'e' must be followed by ^; write dead time as exp(-0.002*s)")
            self._take()
        if not self._is("("):
            raise refusal(token.column, f"'{token.text}' needs parentheses; write dead time as exp(-0.002*s)")
        argument = self._group(self._take())
        if argument.content == 0:
            return _ONE
        if argument.bottom or argument.dead_time or dict(argument.top) != {(1, 0): 1}:
            raise refusal(token.column, "the exponent must be a number times s; write dead time as exp(-0.002*s)")
        return Ratio(Fraction(1), dead_time=-argument.content)
