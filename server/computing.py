"""What the routes have computed by a worker: text in, text out, DesignError for everything that is wrong with it."""

from __future__ import annotations

import re
from typing import Any, NamedTuple

from engine.design.assess import assess
from engine.design.canonical import design_sha256
from engine.design.document import Design
from engine.design.limits import Limits
from engine.design.parse import parse_design, parse_model
from engine.design.purposes import PURPOSES, stage_for
from engine.design.transfer_function import root_pairs
from engine.errors import DesignError
from engine.model.spelling import as_text
from server.export_kinds import EXPORTS
from server.json_fields import fields_of
from server.json_text import json_text, parse_json


class Checked(NamedTuple):
    """A design that can be stored."""

    document: str
    design_sha256: str


class Trace(NamedTuple):
    """A stored design that an export is said to come from."""

    link: str
    design_sha256: str


def assessment(text: bytes, curves: bool, limits: Limits) -> str:
    """The assessment of a design as JSON."""
    return json_text(assess(_design(text, limits), curves))


def checked(text: bytes, limits: Limits) -> Checked:
    """A design as it will be stored, with its fingerprint."""
    document = _design(text, limits).document()
    return Checked(json_text(document), design_sha256(document))


def export(kind: str, text: bytes, trace: Trace | None, limits: Limits) -> tuple[str, str]:
    """Name and content of the file to hand over."""
    design = _design(text, limits)
    if trace and trace.design_sha256 != design_sha256(design.document()):
        raise DesignError("token", "stands for another design; share this one first, or leave the token out")
    content = EXPORTS[kind].write(design, trace.link if trace else None)
    return f"{_file_name(design.title)}-{kind}.{EXPORTS[kind].ending}", content


def model(text: bytes, limits: Limits) -> str:
    """One model by itself, as JSON: gain, zeros, poles, dead time and the formula."""
    found = parse_model(fields_of(parse_json(text), ["model"])["model"], limits)
    parts: dict[str, Any] = {
        "ok": True,
        "gain": found.gain,
        "zeros": root_pairs(found.zeros),
        "poles": root_pairs(found.poles),
        "dead_time_s": found.dead_time_s,
        "text": as_text(found),
    }
    return json_text(parts)


def stage(text: bytes, limits: Limits) -> str:
    """A stage for a purpose, as JSON."""
    fields = fields_of(parse_json(text), ["design", "purpose"])
    if not isinstance(fields["purpose"], str):
        raise DesignError("purpose", f"must be one of {', '.join(PURPOSES)}")
    found = stage_for(parse_design(fields["design"], limits), fields["purpose"])
    return json_text({"ok": True, "stage": found.stage, "why": found.why})


def _design(text: bytes, limits: Limits) -> Design:
    return parse_design(parse_json(text), limits)


def _file_name(title: str) -> str:
    return re.sub(r"[^a-z0-9]+", "-", title.lower()).strip("-")[:60] or "design"
