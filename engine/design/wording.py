"""Numbers in sentences: significant digits, the trade's units, a true minus sign."""

from __future__ import annotations

import math


def number(value: float, digits: int = 3) -> str:
    """`value` to `digits` significant digits, plain where that is short, else with a power of ten.

    >>> number(42.361), number(-0.00012345), number(1.5e9)
    ('42.4', '−1.23e−4', '1.5e9')
    """
    if value == 0 or not math.isfinite(value):
        return "0" if value == 0 else str(value)
    exponent = math.floor(math.log10(abs(float(f"{value:.{digits - 1}e}"))))
    if -4 < exponent < max(digits, 6):
        text = f"{value:.{max(digits - 1 - exponent, 0)}f}"
        text = text.rstrip("0").rstrip(".") if "." in text else text
    else:
        mantissa, power = f"{value:.{digits - 1}e}".split("e")
        mantissa = mantissa.rstrip("0").rstrip(".") if "." in mantissa else mantissa
        text = f"{mantissa}e{int(power)}"
    return text.replace("-", "−")


def quantity(value: float, unit: str, digits: int = 3) -> str:
    """A number with its unit: `42.4°`, `6.02 dB`, `9.5 rad/s`."""
    text = number(value, digits)
    if not unit:
        return text
    return f"{text}{unit}" if unit == "°" else f"{text} {unit}"


def counted(count: int, one: str, many: str | None = None) -> str:
    """`1 pole`, `2 poles`."""
    return f"{count} {one if count == 1 else many or one + 's'}"
