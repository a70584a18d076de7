"""The one error shape, and the error for a request that is answered with it."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

from engine.errors import Fault, LoopwrightError

SURPRISE = "something went wrong in Loopwright itself; its log has the details"


class RefusedError(LoopwrightError):
    """A request that is answered with one clear line instead of a result."""

    def __init__(self, status: int, what: str, where: str = "", headers: Mapping[str, str] | None = None) -> None:
        super().__init__(what)
        self.status = status
        self.fault = Fault(where, what)
        self.headers = headers


def error_body(status: int, faults: Iterable[Fault]) -> dict[str, Any]:
    """`{"ok": false, "status": 422, "errors": [{"where": …, "what": …}]}`."""
    return {
        "ok": False,
        "status": status,
        "errors": [{"where": fault.where, "what": fault.what} for fault in faults],
    }
