"""A factored model as one line, in the grammar of the `expression` models."""

from __future__ import annotations

from engine.model.factored import ComplexArray, Factored


def factored_text(model: Factored, digits: int = 6) -> str:
    """Such as `3.2*(s+40)/(s*(s^2+2*s+900))*exp(-0.002*s)`; numbers rounded to `digits` significant digits."""
    over = _factors(model.zeros, digits)
    under = _factors(model.poles, digits)
    text = "*".join([_number(model.gain, digits), *over])
    if under:
        text += f"/{under[0]}" if len(under) == 1 else f"/({'*'.join(under)})"
    if model.dead_time_s:
        text += f"*exp(-{_number(model.dead_time_s, digits)}*s)"
    return text


def _factors(roots: ComplexArray, digits: int) -> list[str]:
    """One factor a real root or pair; equal factors as a power, in the order in which they first stand."""
    counts: dict[str, int] = {}
    for root in roots.tolist():
        if root.imag < 0:  # its conjugate stands for both
            continue
        factor = _factor(root, digits)
        counts[factor] = counts.get(factor, 0) + 1
    return [factor if count == 1 else f"{factor}^{count}" for factor, count in counts.items()]


def _factor(root: complex, digits: int) -> str:
    if root.imag == 0:
        return "s" if root.real == 0 else f"(s{_signed(-root.real, digits)})"
    middle = "" if root.real == 0 else f"{_signed(-2 * root.real, digits)}*s"
    return f"(s^2{middle}{_signed(abs(root) ** 2, digits)})"


def _signed(value: float, digits: int) -> str:
    return f"{'-' if value < 0 else '+'}{_number(abs(value), digits)}"


def _number(value: float, digits: int) -> str:
    return f"{value:.{digits}g}".replace("e+0", "e").replace("e+", "e").replace("e-0", "e-")
