"""Where the files are that ship beside the code: the page and the demo designs."""

from __future__ import annotations

from pathlib import Path

# In a clone and in an installed wheel alike, `web` and `demo_plants` lie beside the package `server`.
_BESIDE = Path(__file__).resolve().parent.parent

STATIC = _BESIDE / "web" / "static"
TEMPLATES = _BESIDE / "web" / "templates"
DEMO_PLANTS = _BESIDE / "demo_plants"
