"""A real Loopwright server in a process of its own, for tests that talk to one."""

from __future__ import annotations

import contextlib
import os
import queue
import re
import signal
import subprocess
import sys
import threading
from pathlib import Path

CLONE = Path(__file__).resolve().parent.parent
_START_S = 60
_STOP_S = 20
_OPEN_LINE = re.compile(r"is open at (http://\S+)/")


class WorkbenchProcess:
    """Starts a server on a free port (or the one named) and knows its address."""

    def __init__(self, store: Path, port: int = 0, folder: Path = CLONE, **environment: str) -> None:
        self.store = store
        self._folder = folder
        self._port = port
        self._environment = environment
        self.lines: list[str] = []
        self._start()

    def _start(self) -> None:
        inherited = {name: text for name, text in os.environ.items() if not name.startswith("LOOPWRIGHT_")}
        self._process = subprocess.Popen(
            [sys.executable, "-m", "server", "serve", "--no-browser", "--port", str(self._port)],
            cwd=self._folder,
            env={**inherited, "LOOPWRIGHT_STORE": str(self.store), **self._environment},
            stdout=subprocess.PIPE,
            stderr=subprocess.STDOUT,
            text=True,
        )
        first: queue.Queue[str] = queue.Queue()
        threading.Thread(target=self._read, args=(self._process, first), daemon=True).start()
        line = ""
        while not (found := _OPEN_LINE.search(line)):
            with contextlib.suppress(queue.Empty):
                line = first.get(timeout=_START_S)
                continue
            self.kill()
            raise RuntimeError(f"the server did not start: {self.output}")
        self.url = found[1]
        self._port = int(self.url.rpartition(":")[2])

    def _read(self, process: subprocess.Popen[str], first: queue.Queue[str]) -> None:
        with process.stdout as stream:
            for line in stream:
                self.lines.append(line)
                first.put(line)

    @property
    def host(self) -> str:
        """Address and port, as in a Host header."""
        return self.url.removeprefix("http://")

    @property
    def output(self) -> str:
        """Everything the server has printed, log lines included."""
        return "".join(self.lines)

    def children(self) -> list[int]:
        """Process ids of what it has started."""
        return [
            int(stat.parent.name)
            for stat in Path("/proc").glob("[0-9]*/stat")
            if (fields := _fields(stat)) and fields[1] == str(self._process.pid)
        ]

    @property
    def runs(self) -> bool:
        return self._process.poll() is None

    def kill(self) -> None:
        """End it at once, as a power cut would."""
        self._process.kill()
        self._process.wait(_STOP_S)

    def stop(self) -> int:
        """Ask it to end, and return its exit code; SIGTERM ends it with -15."""
        if self.runs:
            self._process.send_signal(signal.SIGTERM)
            try:
                self._process.wait(_STOP_S)
            except subprocess.TimeoutExpired:
                self.kill()
        return self._process.returncode

    def start_again(self) -> None:
        """The same store on the same port."""
        self.stop()
        self._start()


def has_ended(process_id: int) -> bool:
    """Whether a process has ended; one that only waits to be collected by its parent counts as ended."""
    fields = _fields(Path(f"/proc/{process_id}/stat"))
    return not fields or fields[0] == "Z"


def _fields(stat: Path) -> list[str]:
    """State, parent, … of a process (proc(5)); empty when it is gone."""
    try:
        return stat.read_text().rpartition(")")[2].split()
    except OSError:
        return []
