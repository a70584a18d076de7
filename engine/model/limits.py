"""How large a model may be: bounds that keep entry quick and the arithmetic above within floating range."""

from __future__ import annotations

from collections.abc import Sized
from dataclasses import dataclass

from engine.errors import DesignError

SMALLEST_ROOT_RAD_S = 1e-30
LARGEST_ROOT_RAD_S = 1e30
LONGEST_DEAD_TIME_S = 1e30


@dataclass(frozen=True, slots=True)
class Limits:
    """What is accepted at entry; a server sets its own from its settings."""

    order: int = 60
    """Most zeros, and most poles, of one model; also the greatest power in an expression."""
    text_length: int = 4000
    """Most characters of an expression."""
    depth: int = 50
    """Most levels of nesting in an expression."""


DEFAULT_LIMITS = Limits()


def require_order(count: int, where: str, limits: Limits, thing: str = "roots") -> None:
    """Refuse more than `limits.order` of `thing`."""
    if count > limits.order:
        raise DesignError(where, f"has {count} {thing}; at most {limits.order} are accepted")


def require_items(items: Sized, most: int, where: str, thing: str) -> None:
    """Refuse more than `most` items, before anything reads them."""
    if len(items) > most:
        raise DesignError(where, f"has {len(items)} {thing}; at most {most} are accepted")
