"""Cases whose responses are computed the same way: those without dead time, and those with it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.loop.closed_loop_roots import ClosedLoopRoots
from engine.loop.delay_roots import DELAYS, DominantRoots
from engine.loop.delayed_responses import DelayedResponses
from engine.loop.delayed_steps import DelayedSteps, delayed_steps
from engine.loop.lasting_steps import with_lasting_steps
from engine.loop.loop_set import LoopSet
from engine.loop.modal import ModalSums, Transfers, modal_sums, transfers_of
from engine.loop.modal_responses import ModalResponses, modal_net
from engine.loop.mode_groups import with_rings
from engine.loop.reading import Reading
from engine.loop.response_search import Net, Responses
from engine.loop.step_measures import step_readings
from engine.loop.time_grid import TimeGrid
from engine.model.factored import FloatArray

# Σ|weight| over the size of the response beyond which the residues are taken to cancel.
CANCELLING = 1e5
# Kinks of one case that get instants of their own on the time axis.
MOST_KINKS = 24
STEP = np.array([1, 1, 1])
RAMP = np.array([2, 1, 2])


@dataclass(eq=False)
class Family:
    """Responses of some of the cases, all with or all without dead time."""

    cases: NDArray[np.int64]
    """Their places among all cases."""
    transfers: Transfers
    amplitudes: FloatArray
    steps: ModalSums
    """Responses to steps, from which readings come."""
    shown: ModalSums
    """Responses to what is shown."""
    integrations: NDArray[np.int64]
    """(3,) 1 for a step, 2 for a ramp: what is shown."""
    loops: LoopSet
    """The loops of these cases alone."""
    first: DelayedSteps | None
    """Steps over the first dead times; None without dead time."""
    first_shown: DelayedSteps | None
    listed: NDArray[np.bool_]
    """(c,) whether the roots are listed; those of a loop with endlessly many unstable ones are not."""
    verified: NDArray[np.bool_]
    """(c,) whether the residues of what is shown are known not to cancel."""

    def __post_init__(self) -> None:
        self.early = self._lasting(self.first, self.steps, STEP)
        same = self.first_shown is self.first
        self.early_shown = self.early if same else self._lasting(self.first_shown, self.shown, self.integrations)

    def _lasting(
        self, first: DelayedSteps | None, sums: ModalSums, integrations: NDArray[np.int64]
    ) -> DelayedSteps | None:
        """The dead times during which steps are needed."""
        if first is None:
            return None
        return with_lasting_steps(first, sums, self.loops, self.amplitudes, integrations)

    def read(self, rows: NDArray[np.int64]) -> tuple[list[dict[str, Reading]], FloatArray]:
        """Readings, and the sizes (k, 3) of the responses, of the stable ones among the cases."""
        net, responses = self._stable_responses(rows)
        self.verified[rows] = self.shown is self.steps
        readings = step_readings(net, self.steps.offset[rows], responses, self.transfers.excess[rows] > 0)
        return readings, net.scale

    def _stable_responses(self, rows: NDArray[np.int64]) -> tuple[Net, Responses]:
        """The net and the responses of stable cases, once no residues cancel."""
        crowded = np.zeros(len(self.cases), dtype=np.bool_)
        crowded[rows] = ~np.isfinite(self.steps.weights[rows]).all(axis=(1, 2))
        if not crowded.any():
            net, responses = self._responses(rows)
            size = self.steps.of(rows).size(self._from_s(rows))
            crowded[rows] = np.any(size > CANCELLING * self._sure_scale(rows, net), axis=1)
            if not crowded.any():
                return net, responses
        self._spread(np.flatnonzero(crowded))
        return self._responses(rows)

    def _spread(self, crowded: NDArray[np.int64]) -> None:
        """Put rings in the place of crowds of roots."""
        same = self.shown is self.steps
        self.steps = with_rings(
            self.steps, self.transfers, crowded, self.amplitudes, STEP, self._from_s(np.arange(len(self.cases)))
        )
        if same:
            self.shown = self.steps
        self.__post_init__()

    def _responses(self, rows: NDArray[np.int64]) -> tuple[Net, Responses]:
        sums = self.steps.of(rows)
        if self.early is None:
            net = modal_net(sums)
            return net, ModalResponses(sums, net.scale)
        delayed = DelayedResponses(self.early.of(rows), sums)
        return delayed.net, delayed

    def _sure_scale(self, rows: NDArray[np.int64], net: Net) -> FloatArray:
        """(k, 3) sizes of the responses that cancelling residues have not inflated.

        Without dead time the residues come from one set of roots and cancel as they should. With dead time they do not
        where roots crowd; the first dead times and the final value are right in any case.
        """
        if self.early is None:
            return net.scale
        until = self.early.edges_s[rows, -1]
        early = np.where(net.time_s < until[:, None], 1.0, 0.0)
        exact = np.max(np.abs(net.value) * early[:, None, :], axis=2)
        sure: FloatArray = np.maximum(np.maximum(exact, np.abs(self.steps.offset[rows])), 1e-3 * net.scale)
        return sure

    def _from_s(self, rows: NDArray[np.int64]) -> FloatArray:
        """(k,) when the sums begin to hold."""
        return np.zeros(len(rows)) if self.early is None else self.early.edges_s[rows, -1]

    def kinks_s(self) -> FloatArray:
        """Instants at which responses may jump."""
        return np.empty(0) if self.early is None else self.early.edges_s[:, 1 : MOST_KINKS + 1].ravel()

    def sample(self, grid: TimeGrid, closely: bool) -> FloatArray:
        """(c, 3, n) what is shown; values may overflow where a response grows.

        `closely`: to full accuracy of what lies within the horizon, even if that is far from the response's peak.
        """
        with np.errstate(all="ignore"):
            curves = self._sampled(grid)
            if self.verified.all() and not closely:
                return curves
            from_s = self._from_s(np.arange(len(self.cases)))
            reach = np.nanmax(np.abs(curves), axis=2, initial=0.0)
            cancelling = ~np.all(self.shown.size(from_s) <= CANCELLING * reach, axis=1)
            crowded = np.flatnonzero(cancelling & self.listed & (closely | ~self.verified))
            if len(crowded):
                horizon = float(grid.time_s[-1])
                self.shown = with_rings(
                    self.shown, self.transfers, crowded, self.amplitudes, self.integrations, from_s, horizon
                )
                self.__post_init__()
                curves = self._sampled(grid)
        return curves

    def _sampled(self, grid: TimeGrid) -> FloatArray:
        curves = self.shown.sample(grid.basis(self.shown.exponents), grid.joined_s)[:, :, grid.order]
        if not self.listed.all():
            curves[~self.listed] = np.nan
        return curves if self.early_shown is None else self.early_shown.over(curves, grid.time_s)


def families_of(
    loops: LoopSet, roots: ClosedLoopRoots, amplitudes: FloatArray, integrations: NDArray[np.int64]
) -> list[Family]:
    """The cases without dead time as one family, those with it as another."""
    delayed = np.array([loop.dead_time_s > 0.0 for loop in loops.loops])
    chosen = [np.flatnonzero(~delayed), np.flatnonzero(delayed)]
    return [_family(loops, roots, cases, amplitudes, integrations) for cases in chosen if len(cases)]


def _family(
    loops: LoopSet,
    roots: ClosedLoopRoots,
    cases: NDArray[np.int64],
    amplitudes: FloatArray,
    integrations: NDArray[np.int64],
) -> Family:
    plants = tuple(loops.plants[case] for case in cases.tolist())
    own = loops if len(cases) == loops.count else LoopSet(plants, loops.compensator)
    mine = ClosedLoopRoots(roots.roots[cases], roots.count[cases], roots.complete[cases])
    transfers = transfers_of(own, mine)
    ramp = bool((integrations == 2).any())
    steps = modal_sums(transfers, amplitudes, STEP)
    shown = modal_sums(transfers, amplitudes, integrations) if ramp else steps
    listed = np.ones(len(cases), dtype=np.bool_)
    first, first_shown = None, None
    if transfers.dead_time_s is not None:
        first = delayed_steps(own, transfers, amplitudes, STEP, DELAYS)
        first_shown = delayed_steps(own, transfers, amplitudes, integrations, DELAYS) if ramp else first
        listed = np.array([_is_listed(roots.dominant[case]) for case in cases.tolist()])
    unverified = np.zeros(len(cases), dtype=np.bool_)
    return Family(cases, transfers, amplitudes, steps, shown, integrations, own, first, first_shown, listed, unverified)


def _is_listed(found: DominantRoots | None) -> bool:
    """Whether the roots say how the response goes on: not where growing ones are left out."""
    return found is not None and (found.faint or not bool((found.roots.real >= 0.0).any()))
