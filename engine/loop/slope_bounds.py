"""Proven bounds of the slope of gain and phase between neighbouring frequencies, factor by factor."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from engine.loop.sections import Sections
from engine.model.factored import FloatArray

# A pair with less damping than this is passed by a jump between two nodes that stand closer than JUMP_WIDTH.
UNDAMPED = 1e-12
JUMP_WIDTH = 1e-10


def gain_slope_bounds(model: Sections, nodes: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Lower and upper bound of d ln|L| / d ln ω in every interval between neighbouring nodes.

    nodes: (…, n) increasing, > 0 [rad/s]; the results are (…, n−1).

    A first-order factor has slope ω²/(ω²+a²), which only rises. A second-order factor has slope
    2u(u−c)/(u²−2cu+1), u = (ω/ω0)², c = 1−2ζ², with extremes 1 ± 1/e at u = (1±e)/c where c > 0,
    e = 2|ζ|√(1−ζ²) (by hand: the derivative's numerator is −cu²+2u−c).
    """
    base = np.broadcast_to(-model.integrators, nodes.shape)[..., 1:]
    low, high = base, base
    if len(model.corner):
        ratio = nodes / model.corner
        ratio *= ratio
        ratio /= 1.0 + ratio
        rising = np.add.reduce(np.maximum(model.corner_weight, 0.0) * ratio, axis=0)
        falling = np.add.reduce(np.minimum(model.corner_weight, 0.0) * ratio, axis=0)
        low = low + rising[..., :-1] + falling[..., 1:]
        high = high + rising[..., 1:] + falling[..., :-1]
    if len(model.decay):
        least, greatest = _pair_gain(model, nodes)
        up, down = np.maximum(model.pair_weight, 0.0), np.minimum(model.pair_weight, 0.0)
        low = low + np.add.reduce(up * least + down * greatest, axis=0)
        high = high + np.add.reduce(up * greatest + down * least, axis=0)
    return low, high


def phase_slope_bounds(model: Sections, nodes: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Lower and upper bound of d phase / d ln ω [rad] in every interval between neighbouring nodes.

    A first-order factor has slope a·ω/(ω²+a²), greatest (1/2) at |a|; a second-order factor
    2ζw/(w²−4+4ζ²), w = ω/ω0+ω0/ω, greatest (1/ζ) at ω0; dead time −ω·θ.
    """
    lag = -model.dead_time_s * nodes
    low, high = lag[..., 1:], lag[..., :-1]
    if len(model.corner):
        size = np.abs(model.corner)
        value = size * nodes / (nodes * nodes + size * size)
        least, greatest = _unimodal(value, nodes, size, 0.5)
        low, high = _add(low, high, least, greatest, model.corner_weight * np.sign(model.corner))
    if len(model.decay):
        natural = np.hypot(model.decay, model.swing)
        damping = np.abs(model.decay) / natural
        ratio = nodes / natural
        off = 1.0 / ratio - ratio
        width = np.maximum(damping, 1e-150)
        value = 2.0 * damping * (ratio + 1.0 / ratio) / (off * off + 4.0 * width * width)
        # An undamped pair turns nothing but in its jump.
        top = np.where(damping > 0, 1.0 / width, 0.0)
        least, greatest = _unimodal(value, nodes, natural, top)
        turn = np.where(model.decay < 0, -1.0, 1.0)
        low, high = _add(low, high, least, greatest, model.pair_weight * turn)
    return low, high


def steepest(model: Sections, nodes: FloatArray) -> FloatArray:
    """Bound of |d ln L / d ln ω|, gain and phase alike, in every interval; coarse but quick.

    Each root r adds s/(s − r), whose size is at most ω over the distance of jω from r.
    """
    left, right = nodes[..., :-1], nodes[..., 1:]
    beyond = np.maximum(left - model.root.imag, model.root.imag - right)
    np.maximum(beyond, 0.0, out=beyond)
    beyond *= beyond
    beyond += model.root.real * model.root.real
    with np.errstate(divide="ignore"):
        share = np.abs(model.root_weight) / np.sqrt(beyond, out=beyond)
    total: FloatArray = np.abs(model.integrators) + (np.add.reduce(share, axis=0) + model.dead_time_s) * right
    return total


def undamped_jumps(model: Sections, nodes: FloatArray) -> NDArray[np.bool_]:
    """(…, n−1): True where an interval is nothing but the passage of an undamped pair."""
    passed = np.zeros(np.broadcast_shapes(model.log_gain.shape, nodes.shape), bool)[..., 1:]
    if len(model.decay):
        natural = np.hypot(model.decay, model.swing)
        undamped = (model.pair_weight != 0) & (np.abs(model.decay) <= UNDAMPED * natural)
        if undamped.any():
            left, right = nodes[..., :-1], nodes[..., 1:]
            close = (left < natural) & (natural < right) & (right - left < JUMP_WIDTH * natural)
            passed = passed | (close & undamped).any(axis=0)
    return passed


def _pair_gain(model: Sections, nodes: FloatArray) -> tuple[FloatArray, FloatArray]:
    natural = np.hypot(model.decay, model.swing)
    damping = np.maximum(np.abs(model.decay) / natural, 1e-150)
    squared = damping * damping
    u = nodes / natural
    u *= u
    off = (nodes - natural) * (nodes + natural) / (natural * natural)
    value = 2.0 * u * (off + 2.0 * squared) / (off * off + 4.0 * squared * u)
    spread = 2.0 * damping * np.sqrt(1.0 - np.minimum(squared, 1.0))
    c = 1.0 - 2.0 * squared
    with np.errstate(invalid="ignore", divide="ignore"):
        left_of = np.where(c > 0, natural * np.sqrt((1.0 - spread) / c), np.inf)
        right_of = np.where(c > 0, natural * np.sqrt((1.0 + spread) / c), np.inf)
        deepest, steepest = 1.0 - 1.0 / spread, 1.0 + 1.0 / spread
    left, right = nodes[..., :-1], nodes[..., 1:]
    least = np.minimum(value[..., :-1], value[..., 1:])
    greatest = np.maximum(value[..., :-1], value[..., 1:])
    least = np.where((left < left_of) & (left_of < right), deepest, least)
    greatest = np.where((left < right_of) & (right_of < right), steepest, greatest)
    return least, greatest


def _unimodal(
    value: FloatArray, nodes: FloatArray, top_at: FloatArray, top: float | FloatArray
) -> tuple[FloatArray, FloatArray]:
    before, after = value[..., :-1], value[..., 1:]
    inside = (nodes[..., :-1] < top_at) & (top_at < nodes[..., 1:])
    return np.minimum(before, after), np.where(inside, top, np.maximum(before, after))


def _add(
    low: FloatArray, high: FloatArray, least: FloatArray, greatest: FloatArray, weight: FloatArray
) -> tuple[FloatArray, FloatArray]:
    up, down = np.maximum(weight, 0.0), np.minimum(weight, 0.0)
    return (
        low + np.add.reduce(up * least + down * greatest, axis=0),
        high + np.add.reduce(up * greatest + down * least, axis=0),
    )
