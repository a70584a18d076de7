"""Values of a factored model in the complex plane."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from engine.model.factored import ComplexArray, Factored, FloatArray

_FACTORS_AT_ONCE = 500  # a product of so many mantissas in [0.5, 1.5) stays within a double's range


def response(model: Factored, s: ArrayLike) -> ComplexArray:
    """Value of the model at each s.

    Parameters
    ----------
    s : any shape, finite complex numbers [rad/s]

    Returns
    -------
    same shape; infinite at a pole, nan where a pole and a zero meet. Products are formed with their exponents
    apart, so only a value beyond 1e±308 itself overflows or vanishes, never an intermediate one.
    """
    at = np.asarray(s, dtype=np.complex128)
    with np.errstate(all="ignore"):
        zeros, zero_exponent = _product(at, model.zeros)
        poles, pole_exponent = _product(at, model.poles)
        ratio = model.gain * (zeros / poles)
        exponent = zero_exponent - pole_exponent
        # In two steps: a huge gain may meet a tiny product.
        half = exponent // 2
        value = _scaled(_scaled(ratio, half), exponent - half)
        if model.dead_time_s:
            value = value * np.exp(-model.dead_time_s * at)
        at_pole = (poles == 0) & (zeros != 0)
    return np.where(at_pole, complex(np.inf), value)


def log_derivative(model: Factored, s: ArrayLike) -> ComplexArray:
    """d/ds of log(model): Σ 1/(s − zero) − Σ 1/(s − pole) − dead time [s]; infinite at a root.

    Parameters
    ----------
    s : any shape, finite complex numbers [rad/s]
    """
    at = np.asarray(s, dtype=np.complex128)
    with np.errstate(all="ignore"):
        rise = (1 / (at[..., None] - model.zeros)).sum(axis=-1)
        fall = (1 / (at[..., None] - model.poles)).sum(axis=-1)
        value: ComplexArray = rise - fall - model.dead_time_s
    return value


def _product(at: ComplexArray, roots: ComplexArray) -> tuple[ComplexArray, FloatArray]:
    """Π(at − root) as mantissa · 2^exponent."""
    mantissa = np.ones(at.shape, dtype=np.complex128)
    exponent = np.zeros(at.shape)
    for start in range(0, len(roots), _FACTORS_AT_ONCE):
        factors = at[..., None] - roots[start : start + _FACTORS_AT_ONCE]
        exponents = np.frexp(np.maximum(np.abs(factors.real), np.abs(factors.imag)))[1]
        mantissa = mantissa * _scaled(factors, -exponents).prod(axis=-1)
        shift = np.frexp(np.maximum(np.abs(mantissa.real), np.abs(mantissa.imag)))[1]
        mantissa = _scaled(mantissa, -shift)
        exponent = exponent + exponents.sum(axis=-1) + shift
    return mantissa, exponent


def _scaled(number: ComplexArray, exponent: ArrayLike) -> ComplexArray:
    power = np.clip(np.asarray(exponent), -5000, 5000).astype(np.intc)
    scaled = np.empty(np.broadcast_shapes(number.shape, power.shape), dtype=np.complex128)
    scaled.real = np.ldexp(number.real, power)
    scaled.imag = np.ldexp(number.imag, power)
    return scaled
