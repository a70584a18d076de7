"""The binary frame of the live socket: header length, JSON header, float32 arrays.

4 bytes little-endian length of the header; the header in UTF-8, padded with spaces so that the arrays start at a
multiple of 4; then the arrays, little-endian, in the order of the header's table.
"""

from __future__ import annotations

import struct
from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray

from engine.errors import Fault
from server.error_shape import error_body
from server.json_text import json_text


def frame_of(header: Mapping[str, Any], arrays: Mapping[str, NDArray[np.float64]]) -> bytes:
    """A frame with curves; `arrays` in the header tells name, shape and offset in bytes of each."""
    table = []
    parts = []
    offset = 0
    for name, array in arrays.items():
        packed = _packed(array)
        table.append({"name": name, "shape": list(array.shape), "offset": offset})
        parts.append(packed)
        offset += len(packed)
    return _head({**header, "arrays": table}) + b"".join(parts)


def refusal_frame(seq: int | None, status: int, faults: Iterable[Fault]) -> bytes:
    """A frame that says why there are no curves."""
    return _head({"seq": seq, **error_body(status, faults)})


def _head(header: Mapping[str, Any]) -> bytes:
    text = json_text(header).encode()
    text += b" " * (-len(text) % 4)
    return struct.pack("<I", len(text)) + text


def _packed(array: NDArray[np.float64]) -> bytes:
    with np.errstate(over="ignore"):
        small = array.astype("<f4")
    # Past the range of float32 nothing can be drawn: not shown, like other points that are not.
    small[np.isinf(small)] = np.nan
    return small.tobytes()
