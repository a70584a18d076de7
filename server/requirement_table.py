"""The assessment as plain text for a terminal: one aligned row a requirement."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from engine.design.document import Design, Requirement
from engine.design.wording import number, quantity

_DIGITS = 5
_HEADINGS = ("", "requirement", "limit", "worst", "slack", "plant case", "")
_TO_THE_RIGHT = (3, 4)


def requirement_table(design: Design, assessment: Mapping[str, Any]) -> str:
    """Title, headline, the rows, what is worth noticing, the verdict."""
    parts = [f"{design.title or 'Untitled design'}\n{assessment['headline']}"]
    pairs = zip(design.requirements, assessment["requirements"], strict=True)
    rows = [_cells(row, judged) for row, judged in pairs]
    if rows:
        parts.append(_aligned([_HEADINGS, *rows]))
    notices = [
        *assessment["notices"],
        *(f"{case['name']}: {notice}" for case in assessment["cases"] for notice in case["notices"]),
    ]
    if notices:
        parts.append("\n".join(f"note: {notice}" for notice in notices))
    parts.append(f"verdict: {assessment['verdict']}")
    return "\n\n".join(parts)


def _cells(row: Requirement, judged: Mapping[str, Any]) -> tuple[str, ...]:
    reading = judged["reading"]
    worst = reading["state"] if reading["value"] is None else quantity(reading["value"], judged["unit"], _DIGITS)
    verdict = {True: "met", False: "NOT MET", None: "not assessable"}[judged["met"]]
    return (
        verdict,
        f"{judged['label']}{_where(row)}{' (should)' if row.rank == 'should' else ''}",
        _limit(row, judged),
        worst,
        "" if judged["slack"] is None else f"{judged['slack']:+.2f}".replace("-", "−"),
        judged["case"] or "",
        judged["shortfall"],
    )


def _limit(row: Requirement, judged: Mapping[str, Any]) -> str:
    sides = [
        f"{words} {quantity(limit, judged['unit'], _DIGITS)}"
        for words, limit in (("at least", row.at_least), ("at most", row.at_most))
        if limit is not None
    ]
    if row.mask is not None and judged.get("limit") is not None:
        sides.append(f"mask, {quantity(judged['limit'], judged['unit'], _DIGITS)} there")
    return ", ".join(sides) or "mask"


def _where(row: Requirement) -> str:
    if row.at_rad_s is not None:
        return f" at {number(row.at_rad_s, _DIGITS)} rad/s"
    if row.over_rad_s is not None:
        return f" from {number(row.over_rad_s[0], _DIGITS)} to {number(row.over_rad_s[1], _DIGITS)} rad/s"
    return ""


def _aligned(rows: Sequence[Sequence[str]]) -> str:
    widths = [max(len(row[column]) for row in rows) for column in range(len(rows[0]))]
    return "\n".join(
        "  ".join(
            text.rjust(width) if column in _TO_THE_RIGHT else text.ljust(width)
            for column, (text, width) in enumerate(zip(row, widths, strict=True))
        ).rstrip()
        for row in rows
    )
