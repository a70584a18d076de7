"""What the routes share: the settings, the link store, the demos and the two lanes of computation."""

from __future__ import annotations

import asyncio
import os
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, TypeVar

from server.demos import Demo, read_demos
from server.lane import Lane
from server.link_store import LinkStore
from server.settings import Settings

Result = TypeVar("Result")

_LIVE_SECONDS = 8.0
"""The page gives a connection up after 10 s without an answer."""
_NICENESS_OF_REQUESTS = 5


@dataclass(frozen=True)
class Services:
    """Made once for an application."""

    settings: Settings
    store: LinkStore
    demos: dict[str, Demo]
    live: Lane
    """Live assessments: short, and somebody's hand is waiting."""
    requests: Lane
    """Everything else that computes; it steps back for the live ones."""

    @classmethod
    def of(cls, settings: Settings) -> Services:
        """The services for these settings."""
        live_workers = max(1, (os.cpu_count() or 2) // 2)
        return cls(
            settings,
            LinkStore(settings.store, settings.stored_designs),
            read_demos(),
            Lane("live", live_workers, min(_LIVE_SECONDS, settings.seconds)),
            Lane("requests", 1, settings.seconds, _NICENESS_OF_REQUESTS),
        )

    async def disk(self, work: Callable[..., Result], *arguments: Any) -> Result:
        """Work that waits for the disk, in a thread."""
        return await asyncio.to_thread(work, *arguments)

    def open(self) -> None:
        """Start the workers."""
        self.live.warm_up()
        self.requests.warm_up()

    def close(self) -> None:
        """Stop the workers."""
        self.live.close()
        self.requests.close()
