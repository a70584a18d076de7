"""The dominant closed-loop roots of loops with dead time: roots of D(s) + N(s)·e^{−sθ}.

There are endlessly many. Those that matter once `DELAYS` dead times have passed lie in a rectangle: right of
Re s = −REACH/θ, and up to where the loop gain has fallen so far that what is above adds nothing. Start values come from
the loop with a Padé approximation in place of the dead time (for low frequencies), from the chain of roots that
e^{sθ} = −L₀(s) has at high ones, and from lightly damped open-loop poles and zeros. All are polished on the exact
function, and the argument principle counts that none is missing. Lightly damped modes above the rectangle, where the
loop gain is low, keep one root each beside their open-loop pole; it is added.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from engine.loop.chain_tail import chain_plan
from engine.loop.characteristic import BoolArray, Characteristic
from engine.loop.packed import time_scales
from engine.loop.simultaneous import EPSILON
from engine.loop.winding import roots_in_rectangle
from engine.model.factored import ComplexArray, Factored, FloatArray

DELAYS = 5
"""Dead times after which the sum over the roots takes over from the method of steps."""
REACH = 6.0
"""A root left of −REACH/θ has decayed by e^{−DELAYS·REACH} then."""
FAINT = 3e-11
"""Size, relative to the whole, at which a chain root no longer counts after DELAYS dead times."""
MOST_CHAIN_ROOTS = 240
ENOUGH_UNSTABLE = 60
COMPANY = 72
"""Start values that keep each other from one root; links of the chain farther up are too good to stray."""
PADE_ORDER = 8
PADE_TRUSTED = 11.0
"""Largest |Im s|·θ at which the Padé loop's roots serve as start values."""
MOST_ITERATIONS = 25
RETRIES = 3


@dataclass(frozen=True, eq=False)
class DominantRoots:
    """Dominant roots of one loop."""

    roots: ComplexArray
    """(n,) [rad/s], upper half plane and real axis, by size."""
    top_rad_s: float
    """They are all there up to this imaginary part; above it stand those of lightly damped modes alone."""
    left_rad_s: float
    """And right of this real part."""
    counted: bool
    """Whether the argument principle confirms that none is missing."""
    faint: bool
    """Whether what lies above `top_rad_s` is too faint to count, or summed by `chain_tail`."""


@dataclass(frozen=True, eq=False)
class _Region:
    """Rectangles in scaled time, (c,) each."""

    left: FloatArray
    right: FloatArray
    top: FloatArray
    faint: BoolArray
    fixed: BoolArray
    """Whether the top stands midway between two links of the chain already."""


def dominant_roots(loops: Sequence[Factored]) -> list[DominantRoots]:
    """Dominant roots of loops with dead time and |L(∞)| < 1 (others have endlessly many unstable roots)."""
    scale = time_scales(loops)
    p = Characteristic.of(loops, scale)
    if p.dead_time is None:
        raise ValueError("dominant roots are for loops with dead time")
    region = _region(p, loops, scale)
    starts = _starts(loops, p, scale, region)
    found = _polished(p, starts, region)
    return _checked(p, found, region, scale)


def _loop_gain(p: Characteristic, s: ComplexArray) -> FloatArray:
    """(c, n) |N/D| without the dead time."""
    n = np.multiply.reduce(np.abs(p.zeros.factors(s)), axis=0)
    d = np.multiply.reduce(np.abs(p.poles.factors(s)), axis=0)
    with np.errstate(all="ignore"):
        ratio = n / d
    gained: FloatArray = ratio * np.abs(p.gain)[:, None]
    return gained


def _region(p: Characteristic, loops: Sequence[Factored], scale: FloatArray) -> _Region:
    """Where the roots that count are."""
    theta = np.ones(len(loops)) if p.dead_time is None else p.dead_time
    turns = np.geomspace(1.0, 2.0 * math.pi * MOST_CHAIN_ROOTS, 72)
    omega = turns / theta[:, None]
    corners = np.abs(np.concatenate([p.poles.roots.imag, p.zeros.roots.imag])[:, :, 0]).T
    at = np.sort(np.concatenate([omega, np.clip(corners, omega[:, :1], omega[:, -1:])], axis=1), axis=1)
    gain = _loop_gain(p, 1j * at)
    share = np.minimum(gain, 1e3) ** DELAYS / (at * theta[:, None])
    loud = share > FAINT
    last = at.shape[1] - 1 - loud[:, ::-1].argmax(axis=1)
    last = np.where(loud.any(axis=1), np.minimum(last + 1, at.shape[1] - 1), 0)
    faint = ~loud[:, -1]
    # A gain above 1 this far up makes an unstable root of every link: no need to list hundreds of them.
    hopeless = np.any((at * theta[:, None] > 2.0 * math.pi * ENOUGH_UNSTABLE) & (gain > 1.0), axis=1)
    enough = np.argmax(at * theta[:, None] > 2.0 * math.pi * ENOUGH_UNSTABLE, axis=1)
    last, faint = np.where(hopeless, enough, last), faint & ~hopeless
    top = np.maximum(at[np.arange(len(loops)), last], 3.0 * math.pi / theta)
    fixed = np.zeros(len(loops), dtype=np.bool_)
    for case, (loop, unit) in enumerate(zip(loops, scale, strict=True)):
        plan = chain_plan(loop)
        if plan is not None:
            top[case], faint[case], fixed[case] = plan.top_rad_s / unit, True, True
    return _Region(-REACH / theta, _right_edge(p, theta, top), top, faint, fixed)


def _right_edge(p: Characteristic, theta: FloatArray, top: FloatArray) -> FloatArray:
    """A real part right of all roots: there |L₀|·e^{−xθ} stays below 1."""
    farthest = np.where(p.poles.mask[:, :, 0] > 0.0, p.poles.roots[:, :, 0].real, -np.inf)
    beyond = np.maximum(farthest.max(axis=0, initial=-np.inf), 0.0)
    heights = np.concatenate([[0.0], np.geomspace(1e-4, 4.0, 60)]) * top[:, None]
    # |L₀| is largest at the height of a lightly damped pole, which falls between these.
    heights = np.concatenate([heights, np.abs(p.poles.roots[:, :, 0].imag.T)], axis=1)
    right: FloatArray = beyond + 0.5 / theta
    for _ in range(40):
        with np.errstate(over="ignore"):
            level = _loop_gain(p, right[:, None] + 1j * heights).max(axis=1) * np.exp(-right * theta)
        high = level > 0.7
        if not high.any():
            break
        right = np.where(high, beyond + 1.6 * (right - beyond), right)
    return right


def _starts(loops: Sequence[Factored], p: Characteristic, scale: FloatArray, region: _Region) -> list[ComplexArray]:
    """Start values of each case in the closed upper half plane, scaled time."""
    rational = _pade_roots(loops, scale)
    chain = _chain(p, region)
    lists = []
    theta = np.ones(len(loops)) if p.dead_time is None else p.dead_time
    for case, turn in enumerate(theta):
        near = rational[case]
        near = near[near.imag >= -1e-6 * np.abs(near)]
        near = near[(near.imag * turn <= PADE_TRUSTED) & (near.real * turn >= -REACH - 2.0)]
        own = np.concatenate([table.roots[table.mask[:, case, 0] > 0.0, case, 0] for table in (p.poles, p.zeros)])
        light = own[(own.imag * turn > PADE_TRUSTED) & (own.real * turn > -REACH) & (own.imag <= region.top[case])]
        links = chain[case][np.isfinite(chain[case])]
        links = links[links.imag * turn > PADE_TRUSTED - 2.0]
        lists.append(np.concatenate([near, light, links]))
    return lists


def _pade_roots(loops: Sequence[Factored], scale: FloatArray) -> list[ComplexArray]:
    """Roots of the loops with a Padé approximation for the dead time: start values, nothing else."""
    approximate = []
    for loop in loops:
        poles = PADE_POLES / loop.dead_time_s
        model = Factored(loop.gain, np.concatenate([loop.zeros, -poles]), np.concatenate([loop.poles, poles]))
        approximate.append(model)
    starts, live = Characteristic.of(approximate, scale).starts()
    return [row[own] for row, own in zip(starts, live, strict=True)]


def _pade_poles() -> ComplexArray:
    """Poles of the diagonal Padé approximation of e^{−s}: Σ (2q−k)!/(k!(q−k)!)·s^k = 0 (Padé 1892)."""
    q = PADE_ORDER
    coefficients = [math.factorial(2 * q - k) / (math.factorial(k) * math.factorial(q - k)) for k in range(q + 1)]
    roots = np.roots(coefficients[::-1])
    upper = roots[roots.imag > 0.0]
    return np.stack([upper, upper.conj()], axis=1).ravel()


PADE_POLES = _pade_poles()


def _chain(p: Characteristic, region: _Region) -> ComplexArray:
    """(c, k) the roots of e^{sθ} = −L₀(s) from s = 2πik/θ, by fixed-point steps; nan beyond the region."""
    theta = np.ones(len(p.gain)) if p.dead_time is None else p.dead_time
    count = int(np.ceil((region.top * theta).max() / (2.0 * math.pi))) + 2
    s = np.asarray(2j * math.pi * np.arange(1, count + 1) / theta[:, None], dtype=np.complex128)
    beyond = s.imag > region.top[:, None] + 4.0 * math.pi / theta[:, None]
    with np.errstate(all="ignore"):
        for _ in range(3):
            d = np.multiply.reduce(p.poles.factors(s), axis=0)
            n = np.multiply.reduce(p.zeros.factors(s), axis=0) * p.gain[:, None]
            s = s + np.log(-n / d * np.exp(-s * theta[:, None])) / theta[:, None]
    return np.where(beyond, np.nan, s)


def _polished(p: Characteristic, starts: Sequence[ComplexArray], region: _Region) -> list[ComplexArray]:
    """Roots in the region that the start values lead to; company keeps two from reaching one root."""
    longest = max(len(each) for each in starts)
    s = np.full((len(starts), longest), 1.0 + 0.0j)
    live = np.zeros(s.shape, dtype=np.bool_)
    for case, each in enumerate(starts):
        s[case, : len(each)], live[case, : len(each)] = each, True
    s, settled = _iterate(p, s, live, region)
    theta = np.ones(len(s)) if p.dead_time is None else p.dead_time
    # One link of the chain more, so that the upper edge can be laid between two.
    inside = settled & (s.real > region.left[:, None]) & (s.imag < (region.top + 2.2 * math.pi / theta)[:, None])
    return [_upper_half(row[own]) for row, own in zip(s, inside, strict=True)]


def _iterate(p: Characteristic, s: ComplexArray, live: BoolArray, region: _Region) -> tuple[ComplexArray, BoolArray]:
    """Ehrlich–Aberth steps with the conjugates as company; what leaves the region is let go."""
    factors = p.poles.mask.shape[0] + p.zeros.mask.shape[0] + 4
    theta = np.ones(len(s)) if p.dead_time is None else p.dead_time
    margin = 2.0 * math.pi / theta[:, None]
    crew = min(s.shape[1], COMPANY)
    own = np.eye(crew, s.shape[1])[:, None, :]
    present = live.T[:crew, :, None]
    mutual = present * (1.0 - own)
    waiting, settled = live.copy(), np.zeros(s.shape, dtype=np.bool_)
    # Start values on the real axis could never leave it.
    s = s + 1e-9 * np.abs(s) * np.exp(1j * (0.4 + 1.7 * np.arange(s.shape[1])))
    with np.errstate(all="ignore"):
        for _ in range(MOST_ITERATIONS):
            value, slope, size = p.newton(s)
            gaps = s.T[:crew, :, None] - s
            mirrored = s.conj().T[:crew, :, None] - s
            apart = np.abs(mirrored) > 1e-6 * np.abs(s)
            repulsion = np.add.reduce(mutual / (gaps + own), axis=0)
            repulsion += np.add.reduce(np.where(apart, present / mirrored, 0.0), axis=0)
            move = value / (slope + value * repulsion)
            move = np.where(np.abs(move) > margin, move * (margin / np.abs(move)), move)
            noise = 2.0 * EPSILON * (factors + np.abs(s) * theta[:, None]) * size / np.abs(slope)
            s = np.where(waiting, s - move, s)
            reached = np.abs(move) <= np.maximum(4.0 * EPSILON * np.abs(s), 0.1 * noise)
            # Far to the right, where e^{−sθ} has died, the slope dies as well and a small step proves nothing.
            settled |= waiting & reached & (noise <= 1e-3 * np.abs(s))
            strayed = (s.real < region.left[:, None] - 2.0 * margin) | (s.imag > region.top[:, None] + 4.0 * margin)
            waiting &= ~(reached | strayed | ~np.isfinite(s))
            if not waiting.any():
                break
    return s, settled


def _upper_half(roots: ComplexArray) -> ComplexArray:
    """Reflected into the closed upper half plane, real where they are within rounding, by size."""
    upper = np.where(roots.imag < 0.0, roots.conj(), roots)
    upper = np.where(np.abs(upper.imag) <= 1e-12 * np.abs(upper), upper.real + 0.0j, upper)
    ordered: ComplexArray = upper[np.lexsort((upper.real, np.abs(upper)))]
    return ordered


def _with_new(own: ComplexArray, more: ComplexArray) -> ComplexArray:
    """The roots known, and of the others those that are not among them."""
    kept = own.tolist()
    for root in more.tolist():
        if all(abs(root - other) > 1e-7 * abs(root) for other in kept):
            kept.append(root)
    return _upper_half(np.array(kept, dtype=np.complex128))


def _checked(p: Characteristic, found: list[ComplexArray], region: _Region, scale: FloatArray) -> list[DominantRoots]:
    """Count the roots, and look again with more start values where some are missing."""
    region = _between_roots(p, found, region)
    for attempt in range(RETRIES + 1):
        inside = [_inside(roots, region, case) for case, roots in enumerate(found)]
        listed = np.array([np.count_nonzero(each.imag > 0.0) + len(each) for each in inside])
        counted = roots_in_rectangle(p, region.left, region.right, region.top)
        missing = counted != listed
        if not missing.any() or attempt == RETRIES:
            break
        extra = _more_starts(p, region, found, missing, attempt)
        again = _polished(p, extra, region)
        found = [_with_new(own, more) if lacks else own for own, more, lacks in zip(found, again, missing, strict=True)]
    above = _above(p, region)
    return [
        DominantRoots(
            np.concatenate([each, above[case]]) * scale[case],
            float(region.top[case] * scale[case]),
            float(region.left[case] * scale[case]),
            not missing[case],
            bool(region.faint[case]),
        )
        for case, each in enumerate(inside)
    ]


def _above(p: Characteristic, region: _Region) -> list[ComplexArray]:
    """The roots beside lightly damped open-loop poles above the rectangle."""
    theta = np.ones(len(p.gain)) if p.dead_time is None else p.dead_time
    poles = p.poles.roots[:, :, 0].T
    light = (p.poles.mask[:, :, 0].T > 0.0) & (poles.imag > region.top[:, None]) & (poles.real > region.left[:, None])
    if not light.any():
        return [poles[0, :0]] * len(poles)
    s = np.where(light, poles, 1.0)
    with np.errstate(all="ignore"):
        for _ in range(12):
            value, slope, _ = p.newton(s)
            s = s - value / slope
    reach = np.maximum(np.abs(poles.real), 1.0 / theta[:, None])
    kept = light & (np.abs(s - poles) < 0.5 * reach)
    return [_upper_half(row[own]) for row, own in zip(s, kept, strict=True)]


def _inside(roots: ComplexArray, region: _Region, case: int) -> ComplexArray:
    right = (roots.real > region.left[case]) & (roots.real < region.right[case])
    within: ComplexArray = roots[right & (roots.imag < region.top[case])]
    return within


def _between_roots(p: Characteristic, found: list[ComplexArray], region: _Region) -> _Region:
    """The rectangle with its edges moved away from the roots, so that the count along them is easy."""
    theta = np.ones(len(found)) if p.dead_time is None else p.dead_time
    left, top = region.left.copy(), region.top.copy()
    for case, roots in enumerate(found):
        if not len(roots):
            continue
        tries = left[case] + np.linspace(0.0, 0.9, 10) / theta[case]
        left[case] = tries[np.abs(roots.real - tries[:, None]).min(axis=1).argmax()]
        if region.fixed[case]:
            continue
        tries = top[case] + np.linspace(0.0, 0.95, 12) * 2.0 * math.pi / theta[case]
        top[case] = tries[np.abs(roots.imag - tries[:, None]).min(axis=1).argmax()]
    return _Region(left, region.right, top, region.faint, region.fixed)


def _more_starts(
    p: Characteristic, region: _Region, found: list[ComplexArray], missing: BoolArray, attempt: int
) -> list[ComplexArray]:
    """The roots that are there, and a net of new start values over the lowest strip in which some are missing."""
    theta = np.ones(len(found)) if p.dead_time is None else p.dead_time
    lists = []
    for case, roots in enumerate(found):
        if not missing[case]:
            lists.append(roots[:1] if len(roots) else np.array([1.0 + 0.0j]))
            continue
        low, high = _strip(p, region, roots, case)
        count = 7 + 3 * attempt
        margin = 0.3 / theta[case]
        across = np.linspace(region.left[case], min(region.right[case], 6.0 / theta[case]), count + 3)
        up = np.linspace(max(low - margin, 0.01 / theta[case]), high + margin, count)
        near = roots[(roots.imag >= low - 20.0 * margin) & (roots.imag <= high + 20.0 * margin)]
        lists.append(np.concatenate([near, (across + 1j * up[:, None]).ravel()]))
    return lists


def _strip(p: Characteristic, region: _Region, roots: ComplexArray, case: int) -> tuple[float, float]:
    """Imaginary parts between which roots are missing, by halving."""
    own = p.of_cases(np.array([case]))
    left, right = region.left[case : case + 1], region.right[case : case + 1]
    theta = 1.0 if p.dead_time is None else float(p.dead_time[case])
    inside = roots[roots.real > left[0]]
    low, high = 0.0, float(region.top[case])
    while (high - low) * theta > 4.0:
        middle = 0.5 * (low + high)
        listed = inside[inside.imag < middle]
        here = len(listed) + np.count_nonzero(listed.imag > 0.0)
        complete = roots_in_rectangle(own, left, right, np.array([middle]))[0] == here
        low, high = (middle, high) if complete else (low, middle)
    return low, high
