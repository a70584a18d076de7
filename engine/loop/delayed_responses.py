"""Responses of loops with dead time: the method of steps first, the sum over the dominant roots after it."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from engine.loop.delayed_steps import DelayedSteps, powers_of
from engine.loop.modal import ModalSums
from engine.loop.modal_responses import ModalResponses, late_net
from engine.loop.response_search import Follower, Glance, IntArray, Net, interval_bounds
from engine.model.factored import FloatArray

# Instants of the net in each dead time of the method of steps.
PER_STEP = 25
# Where they stand, in dead times since the last kink: geometric at first, then even; the last stands for the instant
# just before the next kink.
SHARES = np.concatenate([[0.0], np.geomspace(1e-4, 0.04, 7), np.linspace(0.04, 1.0, PER_STEP - 7)[1:]])


class DelayedResponses:
    """Stable step responses with dead time."""

    def __init__(self, steps: DelayedSteps, sums: ModalSums) -> None:
        self.steps, self.sums = steps, sums
        self._until_s = steps.edges_s[:, -1]
        degree = np.arange(steps.coefficients.shape[-1], dtype=np.float64)
        size = np.abs(steps.coefficients)
        # Over one dead time τ/θ stays below 1, so Σ|coefficient| bounds a group's polynomial, and so on for slopes.
        self._size = size.sum(axis=-1)
        rate = np.abs(steps.rates)[:, None, None, :]
        theta = steps.dead_time_s[:, None, None, None]
        first, second = (size * degree).sum(axis=-1), (size * degree * (degree - 1.0)).sum(axis=-1)
        self._bend = self._size * rate**2 + 2.0 * first * rate / theta + second / theta**2
        self._fourth = (size * (rate[..., None] + degree / theta[..., None]) ** 4).sum(axis=-1)
        with np.errstate(all="ignore"):
            self._pace = np.where(self._size > 0.0, np.sqrt(self._bend / self._size), 0.0)
        self.net = self._first_net()
        self._late = ModalResponses(sums, self.net.scale)

    def _first_net(self) -> Net:
        """The steps at even instants, each with the values just before and after its kinks, then the roots' net."""
        cases, delays = len(self._until_s), self.steps.coefficients.shape[1]
        late = late_net(self.sums, self._until_s)
        times = np.empty((cases, delays * PER_STEP))
        deviation, cubic, bend, turns = (np.empty((cases, 3, delays * PER_STEP)) for _ in range(4))
        scale = late.scale.copy()
        since = SHARES * self.steps.dead_time_s[:, None]
        for step in range(delays):
            times[:, step * PER_STEP : (step + 1) * PER_STEP] = self.steps.edges_s[:, step, None] + since
        times[:, PER_STEP - 1 :: PER_STEP] = np.nextafter(self.steps.edges_s[:, 1:], 0.0)
        value, slope = self.steps.at_shares(SHARES), self.steps.slopes().at_shares(SHARES)
        scale = np.maximum(scale, np.abs(value).max(axis=2))
        length = np.diff(times, axis=1, append=self._until_s[:, None])
        decay = np.exp(np.minimum(self.steps.rates.real[:, :, None] * since[:, None, :], 50.0))
        for step in range(delays):
            at = slice(step * PER_STEP, (step + 1) * PER_STEP)
            bounds = self._bounds(np.s_[:, step], decay, length[:, at], scale)
            deviation[:, :, at], cubic[:, :, at], bend[:, :, at], turns[:, :, at] = bounds
        # Between the instants just before and just after a kink nothing is to be found.
        for array in (deviation, cubic, bend, turns):
            array[:, :, PER_STEP - 1 :: PER_STEP] = 0.0
        early = np.concatenate([times, self._until_s[:, None]], axis=1)
        highs, lows = interval_bounds(
            early,
            np.concatenate([value, late.value[:, :, :1]], axis=2),
            np.concatenate([slope, slope[:, :, -1:]], axis=2),
            deviation,
            cubic,
        )
        return Net(
            np.concatenate([times, late.time_s], axis=1),
            np.concatenate([value, late.value], axis=2),
            np.concatenate([highs, late.high], axis=2),
            np.concatenate([lows, late.low], axis=2),
            np.concatenate([bend, late.bend], axis=2),
            np.concatenate([turns, late.turns], axis=2),
            scale,
        )

    def _bounds(
        self, step: tuple[slice | int, ...], decay: FloatArray, length: FloatArray, scale: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        """(c, 3, k) bounds as in `Net` over intervals of `length` (c, k), where groups have decayed by (c, g, k)."""
        size, bend, pace = self._size[step], self._bend[step], self._pace[step]
        amplitude = size[:, :, :, None] * decay[:, None]
        turn = bend[:, :, :, None] * decay[:, None] * length[:, None, None, :] ** 2
        deviation = np.minimum(2.0 * amplitude, 0.125 * turn).sum(axis=2)
        cubic = ((self._fourth[step] / 384.0)[..., None] * decay[:, None]).sum(axis=2) * length[:, None, :] ** 4
        alive = amplitude > 1e-13 * scale[:, :, None, None]
        fastest = np.where(alive, pace[:, :, :, None] * length[:, None, None, :], 0.0).max(axis=2, initial=0.0)
        return deviation, cubic, np.where(alive, turn, 0.0).sum(axis=2), fastest

    def glance(self, case: IntArray, row: IntArray, at_s: FloatArray, length_s: FloatArray) -> Glance:
        """See `Responses`."""
        early = at_s < self._until_s[case]
        if not early.any():
            return self._late.glance(case, row, at_s, length_s)
        seen = [np.empty(len(at_s)) for _ in range(4)]
        for chosen, look in ((early, self._early_glance), (~early, self._late.glance)):
            if chosen.any():
                part = look(case[chosen], row[chosen], at_s[chosen], length_s[chosen])
                for array, values in zip(seen, (part.value, part.deviation, part.bend, part.turns), strict=True):
                    array[chosen] = values
        return Glance(*seen)

    def _early_glance(self, case: IntArray, row: IntArray, at_s: FloatArray, length_s: FloatArray) -> Glance:
        step, since = self._place(case, at_s)
        steps = self.steps
        powers = powers_of(since / steps.dead_time_s[case], steps.coefficients.shape[-1])
        polynomials = (steps.coefficients[case, step, row] @ powers[:, :, None])[..., 0]
        value = (polynomials * np.exp(steps.rates[case] * since[:, None])).real.sum(axis=1)
        decay = np.exp(np.minimum(self.steps.rates[case].real * since[:, None], 50.0))
        size, turn = self._size[case, step, row] * decay, self._bend[case, step, row] * decay * length_s[:, None] ** 2
        alive = size > 1e-13 * self.net.scale[case, row][:, None]
        pace = np.where(alive, self._pace[case, step, row], 0.0).max(axis=1, initial=0.0)
        return Glance(
            value,
            np.minimum(2.0 * size, 0.125 * turn).sum(axis=1),
            np.where(alive, turn, 0.0).sum(axis=1),
            pace * length_s,
        )

    def follow(self, case: IntArray, row: IntArray, inside_s: FloatArray) -> Follower:
        """See `Responses`."""
        early = inside_s < self._until_s[case]
        if not early.any():
            return self._late.follow(case, row, inside_s)
        step, _ = self._place(case[early], inside_s[early])
        early_part = self._follow_step(case[early], row[early], step)
        late_part = self._late.follow(case[~early], row[~early], inside_s[~early])

        def at(at_s: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
            found = np.empty((3, len(at_s)))
            found[:, early] = early_part(at_s[early])
            found[:, ~early] = late_part(at_s[~early])
            return found[0], found[1], found[2]

        return at

    def _place(self, case: IntArray, at_s: FloatArray) -> tuple[NDArray[np.int64], FloatArray]:
        """Which dead time an instant lies in, and how long since its beginning."""
        edges = self.steps.edges_s[case]
        step = (at_s[:, None] >= edges[:, 1:-1]).sum(axis=1)
        return step, at_s - edges[np.arange(len(case)), step]

    def _follow_step(self, case: IntArray, row: IntArray, step: NDArray[np.int64]) -> Follower:
        """Value and derivatives within one dead time each."""
        steps = self.steps
        rates, theta, begin = steps.rates[case], steps.dead_time_s[case], steps.edges_s[case, step]
        orders = [steps.coefficients[case, step, row]]
        degree = np.arange(orders[0].shape[-1])
        for _ in range(2):
            lowered = np.zeros_like(orders[-1])
            lowered[..., :-1] = orders[-1][..., 1:] * degree[1:]
            orders.append(rates[:, :, None] * orders[-1] + lowered / theta[:, None, None])
        stacked = np.stack(orders)

        def at(at_s: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
            since = at_s - begin
            powers = powers_of(since / theta, len(degree))
            polynomials = (stacked @ powers[:, :, None])[..., 0]
            found = (polynomials * np.exp(rates * since[:, None])).real.sum(axis=-1)
            return found[0], found[1], found[2]

        return at
