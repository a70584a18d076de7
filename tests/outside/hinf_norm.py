"""The H-infinity norm by eigenvalues of a Hamiltonian matrix (slycot's ab13dd): a second method for the peaks.

The state space is the modal form of the 60-digit partial fractions, so that the realisation itself is nearly exact.
"""

from __future__ import annotations

import numpy as np
import slycot
from mpmath import mp, mpc, mpf

from tests.outside import exact_polynomial as polynomial
from tests.outside.loop import Loop
from tests.outside.peaks import closed_loop_fraction

StateSpace = tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]


def modal_state_space(loop: Loop, kind: str, poles: list[mpc]) -> StateSpace:
    """A block-diagonal realisation of S, T, C·S or (1−L)/(1+L) with its closed-loop poles as blocks."""
    above, below = closed_loop_fraction(loop, kind)
    lead = polynomial.trimmed(below)[-1]
    straight = above[len(poles)] / lead if len(above) > len(poles) else mpf(0)
    size = len(poles)
    a, b, c = np.zeros((size, size)), np.zeros((size, 1)), np.zeros((1, size))
    row = 0
    for i, pole in enumerate(poles):
        if mp.im(pole) < 0:
            continue
        slope = lead * mp.fprod(pole - q for j, q in enumerate(poles) if j != i)
        residue = polynomial.evaluate(above, pole) / slope
        weight = float(mp.sqrt(abs(residue))) or 1.0  # shared by b and c
        if mp.im(pole) == 0:
            a[row, row], b[row, 0], c[0, row] = float(mp.re(pole)), weight, float(mp.re(residue)) / weight
            row += 1
            continue
        sigma, omega = float(mp.re(pole)), float(mp.im(pole))
        a[row : row + 2, row : row + 2] = [[sigma, omega], [-omega, sigma]]
        b[row, 0] = weight
        c[0, row], c[0, row + 1] = 2 * float(mp.re(residue)) / weight, 2 * float(mp.im(residue)) / weight
        row += 2
    return a, b, c, np.array([[float(straight)]])


def gain_at(space: StateSpace, omega: float) -> float:
    """|c(jω − a)⁻¹b + d|."""
    a, b, c, d = space
    return float(abs((c @ np.linalg.solve(1j * omega * np.eye(len(a)) - a, b) + d)[0, 0]))


def norm(space: StateSpace) -> float:
    """sup over ω of the gain."""
    a, b, c, d = space
    n = len(a)
    top, _ = slycot.ab13dd("C", "I", "N", "D", n, 1, 1, a, np.eye(n), b, c, d, tol=1e-11)
    return float(top)
