"""The demo designs that ship with the workbench."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from server.json_text import parse_json
from server.shipped import DEMO_PLANTS


@dataclass(frozen=True)
class Demo:
    """A design file of `demo_plants/` and its line of `index.json`."""

    name: str
    """Its file name without the ending."""
    entry: dict[str, Any]
    """`name`, `title`, `field`, `summary`, and `landing`: true for the one a first visit opens on."""
    design: dict[str, Any]


def read_demos(folder: Path = DEMO_PLANTS) -> dict[str, Demo]:
    """All demos by name, in the order of the index."""
    entries = parse_json((folder / "index.json").read_bytes())
    return {
        entry["name"]: Demo(entry["name"], entry, parse_json((folder / f"{entry['name']}.json").read_bytes()))
        for entry in entries
    }


def demo_list(demos: dict[str, Demo]) -> list[dict[str, Any]]:
    """The list of demos; exactly one of them is the landing demo."""
    return [demo.entry for demo in demos.values()]
