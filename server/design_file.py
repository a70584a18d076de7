"""Design files on the disk: read one, write a file as a whole or not at all."""

from __future__ import annotations

import os
import sys
import tempfile
from pathlib import Path

from engine.design.document import Design
from engine.design.parse import parse_design
from engine.errors import DesignError, LoopwrightError
from server.json_text import parse_json
from server.settings import Settings


class FileError(LoopwrightError):
    """A file that cannot be read or written, or does not hold a design."""


def read_design(name: str) -> Design:
    """The design in a file, `-` for standard input; FileError says which file and which field is wrong."""
    settings = Settings.from_environment()
    shown = "standard input" if name == "-" else name
    text = _read(name, shown, settings.body_bytes)
    try:
        return parse_design(parse_json(text), settings.limits)
    except DesignError as error:
        more = len(error.faults) - 1
        also = f" (and {more} more)" if more else ""
        raise FileError(f"{shown}: {error.faults[0]}{also}") from None


def _read(name: str, shown: str, most: int) -> bytes:
    try:
        if name == "-":
            text = sys.stdin.buffer.read(most + 1)
        else:
            with open(name, "rb") as file:
                text = file.read(most + 1)
    except (OSError, ValueError) as error:
        raise FileError(f"{shown}: cannot be read: {_reason(error)}") from None
    if len(text) > most:
        raise FileError(f"{shown}: is too large, at most {most} bytes are taken (LOOPWRIGHT_MAX_BODY_BYTES)")
    return text


def write_whole(name: str, text: str) -> None:
    """Write a text file so that nobody ever finds half of it."""
    place = Path(name)
    try:
        if place.exists() and not place.is_file():  # a pipe or a device cannot be replaced
            place.write_text(text, encoding="utf-8", newline="")
            return
        handle, temporary = tempfile.mkstemp(prefix=f".{place.name}.", dir=place.parent)
        try:
            with os.fdopen(handle, "w", encoding="utf-8", newline="") as file:
                file.write(text)
            os.chmod(temporary, place.stat().st_mode & 0o777 if place.exists() else 0o666 & ~_umask())
            os.replace(temporary, place)
        except BaseException:
            os.unlink(temporary)
            raise
    except (OSError, ValueError) as error:
        raise FileError(f"{name}: cannot be written: {_reason(error)}") from None


def _umask() -> int:
    mask = os.umask(0)
    os.umask(mask)
    return mask


def _reason(error: OSError | ValueError) -> str:
    return (error.strerror or str(error)) if isinstance(error, OSError) else str(error)
