"""Reading the binary frames of the live socket, written from the contract and not from the server."""

from __future__ import annotations

import json
import struct
from typing import Any

import numpy as np
from numpy.typing import NDArray


def decode(frame: bytes) -> tuple[dict[str, Any], dict[str, NDArray[np.float32]]]:
    """Header and arrays of one frame; the layout is checked on the way."""
    (length,) = struct.unpack_from("<I", frame)
    assert length % 4 == 0
    header = json.loads(frame[4 : 4 + length].decode("utf-8"))
    part = frame[4 + length :]
    arrays = {}
    end = 0
    for entry in header.get("arrays", []):
        count = int(np.prod(entry["shape"]))
        assert entry["offset"] == end
        arrays[entry["name"]] = np.frombuffer(part, "<f4", count, entry["offset"]).reshape(entry["shape"])
        end += 4 * count
    assert len(part) == end
    return header, arrays
