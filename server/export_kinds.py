"""The kinds of export: how each is written, and which come with later versions."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from engine.design.curves_table import curves_csv
from engine.design.document import Design
from engine.design.transfer_function import hand_over
from server.json_text import json_text


@dataclass(frozen=True)
class ExportKind:
    """One kind of file to hand over."""

    write: Callable[[Design, str | None], str]
    """The file's text, from the design and the link to it (if it is stored)."""
    media_type: str
    ending: str


EXPORTS = {
    "transfer-function": ExportKind(
        lambda design, link: json_text(hand_over(design, link), indent=2) + "\n", "application/json", "json"
    ),
    "curves": ExportKind(lambda design, _: curves_csv(design), "text/csv; charset=utf-8", "csv"),
}
LATER = ("c", "structured-text", "python", "netlist")


def refusal_of(kind: str) -> str:
    """Why there is no such export; "" if there is."""
    if kind in EXPORTS:
        return ""
    there_are = f"there are {' and '.join(EXPORTS)}"
    if kind in LATER:
        return f"the export {kind} is not in this version yet; {there_are}"
    return f"there is no export {kind[:60]!r}; {there_are}"
