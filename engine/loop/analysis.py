"""Everything that is computed once per loop set: grid, crossings, closed-loop roots and peaks."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

from engine.loop.closed_loop_roots import ClosedLoopRoots, closed_loop_roots
from engine.loop.crossing_polish import crossing_tasks
from engine.loop.crossings import Found, Isolated, isolate_crossings, settled_crossings
from engine.loop.grid import Sampled, sampled
from engine.loop.loop_set import LoopSet
from engine.loop.peaks import Peaks, peak_tasks, settled_peaks
from engine.loop.polish import joined_tasks, polished
from engine.model.factored import FloatArray


@dataclass(frozen=True, eq=False)
class Analysis:
    """What every reading of a loop set is taken from."""

    samples: Sampled
    isolated: Isolated
    found: Found
    roots: ClosedLoopRoots
    peaks: Peaks


@lru_cache(maxsize=4)
def analysis_of(loops: LoopSet) -> Analysis:
    """The analysis; a loop set is told by identity, so one assessment computes it once."""
    samples = sampled(loops)
    isolated = isolate_crossings(samples)
    roots = closed_loop_roots(loops)
    crossings = crossing_tasks(isolated.brackets)
    extremes, limits = peak_tasks(samples, isolated.brackets, roots)
    # Crossings and peaks in one batch: a step of Newton's method costs the same for ten points and for fifty.
    omega, level = polished(samples, joined_tasks(crossings, extremes))
    first, rest = _split(omega, len(crossings.case))
    _, values = _split(level, len(crossings.case))
    return Analysis(
        samples,
        isolated,
        settled_crossings(samples, isolated.brackets, first),
        roots,
        settled_peaks(extremes, limits, rest, values),
    )


def _split(values: FloatArray, at: int) -> tuple[FloatArray, FloatArray]:
    return values[:at], values[at:]
