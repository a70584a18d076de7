"""A lane of computation: some workers, and the work that waits for them in order of arrival."""

from __future__ import annotations

import asyncio
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from queue import SimpleQueue
from typing import Any, TypeVar

from server.error_shape import RefusedError
from server.worker import Worker

Result = TypeVar("Result")

_MOST_WAITING = 64


class Lane:
    """Runs work beside the event loop, which keeps reading sockets and serving pages meanwhile."""

    def __init__(self, name: str, workers: int, seconds: float, niceness: int = 0) -> None:
        self._seconds = seconds
        self._workers = [Worker(niceness) for _ in range(workers)]
        self._idle: SimpleQueue[Worker] = SimpleQueue()
        for worker in self._workers:
            self._idle.put(worker)
        # The threads only wait for their worker.
        self._threads = ThreadPoolExecutor(workers, thread_name_prefix=f"loopwright-{name}")
        self._waiting = 0

    def warm_up(self) -> None:
        """Start the workers without waiting for them: loading numpy takes a moment."""
        for _ in self._workers:
            self._threads.submit(self._call, len, ("",))

    async def run(self, work: Callable[..., Result], *arguments: Any) -> Result:
        """The result of `work(*arguments)`, a function of a module, computed by a worker.

        Raises
        ------
        DesignError : as raised by the work
        TooLongError : it took longer than this lane allows
        RefusedError : too much is waiting already, or the work failed
        """
        if self._waiting >= _MOST_WAITING:
            raise RefusedError(503, "the server has too much to compute just now; try again in a moment")
        self._waiting += 1
        try:
            result: Result = await asyncio.get_running_loop().run_in_executor(
                self._threads, self._call, work, arguments
            )
            return result
        finally:
            self._waiting -= 1

    def _call(self, work: Callable[..., Any], arguments: tuple[Any, ...]) -> Any:
        worker = self._idle.get()
        try:
            return worker.call(work, arguments, self._seconds)
        finally:
            self._idle.put(worker)

    def close(self) -> None:
        """Drop what waits, and end the workers."""
        self._threads.shutdown(wait=False, cancel_futures=True)
        for worker in self._workers:
            worker.end()
