"""Checks on the numbers of a model as they are entered: finite, in range, complex roots in pairs."""

from __future__ import annotations

import math
from collections.abc import Sequence
from numbers import Real

import numpy as np

from engine.errors import DesignError
from engine.model.factored import ComplexArray, Factored
from engine.model.limits import (
    DEFAULT_LIMITS,
    LARGEST_ROOT_RAD_S,
    LONGEST_DEAD_TIME_S,
    SMALLEST_ROOT_RAD_S,
    Limits,
    require_order,
)

PAIRING_TOLERANCE = 1e-9
"""How far a root may be from its partner's conjugate, relative to its size: digits lost in printing."""


def factored_model(
    gain: object,
    zeros: Sequence[object],
    poles: Sequence[object],
    dead_time_s: object = 0.0,
    limits: Limits = DEFAULT_LIMITS,
) -> Factored:
    """A model given as gain, zeros and poles.

    Parameters
    ----------
    gain : finite number other than 0, either sign
    zeros, poles : numbers, complex numbers or [re, im] pairs [rad/s], complex ones with their conjugates
    dead_time_s : >= 0 [s]

    Raises DesignError: `gain`, `zeros[k]`, `poles[k]`, `dead_time_s`.
    """
    return Factored(
        nonzero_number(gain, "gain"),
        paired_roots(zeros, "zeros", limits),
        paired_roots(poles, "poles", limits),
        dead_time(dead_time_s),
    )


def finite_number(number: object, where: str) -> float:
    """The number as a finite float; numpy scalars count as numbers, text and booleans do not."""
    if isinstance(number, bool | np.bool_) or not isinstance(number, Real):
        raise DesignError(where, f"must be a number, is {str(number)[:40]!r}")
    try:
        result = float(number)
    except OverflowError:
        result = math.inf
    if not math.isfinite(result):
        raise DesignError(where, f"must be a finite number, is {result}")
    return result


def nonzero_number(number: object, where: str) -> float:
    """A finite number other than 0."""
    result = finite_number(number, where)
    if result == 0:
        raise DesignError(where, "must not be 0")
    return result


def frequency_rad_s(number: object, where: str) -> float:
    """A corner or natural frequency: greater than 0 and within the range of roots."""
    result = finite_number(number, where)
    if result <= 0:
        raise DesignError(where, f"must be greater than 0, is {result:g}")
    if not SMALLEST_ROOT_RAD_S <= result <= LARGEST_ROOT_RAD_S:
        raise DesignError(where, f"must be from {SMALLEST_ROOT_RAD_S:g} to {LARGEST_ROOT_RAD_S:g} rad/s, is {result:g}")
    return result


def dead_time(number: object, where: str = "dead_time_s") -> float:
    """A dead time [s], >= 0."""
    result = finite_number(number, where)
    if result < 0:
        raise DesignError(where, f"must be 0 or greater, is {result:g}")
    if result > LONGEST_DEAD_TIME_S:
        raise DesignError(where, f"must be at most {LONGEST_DEAD_TIME_S:g} s, is {result:g}")
    return result + 0.0  # turns -0.0 into 0.0


def paired_roots(roots: Sequence[object], where: str, limits: Limits = DEFAULT_LIMITS) -> ComplexArray:
    """Roots with each complex one followed by its exact conjugate, in the order of their first members.

    A partner that is off by no more than 1e-9 of the size is taken as meant and replaced by the exact
    conjugate of the first of the two.

    Raises DesignError at `where` or `where[k]`: too many, not a number, out of range, or without a partner.
    """
    require_order(len(roots), where, limits)
    given = [_root(root, f"{where}[{k}]") for k, root in enumerate(roots)]
    waiting = set(range(len(given)))
    paired: list[complex] = []
    for k, root in enumerate(given):
        if k not in waiting:
            continue
        waiting.discard(k)
        if root.imag == 0:
            paired.append(root)
            continue
        partner = min(waiting, key=lambda j: abs(given[j] - root.conjugate()), default=None)
        if partner is None or abs(given[partner] - root.conjugate()) > PAIRING_TOLERANCE * abs(root):
            raise DesignError(f"{where}[{k}]", _unpaired(root))
        waiting.discard(partner)
        paired += [root, root.conjugate()]
    return np.array(paired, dtype=np.complex128)


def _unpaired(root: complex) -> str:
    return (
        f"[{root.real:.12g}, {root.imag:.12g}] has no conjugate partner; "
        f"add [{root.real:.12g}, {-root.imag:.12g}], or make it real"
    )


def _root(root: object, where: str) -> complex:
    if isinstance(root, complex | np.complexfloating):
        real, imaginary = finite_number(root.real, where), finite_number(root.imag, where)
    elif isinstance(root, list | tuple):
        if len(root) != 2:
            raise DesignError(where, f"must be a number or [re, im], has {len(root)} parts")
        real, imaginary = finite_number(root[0], where), finite_number(root[1], where)
    else:
        real, imaginary = finite_number(root, where), 0.0
    size = math.hypot(real, imaginary)
    if size != 0 and not SMALLEST_ROOT_RAD_S <= size <= LARGEST_ROOT_RAD_S:
        raise DesignError(
            where,
            f"must be 0 or of size {SMALLEST_ROOT_RAD_S:g} to {LARGEST_ROOT_RAD_S:g} rad/s, is {size:.3g}",
        )
    return complex(real + 0.0, imaginary + 0.0)
