"""The loops to be judged together: every plant case with the one compensator."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

from engine.model.factored import Factored


@dataclass(frozen=True, eq=False)
class LoopSet:
    """L = C·P for each plant case. Cases may differ in order, sign and dead time."""

    plants: tuple[Factored, ...]
    """One a plant case, the nominal first."""
    compensator: Factored
    """C(s): the product of the gain and the enabled stages."""

    @property
    def count(self) -> int:
        """Number of plant cases."""
        return len(self.plants)

    @cached_property
    def loops(self) -> tuple[Factored, ...]:
        """C·P per case, roots concatenated."""
        return tuple(self.compensator * plant for plant in self.plants)
