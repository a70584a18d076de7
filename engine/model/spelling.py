"""A factored model as one line of text, for screens and reports; the expression grammar reads it back."""

from __future__ import annotations

import math
from collections import Counter

from engine.model.factored import ComplexArray, Factored

_RAISED = str.maketrans("0123456789", "⁰¹²³⁴⁵⁶⁷⁸⁹")


def as_text(model: Factored, digits: int = 6) -> str:
    """The model as ``3.2·(s + 40) / (s·(s² + 2s + 900)) · e^(−0.002s)``.

    Parameters
    ----------
    digits : significant digits of every number; 17 or more gives the shortest that reads back as the same double

    Returns
    -------
    a formula with real factors of first and second order, equal factors gathered into powers, nothing cancelled
    """
    top = _factors(model.zeros, digits)
    bottom = _factors(model.poles, digits)
    gain = _number(model.gain, digits)
    if gain == "1" and top:
        gain = ""
    elif gain == "−1" and top:
        gain = "−"
    numerator = gain + ("·" if gain.strip("−") and top else "") + "·".join(top)
    text = numerator
    if bottom:
        # One factor needs no further parentheses: (s + 1)², s, s³ stand by themselves.
        text += " / " + (bottom[0] if len(bottom) == 1 else f"({'·'.join(bottom)})")
    if model.dead_time_s:
        delay = f"e^(−{_coefficient(model.dead_time_s, digits)}s)"
        text = delay if text == "1" else f"{text} · {delay}"
    return text


def _factors(roots: ComplexArray, digits: int) -> list[str]:
    """Factors in ascending order of their roots' size, equal ones as a power."""
    counted = Counter(complex(root) for root in roots if root.imag >= 0)
    ordered = sorted(counted, key=lambda root: (abs(root), root.real))
    return [_factor(root, digits) + _power(counted[root]) for root in ordered]


def _factor(root: complex, digits: int) -> str:
    if root == 0:
        return "s"
    if root.imag == 0:
        return f"(s {_signed(-root.real, digits)})"
    square = _signed(math.hypot(root.real, root.imag) ** 2, digits)
    if root.real == 0:
        return f"(s² {square})"
    sign = "−" if root.real > 0 else "+"
    return f"(s² {sign} {_coefficient(2 * abs(root.real), digits)}s {square})"


def _power(multiplicity: int) -> str:
    return "" if multiplicity == 1 else str(multiplicity).translate(_RAISED)


def _coefficient(number: float, digits: int) -> str:
    text = _number(number, digits)
    return "" if text == "1" else text


def _signed(number: float, digits: int) -> str:
    return ("− " if number < 0 else "+ ") + _number(abs(number), digits)


def _number(number: float, digits: int) -> str:
    text = repr(float(number)).removesuffix(".0") if digits >= 17 else f"{number:.{digits}g}"
    mantissa, _, exponent = text.partition("e")
    if exponent and 0 <= int(exponent) < 7:
        # 900000 rather than 9e+05, where so many digits are short enough to read.
        text = f"{float(text):.0f}"
    elif exponent:
        text = f"{mantissa}e{int(exponent)}"
    return text.replace("-", "−")
