"""Canonical JSON and the fingerprint."""

import math
import struct

import pytest

from engine.design.canonical import canonical_json, design_sha256

# RFC 8785, appendix B: IEEE-754 samples and their ECMAScript spelling.
RFC_8785_APPENDIX_B = {
    "0000000000000000": "0",
    "8000000000000000": "0",
    "0000000000000001": "5e-324",
    "8000000000000001": "-5e-324",
    "7fefffffffffffff": "1.7976931348623157e+308",
    "ffefffffffffffff": "-1.7976931348623157e+308",
    "4340000000000000": "9007199254740992",
    "c340000000000000": "-9007199254740992",
    "4430000000000000": "295147905179352830000",
    "44b52d02c7e14af5": "9.999999999999997e+22",
    "44b52d02c7e14af6": "1e+23",
    "44b52d02c7e14af7": "1.0000000000000001e+23",
    "444b1ae4d6e2ef4e": "999999999999999700000",
    "444b1ae4d6e2ef4f": "999999999999999900000",
    "444b1ae4d6e2ef50": "1e+21",
    "3eb0c6f7a0b5ed8c": "9.999999999999997e-7",
    "3eb0c6f7a0b5ed8d": "0.000001",
    "41b3de4355555553": "333333333.3333332",
    "41b3de4355555554": "333333333.33333325",
    "41b3de4355555555": "333333333.3333333",
    "becbf647612f3696": "-0.0000033333333333333333",
}


@pytest.mark.parametrize(("bits", "spelling"), RFC_8785_APPENDIX_B.items())
def test_numbers_are_spelled_as_rfc_8785_appendix_b_says(bits: str, spelling: str) -> None:
    (number,) = struct.unpack(">d", bytes.fromhex(bits))
    assert canonical_json(number).decode() == spelling


def test_keys_sort_by_utf16_units() -> None:
    # RFC 8785, section 3.2.3, the example of sorted keys.
    keys = ["\u20ac", "\r", "\ufb33", "1", "\U0001f600", "\u0080", "\u00f6"]
    spelled = canonical_json(dict.fromkeys(keys, 0)).decode()
    order = ["\\r", "1", "\u0080", "\u00f6", "\u20ac", "\U0001f600", "\ufb33"]
    assert spelled == "{" + ",".join(f'"{key}":0' for key in order) + "}"


def test_the_fingerprint_does_not_depend_on_order_or_spelling() -> None:
    assert design_sha256({"a": 1, "b": [1.0, 2e0]}) == design_sha256({"b": [1, 2.0], "a": 1.0})
    assert design_sha256({"a": 1}) != design_sha256({"a": 2})


@pytest.mark.parametrize("number", [math.nan, math.inf])
def test_what_json_cannot_say_is_refused(number: float) -> None:
    with pytest.raises(ValueError, match="no JSON spelling"):
        canonical_json({"a": number})
