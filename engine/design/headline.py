"""The one sentence on top of the ledger."""

from __future__ import annotations

from engine.design.document import Design
from engine.design.measures import MEASURES
from engine.design.requirements import Judged
from engine.design.wording import counted
from engine.loop.frequency import FrequencyView


def headline(design: Design, judged: list[Judged], frequency: FrequencyView) -> str:
    """What the sheet says now: how many rows are met, and what is worst about the rest."""
    unstable = [case.name for case, read in zip(design.plant_cases, frequency.cases, strict=True) if not read.stable]
    if unstable:
        where = _named(unstable, len(design.plant_cases))
        return f"Unstable on {where}: no requirement counts until every loop is stable."
    if not judged:
        return "No requirement yet: add the first one."
    met = sum(row.met is True for row in judged)
    total = len(judged)
    if any(row.met is None for row in judged):
        why = next(row.reading.why for row in judged if row.met is None)
        return f"Not assessable: {why}."
    if met == total:
        return "The one requirement is met." if total == 1 else f"All {counted(total, 'requirement')} met."
    worst = min(
        (index for index in range(total) if judged[index].met is False),
        key=lambda index: (judged[index].slack is not None, judged[index].slack or 0.0),
    )
    return f"{met} of {total} met: {_complaint(design, worst, judged[worst])}."


def _complaint(design: Design, index: int, row: Judged) -> str:
    label = MEASURES[design.requirements[index].measure].label
    where = "" if row.case is None else f" on {design.plant_cases[row.case].name}"
    if row.slack is None:
        return f"{label}{where}: {row.shortfall}"
    return f"{label} is {row.shortfall}{where}"


def _named(names: list[str], total: int) -> str:
    if len(names) == total:
        return "every plant case" if total > 1 else names[0]
    return names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"
