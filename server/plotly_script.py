"""plotly.min.js from the installed package: no other host, also on a network without a way out."""

from __future__ import annotations

import gzip
import hashlib
import threading
from functools import cached_property
from importlib.metadata import version
from importlib.util import find_spec
from pathlib import Path

from engine.errors import LoopwrightError


class PlotlyScript:
    """The script, its version, and a packed copy for browsers that take one."""

    def __init__(self) -> None:
        self.version = version("plotly")
        self._packing = threading.Lock()

    @cached_property
    def plain(self) -> bytes:
        """The script as installed."""
        return _place().read_bytes()

    @cached_property
    def etag(self) -> str:
        """Changes when the script does."""
        return f'"{hashlib.sha256(self.plain).hexdigest()[:32]}"'

    @property
    def packed(self) -> bytes:
        """The script gzipped, at a third of its size; made on first use, once."""
        with self._packing:
            return self._packed

    @cached_property
    def _packed(self) -> bytes:
        return gzip.compress(self.plain, compresslevel=6, mtime=0)


def _place() -> Path:
    found = find_spec("plotly")
    for folder in (found.submodule_search_locations or []) if found else []:
        script = Path(folder) / "package_data" / "plotly.min.js"
        if script.is_file():
            return script
    raise LoopwrightError("the installed plotly package holds no plotly.min.js; install plotly again")
