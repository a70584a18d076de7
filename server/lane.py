"""A lane of computation: one thread, one piece of work at a time, in order of arrival."""

from __future__ import annotations

import asyncio
import sys
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from typing import Any, TypeVar

from server.faults import RefusedError

Result = TypeVar("Result")

_MOST_WAITING = 64
_SWITCH_INTERVAL_S = 0.0005


class Lane:
    """Runs work beside the event loop, which keeps reading sockets and serving pages meanwhile.

    One thread and not several: two computations in threads would only take turns under Python's lock, each slowing
    the other down.
    """

    def __init__(self, name: str) -> None:
        # The default of 5 ms is as long as a whole live assessment: the loop would wait that long for its turn.
        sys.setswitchinterval(_SWITCH_INTERVAL_S)
        self._thread = ThreadPoolExecutor(1, thread_name_prefix=f"loopwright-{name}")
        self._waiting = 0

    async def run(self, work: Callable[..., Result], *arguments: Any) -> Result:
        """The result of `work(*arguments)`; RefusedError(503) when too much is waiting already."""
        if self._waiting >= _MOST_WAITING:
            raise RefusedError(503, "the server has too much to compute just now; try again in a moment")
        self._waiting += 1
        try:
            return await asyncio.get_running_loop().run_in_executor(self._thread, work, *arguments)
        finally:
            self._waiting -= 1

    def close(self) -> None:
        """Drop what waits and let the present piece end."""
        self._thread.shutdown(wait=False, cancel_futures=True)
