"""Every setting of the server, with its default: the one place where both stand.

Each is read from the environment variable named beside it. Sizes are bytes, times seconds.
"""

from __future__ import annotations

import dataclasses
import os
import sys
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any
from urllib.parse import urlsplit

from engine.design.limits import Limits
from engine.errors import LoopwrightError

PREFIX = "LOOPWRIGHT_"
LIMIT_PREFIX = PREFIX + "MAX_"


class SettingError(LoopwrightError):
    """An environment variable that cannot be used."""


@dataclass(frozen=True)
class Settings:
    """How this installation runs. Bounds on a design are the fields of `engine.design.limits.Limits`."""

    host: str = "127.0.0.1"
    """LOOPWRIGHT_HOST: address to listen on; beyond this machine only in a network you trust."""
    port: int = 8478
    """LOOPWRIGHT_PORT: port to listen on; 0 takes any free one."""
    store: Path = field(default_factory=lambda: default_store())
    """LOOPWRIGHT_STORE: SQLite file of shared designs; default in the platform's data folder."""
    base_url: str = ""
    """LOOPWRIGHT_BASE_URL: address that links start with, as `https://loops.example`; default as requested."""
    hosts: tuple[str, ...] = ()
    """LOOPWRIGHT_HOSTS: further host names, by commas, under which browsers may ask for this server."""
    body_bytes: int = 2_000_000
    """LOOPWRIGHT_MAX_BODY_BYTES: largest request body or socket message."""
    stored_designs: int = 100_000
    """LOOPWRIGHT_MAX_STORED_DESIGNS: most designs in the link store."""
    seconds: int = 20
    """LOOPWRIGHT_MAX_SECONDS: longest time to compute one answer."""
    sockets: int = 64
    """LOOPWRIGHT_MAX_SOCKETS: most live connections of one process at a time."""
    limits: Limits = field(default_factory=Limits)
    """LOOPWRIGHT_MAX_<FIELD> for each field of Limits, as LOOPWRIGHT_MAX_PLANT_CASES."""

    @classmethod
    def from_environment(cls, environment: Mapping[str, str] | None = None) -> Settings:
        """The settings as the environment has them; SettingError names a variable that cannot be used."""
        given = os.environ if environment is None else environment
        chosen: dict[str, Any] = {
            name: read(variable, given[variable])
            for name, (variable, read) in _VARIABLES.items()
            if given.get(variable)
        }
        bounds = {
            bound.name: _count(variable, given[variable])
            for bound in dataclasses.fields(Limits)
            if given.get(variable := LIMIT_PREFIX + bound.name.upper())
        }
        return cls(**chosen, limits=Limits(**bounds))


def default_store() -> Path:
    """`links.sqlite` in the folder where this platform keeps an application's data."""
    if sys.platform == "darwin":
        folder = Path.home() / "Library" / "Application Support"
    elif sys.platform == "win32":
        folder = Path(os.environ.get("LOCALAPPDATA") or Path.home() / "AppData" / "Local")
    else:
        folder = Path(os.environ.get("XDG_DATA_HOME") or Path.home() / ".local" / "share")
    return folder / "loopwright" / "links.sqlite"


def _count(variable: str, text: str) -> int:
    return _whole(variable, text, 1, 1_000_000_000_000)


def _port(variable: str, text: str) -> int:
    return _whole(variable, text, 0, 65535)


def _whole(variable: str, text: str, least: int, most: int) -> int:
    if not (text.isascii() and text.isdigit() and len(text) < 14 and least <= int(text) <= most):
        raise SettingError(f"{variable} must be a whole number from {least} to {most}, is {text!r}")
    return int(text)


def _text(variable: str, text: str) -> str:
    return text


def _store(variable: str, text: str) -> Path:
    if "://" in text:
        raise SettingError(f"{variable} must be the path of a file, is {text!r}; other stores are not supported yet")
    return Path(text).expanduser()


def _base_url(variable: str, text: str) -> str:
    parts = urlsplit(text)
    if parts.scheme not in ("http", "https") or not parts.hostname or parts.path.strip("/") or parts.query:
        raise SettingError(f"{variable} must be like https://loops.example, without a path, is {text!r}")
    return f"{parts.scheme}://{parts.netloc}"


def _names(variable: str, text: str) -> tuple[str, ...]:
    return tuple(name for part in text.split(",") if (name := part.strip().lower()))


_VARIABLES: dict[str, tuple[str, Callable[[str, str], Any]]] = {
    "host": (PREFIX + "HOST", _text),
    "port": (PREFIX + "PORT", _port),
    "store": (PREFIX + "STORE", _store),
    "base_url": (PREFIX + "BASE_URL", _base_url),
    "hosts": (PREFIX + "HOSTS", _names),
    "body_bytes": (LIMIT_PREFIX + "BODY_BYTES", _count),
    "stored_designs": (LIMIT_PREFIX + "STORED_DESIGNS", _count),
    "seconds": (LIMIT_PREFIX + "SECONDS", _count),
    "sockets": (LIMIT_PREFIX + "SOCKETS", _count),
}
