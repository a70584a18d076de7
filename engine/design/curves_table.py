"""The curves as one tidy table (RFC 4180): a row a point, so that any script can pick what it needs."""

from __future__ import annotations

import csv
import io
import math

from engine.design.assess import assess_with_arrays
from engine.design.document import Design

COLUMNS = ("case", "curve", "unit", "axis", "axis_unit", "at", "value")


def curves_csv(design: Design) -> str:
    """All curves of a design: loop magnitude and phase over frequency, responses over time.

    Points at which a curve is not shown (an unstable response past its sensible range) are left out.
    """
    _, arrays = assess_with_arrays(design)
    signals = design.signals
    kinds = (
        ("loop gain", "magnitude_db", "dB", "frequency", "rad/s", "omega_rad_s"),
        ("loop phase", "phase_deg", "deg", "frequency", "rad/s", "omega_rad_s"),
        ("command response", "command", signals.output.unit, "time", "s", "time_s"),
        ("load response", "load", signals.output.unit, "time", "s", "time_s"),
        ("effort", "effort", signals.effort.unit, "time", "s", "time_s"),
    )
    text = io.StringIO()
    table = csv.writer(text, lineterminator="\r\n")
    table.writerow(COLUMNS)
    for index, case in enumerate(design.plant_cases):
        for curve, name, unit, axis, axis_unit, along in kinds:
            pairs = zip(arrays[along].tolist(), arrays[name][index].tolist(), strict=True)
            table.writerows(
                (_safe(case.name), curve, _safe(unit), axis, axis_unit, repr(at), repr(value))
                for at, value in pairs
                if math.isfinite(value)
            )
    return text.getvalue()


def _safe(text: str) -> str:
    """Text that a spreadsheet will not take for a formula.

    Source: OWASP, CSV Injection: cells beginning with = + - @ are prefixed with an apostrophe.
    """
    return f"'{text}" if text[:1] in ("=", "+", "-", "@", "\t", "\r") else text
