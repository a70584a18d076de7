"""The one exception family: every mistake says where it is, what is wrong, and what would be right."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Fault:
    """One mistake in what was handed in."""

    where: str
    """Path of the field, as `plant_cases[1].model.poles[0]`; "" for the whole document."""
    what: str
    """What is wrong, with the value echoed and the remedy."""

    def __str__(self) -> str:
        return f"{self.where}: {self.what}" if self.where else self.what


class LoopwrightError(Exception):
    """Root of all errors that are raised on purpose."""


class DesignError(LoopwrightError):
    """The design, or a part of it, cannot be used as it stands."""

    def __init__(self, where: str, what: str) -> None:
        self.faults: tuple[Fault, ...] = (Fault(where, what),)
        super().__init__(str(self.faults[0]))

    @classmethod
    def of(cls, faults: Iterable[Fault]) -> DesignError:
        """An error that carries several faults; the first one is its message."""
        listed = tuple(faults)
        error = cls(listed[0].where, listed[0].what)
        error.faults = listed
        return error

    def within(self, prefix: str) -> DesignError:
        """The same faults seen from the enclosing field `prefix`."""
        return DesignError.of(Fault(_join(prefix, fault.where), fault.what) for fault in self.faults)


def _join(prefix: str, where: str) -> str:
    if not where or not prefix:
        return prefix or where
    return prefix + where if where.startswith("[") else f"{prefix}.{where}"
