"""How large a design may be. The server turns settings into these; the defaults serve everyone else."""

from __future__ import annotations

from dataclasses import dataclass

from engine.errors import Fault


@dataclass(frozen=True, slots=True)
class Limits:
    """Upper bounds on the parts of a design; each is a setting `LOOPWRIGHT_MAX_…` of the server."""

    plant_cases: int = 32
    stages: int = 24
    requirements: int = 64
    order: int = 60
    """Zeros or poles of one model, rows of a state matrix, coefficients less one of a polynomial."""
    expression_characters: int = 4000
    text_characters: int = 20_000
    """Each of title, notes, names and reasons."""
    mask_points: int = 64
    faults_listed: int = 20
    """More mistakes than these are counted, not listed."""


def too_many(where: str, count: int, most: int) -> Fault:
    """The fault for a list that is longer than allowed."""
    return Fault(where, f"has {count} entries, at most {most} are taken")
