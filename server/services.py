"""What the routes share: the settings, the link store, the demos and the two lanes of computation."""

from __future__ import annotations

from dataclasses import dataclass, field

from server.demos import Demo, read_demos
from server.lane import Lane
from server.link_store import LinkStore
from server.settings import Settings


@dataclass(frozen=True)
class Services:
    """Made once for an application."""

    settings: Settings
    store: LinkStore
    demos: dict[str, Demo] = field(default_factory=read_demos)
    live: Lane = field(default_factory=lambda: Lane("live"))
    """Live assessments: short, and somebody's hand is waiting."""
    requests: Lane = field(default_factory=lambda: Lane("requests"))
    """Everything else that computes or waits for the disk."""

    @classmethod
    def of(cls, settings: Settings) -> Services:
        """The services for these settings."""
        return cls(settings, LinkStore(settings.store, settings.stored_designs))

    def close(self) -> None:
        """Stop the lanes."""
        self.live.close()
        self.requests.close()
