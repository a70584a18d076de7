"""The demo designs that ship with the workbench."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from server.json_text import parse_json
from server.shipped import DEMO_PLANTS

LANDING = "camera-gimbal"
"""The demo a first visit opens on: not yet met, one drag away."""


@dataclass(frozen=True)
class Demo:
    """A design file of `demo_plants/`."""

    name: str
    """Its file name without the ending."""
    design: dict[str, Any]

    def entry(self, landing: bool) -> dict[str, Any]:
        """What the list of demos says about it."""
        notes = str(self.design.get("notes", ""))
        return {
            "name": self.name,
            "title": str(self.design.get("title", self.name)),
            "summary": notes.split("\n\n")[0].strip(),
            "landing": landing,
        }


def read_demos(folder: Path = DEMO_PLANTS) -> dict[str, Demo]:
    """All demos by name, in order of their names."""
    return {path.stem: Demo(path.stem, parse_json(path.read_bytes())) for path in sorted(folder.glob("*.json"))}


def demo_list(demos: dict[str, Demo]) -> list[dict[str, Any]]:
    """The list of demos; exactly one of them is the landing demo."""
    landing = LANDING if LANDING in demos else next(iter(demos), "")
    return [demo.entry(demo.name == landing) for demo in demos.values()]
