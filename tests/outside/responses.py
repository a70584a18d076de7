"""Closed-loop time responses of rational loops by partial fractions."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from mpmath import mp, mpc, mpf

from tests.outside import exact_polynomial as polynomial
from tests.outside.closed_loop import closed_loop_poles
from tests.outside.loop import Loop

SIGNALS = ("command", "load", "effort")


@dataclass(frozen=True)
class Modal:
    """y(t) = constant + slope·t + Σ residue·exp(pole·t) for t > 0."""

    constant: mpf
    slope: mpf
    poles: tuple[mpc, ...]
    residues: tuple[mpc, ...]
    extra_digits: int = 0
    """Digits that nearly equal poles cancel."""

    def value(self, t: mpf) -> mpf:
        with mp.workdps(mp.dps + self.extra_digits):
            modes = mp.fsum(r * mp.exp(p * t) for p, r in zip(self.poles, self.residues, strict=True))
            return self.constant + self.slope * t + mp.re(modes)

    def rate(self, t: mpf) -> mpf:
        """dy/dt."""
        with mp.workdps(mp.dps + self.extra_digits):
            modes = mp.fsum(r * p * mp.exp(p * t) for p, r in zip(self.poles, self.residues, strict=True))
            return self.slope + mp.re(modes)

    def sampled(self, t: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Value and rate in 64-bit-mantissa arithmetic, for finding features that are then polished."""
        t = t.astype(np.longdouble)
        y = np.full(t.shape, _long(self.constant)) + _long(self.slope) * t
        rate = np.full(t.shape, _long(self.slope))
        for p, r in zip(self.poles, self.residues, strict=True):
            if mp.im(p) < 0:
                continue
            factor = np.longdouble(1 if mp.im(p) == 0 else 2)
            a, b, u, v = _long(mp.re(p)), _long(mp.im(p)), _long(mp.re(r)), _long(mp.im(r))
            decay = factor * np.exp(a * t)
            cos, sin = np.cos(b * t), np.sin(b * t)
            y += decay * (u * cos - v * sin)
            rate += decay * ((u * a - v * b) * cos - (u * b + v * a) * sin)
        return y, rate

    def features_grid(self) -> np.ndarray:
        """Times that sample every mode 24 times a cycle, or a time constant, until it has decayed to 1e-12."""
        largest = max((abs(r) for r in self.residues), default=mpf(1))
        pieces = [np.array([0.0])]
        for p, r in zip(self.poles, self.residues, strict=True):
            if mp.im(p) < 0 or r == 0:
                continue
            life = float(mp.log(max(abs(r) / largest, mpf("1e-9")) * mpf(10) ** 12) / -mp.re(p))
            step = float(2 * mp.pi / abs(p)) / 24
            count = int(life / step) + 2
            if count > 300_000:
                raise ArithmeticError("response too long to sample")
            pieces.append(np.arange(count) * step)
            pieces.append(np.geomspace(step * 1e-3, life, 200))
        return np.unique(np.concatenate(pieces))


def _long(x: mpf) -> np.longdouble:
    head = float(x)
    return np.longdouble(head) + np.longdouble(float(x - mpf(head)))


def closed_loop_numerator(loop: Loop, signal: str) -> list:
    """Numerator of T, P·S or C·S over N + D, nothing cancelled."""
    c, p = loop.compensator, loop.plant
    return {
        "command": lambda: loop.rational.numerator,
        "load": lambda: polynomial.multiply(p.numerator, c.denominator),
        "effort": lambda: polynomial.multiply(c.numerator, p.denominator),
    }[signal]()


def response(
    loop: Loop, signal: str, shape: str = "step", amplitude: float = 1, poles: Sequence[mpc] | None = None
) -> Modal:
    """Response to a step or ramp command ("command", "effort") or a step load ("load").

    `poles` may hand in the closed-loop poles where they are known already.
    """
    poles = tuple(closed_loop_poles(loop) if poles is None else poles)
    numerator = polynomial.scale(closed_loop_numerator(loop, signal), mpf(amplitude))
    lead = polynomial.trimmed(loop.closed)[-1]
    order = 2 if shape == "ramp" and signal != "load" else 1
    gaps = [abs(a - b) / (abs(a) + abs(b)) for i, a in enumerate(poles) for b in poles[:i]]
    lost = max(0, int(-mp.log10(min(gaps, default=mpf(1))))) * 3
    with mp.workdps(mp.dps + 20 + lost):
        residues = []
        for i, p in enumerate(poles):
            others = mp.fprod(p - q for j, q in enumerate(poles) if j != i)
            residues.append(polynomial.evaluate(numerator, p) / (lead * others * p**order))
        below = loop.closed
        at_zero = mpf(numerator[0]) / below[0]
        if order == 1:
            return Modal(at_zero, mpf(0), poles, tuple(residues), lost)
        first = numerator[1] if len(numerator) > 1 else mpf(0)
        constant = (first - at_zero * below[1]) / below[0]
        return Modal(constant, at_zero, poles, tuple(residues), lost)
