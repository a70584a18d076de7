"""One answer of the live socket: message in, frame out. Computed by a worker."""

from __future__ import annotations

import logging
import time
from typing import Any

from engine.design.aim import aimed_at
from engine.design.assess import assess_with_arrays
from engine.design.canonical import design_sha256
from engine.design.limits import Limits
from engine.design.parse import parse_design
from engine.errors import DesignError, Fault
from server.error_shape import SURPRISE
from server.json_fields import fields_of
from server.json_text import parse_json
from server.live_frame import frame_of, refusal_frame

_LOG = logging.getLogger("loopwright.live")
_LARGEST_SEQ = 2**53


def answer_to(message: str | bytes, most_bytes: int, limits: Limits) -> bytes:
    """The frame that answers one message; every failure is a frame too."""
    seq: int | None = None
    try:
        if len(message) > most_bytes:
            return refusal_frame(
                seq, 413, [Fault("", f"the message is too large, at most {most_bytes} bytes are taken")]
            )
        data = parse_json(message)
        seq = _seq_of(data)
        fields = fields_of(data, ["seq", "design"], ["aim"])
        if seq is None:
            raise DesignError("seq", "must be a whole number from 0 up")
        return _assessed(seq, fields["design"], fields.get("aim"), limits)
    except DesignError as error:
        return refusal_frame(seq, 422, error.faults)
    except Exception:
        _LOG.exception("an assessment failed")
        return refusal_frame(seq, 500, [Fault("", SURPRISE)])


def _assessed(seq: int, document: Any, aim: Any, limits: Limits) -> bytes:
    design = parse_design(document, limits)
    more: dict[str, Any] = {}
    if aim is not None:
        design = aimed_at(design, _crossover_of(aim))
        more["gain"] = design.compensator.gain
    began = time.perf_counter()
    assessment, arrays = assess_with_arrays(design)
    more["assess_ms"] = round((time.perf_counter() - began) * 1e3, 3)
    more["design_sha256"] = design_sha256(design.document())
    return frame_of({"seq": seq, "ok": True, "assessment": assessment, **more}, arrays)


def seq_in(message: str | bytes) -> int | None:
    """The number of a request, for an answer that the request itself cannot be asked for any more."""
    try:
        return _seq_of(parse_json(message))
    except DesignError:
        return None


def _seq_of(data: Any) -> int | None:
    seq = data.get("seq") if isinstance(data, dict) else None
    return seq if type(seq) is int and 0 <= seq < _LARGEST_SEQ else None


def _crossover_of(aim: Any) -> float:
    try:
        crossover = fields_of(aim, ["crossover_rad_s"])["crossover_rad_s"]
    except DesignError as error:
        raise error.within("aim") from None
    if type(crossover) not in (int, float) or not crossover > 0:
        raise DesignError("aim.crossover_rad_s", "must be a number greater than 0")
    return float(crossover)
