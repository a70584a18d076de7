"""A process that computes for the server: out of the way of the event loop, and stoppable.

A computation in a thread cannot be stopped, and takes Python's lock from the thread that reads the sockets. A worker
that takes too long is ended and replaced.
"""

from __future__ import annotations

import logging
import os
import signal
import traceback
from collections.abc import Callable
from multiprocessing import get_context
from multiprocessing.connection import Connection
from multiprocessing.process import BaseProcess
from typing import Any

from engine.errors import DesignError, LoopwrightError
from server.collector import settle_collector
from server.error_shape import SURPRISE, RefusedError
from server.quiet_numerics import quiet_numerics

LOG_FORMAT = "%(asctime)s %(levelname)s %(name)s: %(message)s"
_LOG = logging.getLogger("loopwright.worker")
_SPAWN = get_context("spawn")  # a fork would copy the server's sockets and threads
_READY, _DONE, _FAULTS, _SURPRISE = "ready", "done", "faults", "surprise"
_START_SECONDS = 60.0
_CLOSING = "the server is closing"


class TooLongError(LoopwrightError):
    """A computation was ended because it took too long."""


class Worker:
    """The server's end. One computation at a time; not for several threads at once."""

    def __init__(self, niceness: int = 0) -> None:
        self._niceness = niceness
        self._process: BaseProcess | None = None
        self._line: Connection[Any, Any] | None = None
        self._ended = False

    def call(self, work: Callable[..., Any], arguments: tuple[Any, ...], seconds: float) -> Any:
        """The result of `work(*arguments)`, computed in the worker.

        Raises
        ------
        DesignError : as raised by the work
        TooLongError : it took longer than `seconds`
        RefusedError : anything else went wrong
        """
        if self._ended:
            raise RefusedError(503, _CLOSING)
        try:
            line = self.start()
            line.send((work, arguments))
            if not line.poll(seconds):
                self.stop()
                raise TooLongError(f"takes longer than {seconds:g} s to compute")
            outcome, value = line.recv()
        except (EOFError, OSError) as error:  # the process was ended from outside, for want of memory perhaps
            if self._ended:  # by `end`, from the thread that closes the server: nothing to report
                raise RefusedError(503, _CLOSING) from None
            self.stop()
            _LOG.error("a worker ended in the middle of its work: %r", error)
            raise RefusedError(500, SURPRISE) from None
        if outcome == _FAULTS:
            raise DesignError.of(value)
        if outcome == _SURPRISE:
            _LOG.error("a computation failed\n%s", value)
            raise RefusedError(500, SURPRISE)
        return value

    def start(self) -> Connection[Any, Any]:
        """Make sure that the process runs and has loaded what it needs; it is started once and kept."""
        if self._line is not None and self._process is not None and self._process.is_alive():
            return self._line
        self.stop()
        self._line, others = _SPAWN.Pipe()
        self._process = _SPAWN.Process(target=_work, args=(others, self._niceness), daemon=True)
        self._process.start()
        others.close()
        # Loading numpy is no part of the time that a computation may take.
        if not self._line.poll(_START_SECONDS):
            raise EOFError("not ready in time")
        self._line.recv()
        return self._line

    def end(self) -> None:
        """End the process for good: the server closes."""
        self._ended = True
        self.stop()

    def stop(self) -> None:
        """End the process, whatever it is doing."""
        if self._process is not None:
            self._process.kill()
            self._process.join()
        if self._line is not None:
            self._line.close()
        self._process = self._line = None


def _work(line: Connection[Any, Any], niceness: int) -> None:
    """The worker's end: answer until the other end is gone."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)  # Ctrl+C reaches every process; the server ends its workers itself
    if niceness and hasattr(os, "nice"):
        os.nice(niceness)
    logging.basicConfig(level=logging.WARNING, format=LOG_FORMAT)
    quiet_numerics()
    import server.computing
    import server.live_answer  # noqa: F401  only a worker needs these two

    settle_collector()
    line.send(_READY)
    while True:
        try:
            work, arguments = line.recv()
        except (EOFError, OSError):
            return
        line.send(_outcome_of(work, arguments))


def _outcome_of(work: Callable[..., Any], arguments: tuple[Any, ...]) -> tuple[str, Any]:
    try:
        return _DONE, work(*arguments)
    except DesignError as error:
        return _FAULTS, error.faults
    except Exception:
        return _SURPRISE, traceback.format_exc()
