"""Closed-loop roots that double precision cannot tell apart, and loops whose leading coefficients cancel.

Both go the exact way: D + N as a polynomial with integer coefficients (the doubles are fractions), whose roots
come out correctly rounded, repeated ones exactly repeated. It takes milliseconds where the ordinary way takes
microseconds, so only loops that need it come here.
"""

from __future__ import annotations

from fractions import Fraction
from functools import lru_cache

import numpy as np

from engine.errors import DesignError
from engine.model.exact import split_content, times
from engine.model.factored import ComplexArray, Factored
from engine.model.roots import roots_of_exact

# Share of |D| + |N| below which a leading coefficient of the sum is a rounding error of the gain.
VANISHING = Fraction(1, 10**13)


def exact_closed_loop_roots(loop: Factored) -> ComplexArray | None:
    """All roots of D + N of a loop without dead time, correctly rounded [rad/s]; None where they are out of range."""
    return _exact_roots(loop.gain, loop.zeros.tobytes(), loop.poles.tobytes())


@lru_cache(maxsize=64)
def _exact_roots(gain: float, zeros: bytes, poles: bytes) -> ComplexArray | None:
    d = _expanded(np.frombuffer(poles, dtype=np.complex128))
    n = [Fraction(gain) * c for c in _expanded(np.frombuffer(zeros, dtype=np.complex128))]
    length = max(len(d), len(n))
    d = [Fraction(0)] * (length - len(d)) + d
    n = [Fraction(0)] * (length - len(n)) + n
    total = [a + b for a, b in zip(d, n, strict=True)]
    first = 0
    while first < length and abs(total[first]) <= VANISHING * (abs(d[first]) + abs(n[first])):
        first += 1
    if first >= length - 1:
        return np.empty(0, dtype=np.complex128)
    _, polynomial = split_content(total[first:])
    try:
        return roots_of_exact(polynomial)
    except DesignError:
        return None


def _expanded(roots: ComplexArray) -> list[Fraction]:
    """Coefficients of Π(s − root), exactly; of a complex pair the upper root stands for both."""
    scale = Fraction(1)
    polynomial: tuple[int, ...] = (1,)
    for root in roots:
        if root.imag < 0.0:
            continue
        re, im = Fraction(float(root.real)), Fraction(float(root.imag))
        factor = [Fraction(1), -re] if root.imag == 0.0 else [Fraction(1), -2 * re, re * re + im * im]
        content, integers = split_content(factor)
        scale *= content
        polynomial = times(polynomial, integers)
    return [scale * c for c in polynomial]
