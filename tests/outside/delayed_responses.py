"""Closed-loop time responses with dead time: the finite series of delayed terms, exact on every interval.

T = Σ_{k≥1} (−1)^{k+1}·L₀^k·e^{−kθs}, P·S = Σ_{k≥0} (−1)^k·P₀·L₀^k·e^{−(k+1)θs}, C·S = Σ_{k≥0} (−1)^k·C·L₀^k·e^{−kθs},
with L₀, P₀ the parts without dead time (the plant carries it). At time t only the terms with kθ ≤ t count, and each is
a rational function of s whose poles are those of L₀, k-fold: its inverse is a sum of polynomials times exponentials.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, field

from mpmath import mp, mpc, mpf

from tests.outside.loop import Loop, Part


@dataclass(frozen=True)
class _Term:
    """Σ_p e^{pt}·Σ_q c_q·t^q/q!, and the jump-free part only: every term is strictly proper thanks to the 1/s."""

    pieces: tuple[tuple[mpc, tuple[mpc, ...]], ...]

    def value(self, t: mpf) -> tuple[mpf, mpf]:
        """(value, sum of magnitudes: what cancels)."""
        total, size = mpf(0), mpf(0)
        for pole, coefficients in self.pieces:
            level = mpc(0)
            for q in range(len(coefficients) - 1, -1, -1):
                level = coefficients[q] + level * t / (q + 1)
            piece = level * mp.exp(pole * t)
            total += mp.re(piece)
            size += abs(piece)
        return total, size


@dataclass
class DelayedSeries:
    """The response of one signal of a loop with dead time to a unit step."""

    loop: Loop
    signal: str
    digits: int = 80
    """Digits of the first attempt; doubled as cancellation demands."""
    _terms: dict[tuple[int, int], _Term] = field(default_factory=dict)

    def value(self, t: mpf) -> mpf:
        """y(t) to 25 digits; just after the kink where t is a whole number of dead times."""
        for digits in (self.digits, 2 * self.digits, 4 * self.digits, 8 * self.digits):
            found = self._value(t, digits)
            if found is not None:
                return found
        raise ArithmeticError(f"{8 * self.digits} digits are too few at t = {mp.nstr(t)}")

    def _value(self, t: mpf, digits: int) -> mpf | None:
        with mp.workdps(digits):
            theta = self.loop.dead_time_s
            first = 1 if self.signal == "command" else 0
            shift = 1 if self.signal == "load" else 0
            total, size = mpf(0), mpf(0)
            k = first
            while (k + shift) * theta <= t:
                sign = (-1) ** (k + 1) if self.signal == "command" else (-1) ** k
                value, magnitude = self._term(k).value(t - (k + shift) * theta)
                total += sign * value
                size = max(size, magnitude)
                k += 1
            # 25 digits of the value, or 60 decimals where the value itself is (nearly) 0.
            left = size * mpf(10) ** -digits
            return total if left * mpf(10) ** 25 <= abs(total) or left <= mpf(10) ** -60 else None

    def _term(self, k: int) -> _Term:
        key = (k, mp.dps)
        if key not in self._terms:
            self._terms[key] = _inverse(_powers(self._base(), self.loop.rational, k))
        return self._terms[key]

    def _base(self) -> Part | None:
        return {"command": None, "load": self.loop.plant, "effort": self.loop.compensator}[self.signal]


def _powers(base: Part | None, rational: Part, k: int) -> tuple[mpf, Counter]:
    """Gain and root exponents (zeros positive, poles negative) of base·L₀^k/s."""
    gain = rational.gain**k
    exponents: Counter = Counter({mpc(0): -1})
    for z in rational.zeros:
        exponents[z] += k
    for p in rational.poles:
        exponents[p] -= k
    if base is not None:
        gain *= base.gain
        for z in base.zeros:
            exponents[z] += 1
        for p in base.poles:
            exponents[p] -= 1
    return gain, exponents


def _inverse(factors: tuple[mpf, Counter]) -> _Term:
    gain, exponents = factors
    pieces = []
    for pole, exponent in exponents.items():
        if exponent < 0:
            pieces.append((pole, _laurent(gain, exponents, pole, -exponent)))
    return _Term(tuple(pieces))


def _laurent(gain: mpf, exponents: Counter, pole: mpc, order: int) -> tuple[mpc, ...]:
    """c_q of Σ c_q/(s − pole)^{q+1}, q = 0…order−1, from the Taylor series of the rest by its log derivative."""
    others = [(root, m) for root, m in exponents.items() if root != pole and m]
    inverse = [1 / (pole - root) for root, _ in others]
    powers = [mpf(1)] * len(others)
    log_slope = []
    for r in range(order - 1):
        powers = [p * i for p, i in zip(powers, inverse, strict=True)]
        log_slope.append((-1) ** r * mp.fsum(m * p for (_, m), p in zip(others, powers, strict=True)))
    taylor = [mpc(gain) * mp.fprod((pole - root) ** m for root, m in others)]
    for r in range(order - 1):
        taylor.append(mp.fsum(log_slope[i] * taylor[r - i] for i in range(r + 1)) / (r + 1))
    return tuple(taylor[order - 1 - q] for q in range(order))
