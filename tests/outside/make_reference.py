"""Write the reference values of the random loops: `python -m tests.outside.make_reference`.

Deterministic; takes some minutes. `test_brute_force.py` recomputes a part of it every time.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import Any

from tests.outside.random_loops import COUNT, random_design
from tests.outside.record import record

FILE = Path(__file__).with_name("random_loops.json")


def has_time(index: int) -> bool:
    """Whether the step measures of loop `index` are recorded."""
    return index % 5 < 2


def entry(index: int) -> dict[str, Any]:
    """The record of random loop `index`."""
    return {"index": index, **record(random_design(index), with_time=has_time(index))}


def stored() -> list[dict[str, Any]]:
    """The file's entries."""
    return json.loads(FILE.read_text(encoding="utf-8"))


def main() -> None:
    """Write the file."""
    lines = []
    for index in range(COUNT):
        lines.append(json.dumps(entry(index), separators=(",", ":")))
        print(f"loop {index} of {COUNT}", file=sys.stderr, flush=True)
    FILE.write_text("[\n" + ",\n".join(lines) + "\n]\n", encoding="utf-8")


if __name__ == "__main__":
    main()
