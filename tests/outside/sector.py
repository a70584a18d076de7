"""Proven enclosures of L on a piece of the frequency axis, for loops with dead time.

Every factor jω − r has a monotone argument, and a magnitude that is monotone on each side of Im r. So |L| and arg L
over [a, b] lie in intervals that follow from the values at the ends: an annular sector that holds L(j[a, b]).
Double precision suffices, because an enclosure only decides where to look; the values are polished elsewhere.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from mpmath import mp

from tests.outside.loop import Loop


@dataclass(frozen=True)
class Enclosure:
    """Annular sectors for k pieces of the axis; angles in rad, continuous in frequency."""

    low: np.ndarray
    high: np.ndarray
    least_angle: np.ndarray
    greatest_angle: np.ndarray


class Axis:
    """L(jω) in double precision, with continuous phase, and its enclosures."""

    def __init__(self, loop: Loop) -> None:
        part = loop.rational
        roots = [complex(z) for z in part.zeros] + [complex(p) for p in part.poles]
        self.sigma = np.array([r.real for r in roots])
        self.nu = np.array([r.imag for r in roots])
        self.sign = np.array([1.0] * len(part.zeros) + [-1.0] * len(part.poles))
        self.log_gain = float(mp.log(abs(part.gain)))
        self.gain_angle = 0.0 if part.gain > 0 else np.pi
        self.dead_time_s = float(loop.dead_time_s)

    def angles(self, omega: np.ndarray) -> np.ndarray:
        """(k, n) argument of each factor, continuous for ω > 0."""
        rise = omega[:, None] - self.nu
        left = np.arctan2(rise, -self.sigma)
        # A root in the right half plane: the argument falls from 3π/2 towards π/2, through π at its own frequency.
        right = np.pi - np.arctan2(rise, self.sigma)
        # A root on the axis: undefined at its own frequency; pieces must not contain it inside.
        return np.where(self.sigma <= 0, left, right)

    def phase(self, omega: np.ndarray) -> np.ndarray:
        return self.gain_angle + self.angles(omega) @ self.sign - omega * self.dead_time_s

    def phase_slope(self, omega: np.ndarray) -> np.ndarray:
        rise = omega[:, None] - self.nu
        return (-self.sigma / (self.sigma**2 + rise**2)) @ self.sign - self.dead_time_s

    def phase_slope_range(self, a: np.ndarray, b: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Bounds of dφ/dω over [a, b]."""
        near = np.clip(self.nu, a[:, None], b[:, None]) - self.nu
        far = np.maximum(np.abs(a[:, None] - self.nu), np.abs(b[:, None] - self.nu))
        steep = -self.sigma / (self.sigma**2 + near**2) * self.sign
        flat = -self.sigma / (self.sigma**2 + far**2) * self.sign
        low, high = np.minimum(steep, flat).sum(axis=1), np.maximum(steep, flat).sum(axis=1)
        return low - self.dead_time_s, high - self.dead_time_s

    def value(self, omega: np.ndarray) -> np.ndarray:
        """L(jω)."""
        logs = np.log(np.hypot(self.sigma, omega[:, None] - self.nu)) @ self.sign + self.log_gain
        return np.exp(logs) * np.exp(1j * self.phase(omega))

    def enclose(self, a: np.ndarray, b: np.ndarray) -> Enclosure:
        """Sectors that hold L over each [a, b], 0 < a < b."""
        fall_a, fall_b = a[:, None] - self.nu, b[:, None] - self.nu
        nearest = np.where((fall_a < 0) & (fall_b > 0), 0.0, np.minimum(np.abs(fall_a), np.abs(fall_b)))
        with np.errstate(divide="ignore"):
            log_near = np.log(np.hypot(self.sigma, nearest))
            log_far = np.log(np.hypot(self.sigma, np.maximum(np.abs(fall_a), np.abs(fall_b))))
        zero = self.sign > 0
        low = np.where(zero, log_near, -log_far).sum(axis=1) + self.log_gain
        high = np.where(zero, log_far, -log_near).sum(axis=1) + self.log_gain
        at_a, at_b = self.angles(a) * self.sign, self.angles(b) * self.sign
        least = np.minimum(at_a, at_b).sum(axis=1) + self.gain_angle - b * self.dead_time_s
        greatest = np.maximum(at_a, at_b).sum(axis=1) + self.gain_angle - a * self.dead_time_s
        margin = 1e-12  # covers rounding of the sums
        return Enclosure(
            np.exp(low - margin), np.exp(high + margin), least - margin * (1 + b * self.dead_time_s), greatest + margin
        )
