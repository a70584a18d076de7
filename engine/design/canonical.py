"""Canonical JSON (RFC 8785) and the fingerprint of a design made from it."""

from __future__ import annotations

import hashlib
import json
import math
from typing import Any


def canonical_json(document: Any) -> bytes:
    """The one spelling of a JSON value: sorted keys, no spaces, ECMAScript numbers, UTF-8.

    Source: RFC 8785, JSON Canonicalization Scheme, section 3.2.
    """
    return _spell(document).encode("utf-8")


def design_sha256(document: Any) -> str:
    """Fingerprint of a design document, 64 hexadecimal digits."""
    return hashlib.sha256(canonical_json(document)).hexdigest()


def _spell(value: Any) -> str:
    if value is None or isinstance(value, (bool, str)):
        return json.dumps(value, ensure_ascii=False)
    if isinstance(value, (int, float)):
        return _number(float(value))
    if isinstance(value, dict):
        # RFC 8785 sorts by UTF-16 code units, which differs from code points beyond the basic plane.
        keys = sorted(value, key=lambda key: key.encode("utf-16-be"))
        return "{" + ",".join(f"{_spell(key)}:{_spell(value[key])}" for key in keys) + "}"
    if isinstance(value, (list, tuple)):
        return "[" + ",".join(_spell(item) for item in value) + "]"
    raise TypeError(f"{type(value).__name__} has no JSON spelling")


def _number(value: float) -> str:
    """ECMAScript Number::toString, from the shortest digits that Python's repr finds."""
    if not math.isfinite(value):
        raise ValueError(f"{value} has no JSON spelling")
    if value == 0:
        return "0"
    sign = "-" if value < 0 else ""
    mantissa, _, exponent = f"{abs(value)!r}".partition("e")
    whole, _, fraction = mantissa.partition(".")
    fraction = "" if fraction == "0" else fraction
    digits = (whole + fraction).lstrip("0")
    point = len(whole) + int(exponent or 0) - (len(whole + fraction) - len(digits))
    digits = digits.rstrip("0")
    count = len(digits)
    if count <= point <= 21:
        return sign + digits + "0" * (point - count)
    if 0 < point <= 21:
        return f"{sign}{digits[:point]}.{digits[point:]}"
    if -6 < point <= 0:
        return f"{sign}0.{'0' * -point}{digits}"
    tail = f".{digits[1:]}" if count > 1 else ""
    return f"{sign}{digits[0]}{tail}e{'+' if point > 0 else '-'}{abs(point - 1)}"
