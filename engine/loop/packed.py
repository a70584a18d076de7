"""Zeros and poles of several models as padded arrays, so that every case goes through one array operation."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from engine.model.factored import ComplexArray, Factored, FloatArray


@dataclass(frozen=True, eq=False)
class RootTable:
    """One list of roots a case, padded: axis 0 counts the roots, so that sums run in the same order
    whatever the padding, and a case reads the same alone and in company."""

    roots: ComplexArray
    """(k, c, 1); −1 where padded."""
    mask: FloatArray
    """(k, c, 1); 1 for a root, 0 for padding."""
    padded: bool
    """Whether there is any padding."""

    def factors(self, s: ComplexArray) -> ComplexArray:
        """(k, c, n): s − root, and exactly 1 where padded; s is (c, n)."""
        return self.mask * s - self.roots if self.padded else s - self.roots

    def of_cases(self, case: NDArray[np.int64]) -> RootTable:
        """The lists of the cases named, one each."""
        return RootTable(self.roots[:, case], self.mask[:, case], self.padded)

    def scaled(self, scale: FloatArray) -> RootTable:
        """The roots divided by `scale` (c,)."""
        divided = np.where(self.mask > 0.0, self.roots / scale[:, None], -1.0)
        return RootTable(divided, self.mask, self.padded)


def root_table(lists: Sequence[ComplexArray]) -> RootTable:
    """Pad one list of roots a case to a common length."""
    longest = max((len(each) for each in lists), default=0)
    roots = np.full((longest, len(lists), 1), -1.0 + 0.0j)
    mask = np.zeros((longest, len(lists), 1))
    for case, each in enumerate(lists):
        roots[: len(each), case, 0] = each
        mask[: len(each), case, 0] = 1.0
    return RootTable(roots, mask, any(len(each) < longest for each in lists))


def time_scales(models: Sequence[Factored]) -> FloatArray:
    """(c,) power of two nearest the geometric mean of the non-zero roots [rad/s].

    Dividing by a power of two is exact, and keeps products over 40 roots inside the range of a double.
    """
    lists = [roots for model in models for roots in (model.zeros, model.poles)]
    if not lists:
        return np.ones(0)
    sizes = np.abs(np.concatenate(lists))
    counts = [len(model.zeros) + len(model.poles) for model in models]
    case = np.repeat(np.arange(len(models)), counts)
    moving = sizes > 0.0
    logs = np.log2(np.where(moving, sizes, 1.0))
    total = np.bincount(case, logs, len(models))
    number = np.bincount(case, moving, len(models))
    return 2.0 ** np.round(total / np.maximum(number, 1.0))


@dataclass(frozen=True, eq=False)
class PackedModels:
    """Several models as arrays."""

    zeros: RootTable
    poles: RootTable
    counts: NDArray[np.int64]
    """(2, c) numbers of zeros and poles."""
    gain: FloatArray
    dead_time_s: FloatArray


@lru_cache(maxsize=16)
def packed_models(models: tuple[Factored, ...]) -> PackedModels:
    """The models as arrays; told by identity, as plants stay the same objects while a compensator is moved."""
    return PackedModels(
        root_table([model.zeros for model in models]),
        root_table([model.poles for model in models]),
        np.array([[len(model.zeros) for model in models], [len(model.poles) for model in models]], dtype=np.int64),
        np.array([model.gain for model in models]),
        np.array([model.dead_time_s for model in models]),
    )
