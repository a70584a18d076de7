"""Start values for the closed-loop roots: eigenvalues of a chain of second-order sections with feedback.

The loop is never multiplied out. Each section carries two poles and up to two zeros; the chain is closed by
its last output. LAPACK balances the matrix before it looks for eigenvalues, so their errors stay small beside
each root's own size for all but extreme spreads. They are start values only.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.model.factored import ComplexArray, FloatArray


@dataclass(frozen=True, eq=False)
class _Sections:
    """Coefficients of the sections, (c, m) each.

    A full section: x1' = x2, x2' = u − product·x1 + sum·x2; a half one, with one pole: x1' = pole·x1 + u.
    Both: output = c0·x1 + c1·x2 + through·u, where `through` is 1 for as many zeros as poles, else 0.
    """

    full: NDArray[np.bool_]
    half: NDArray[np.bool_]
    pole_sum: FloatArray
    pole_product: FloatArray
    output: FloatArray
    """(c, 2m): c0 and c1 in turn."""


def chain_matrix(
    poles: ComplexArray, zeros: ComplexArray, orders: NDArray[np.int64], gain: FloatArray, filler: FloatArray
) -> FloatArray:
    """(c, 2m, 2m) closed-loop matrices of 1 + gain·Π(s − zero)/Π(s − pole).

    Parameters
    ----------
    poles, zeros : (c, 2m) complex; conjugates adjacent at even places; what lies past `orders` is ignored
    orders : (2, c) number of poles and of zeros a case; no more zeros than poles
    gain : (c,); 1 + gain must not vanish where both numbers are equal
    filler : (c,) eigenvalue that stands, decoupled, where a case has fewer states than 2m
    """
    cases, width = poles.shape
    n, m = orders[:, :, None]
    sections = _sections(poles, zeros, n, m)
    here, last = np.arange(width // 2), (n + 1) // 2 - 1
    # Zeros fill the sections from the first: those before m // 2 pass their input through to the next.
    reach = here <= m // 2
    before = here[:, None] > here
    adjacent = here[:, None] == here + 1
    coupled = adjacent | (before & reach[:, :, None])
    seen = (here == last) | ((n == m) & (here <= last))
    # The chain's input is −gain·output, and the output holds the input itself where n = m.
    feedback = gain[:, None] / (1.0 + gain[:, None] * (n == m))
    inputs = coupled - (feedback * reach)[:, :, None] * seen[:, None, :]
    drive = np.repeat(inputs, 2, axis=2) * sections.output[:, None, :]

    matrix = np.zeros((cases, width, width))
    matrix[:, ::2] = drive * sections.half[:, :, None]
    matrix[:, 1::2] = drive * sections.full[:, :, None]
    even, odd = 2 * here, 2 * here + 1
    dead = filler[:, None]
    matrix[:, even, odd] += sections.full
    matrix[:, odd, even] -= sections.pole_product
    matrix[:, odd, odd] += np.where(sections.full, sections.pole_sum, dead)
    matrix[:, even, even] += np.where(sections.half, poles[:, ::2].real, np.where(sections.full, 0.0, dead))
    return matrix


def _sections(poles: ComplexArray, zeros: ComplexArray, n: NDArray[np.int64], m: NDArray[np.int64]) -> _Sections:
    place = np.arange(0, poles.shape[1], 2)
    full, half = place + 1 < n, place + 1 == n
    two_zeros, one_zero = place + 1 < m, place + 1 == m
    p_sum = np.where(full, (poles[:, ::2] + poles[:, 1::2]).real, 0.0)
    p_product = np.where(full, (poles[:, ::2] * poles[:, 1::2]).real, 0.0)
    z_sum = (zeros[:, ::2] + zeros[:, 1::2]).real
    z_product = (zeros[:, ::2] * zeros[:, 1::2]).real
    pole, zero = poles[:, ::2].real, zeros[:, ::2].real
    output = np.zeros(poles.shape)
    c0 = np.where(one_zero, np.where(half, pole - zero, -zero), 1.0)
    output[:, ::2] = np.where(two_zeros, z_product - p_product, c0)
    output[:, 1::2] = np.where(full, np.where(two_zeros, p_sum - z_sum, one_zero), 0.0)
    return _Sections(full, half, p_sum, p_product, output)
