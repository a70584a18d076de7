"""The link store: shared designs in one SQLite file, each under a token that cannot be guessed.

A stored design never changes. It is on disk before its token is told to anyone: WAL with synchronous=FULL
flushes the log at every commit, so killing the process at any moment loses nothing acknowledged.
"""

from __future__ import annotations

import hashlib
import hmac
import secrets
import sqlite3
from collections.abc import Iterator
from contextlib import closing, contextmanager
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Literal

from engine.errors import LoopwrightError

_TOKEN_BYTES = 18  # 144 bits, 24 characters
_KEY_BYTES = 24
_WAIT_FOR_WRITERS_S = 20.0
_SCHEMA_VERSION = 1
_SCHEMA = """
CREATE TABLE IF NOT EXISTS design (
    token TEXT PRIMARY KEY,
    document TEXT NOT NULL,
    design_sha256 TEXT NOT NULL,
    withdraw_key_sha256 BLOB NOT NULL,
    stored_at TEXT NOT NULL
) WITHOUT ROWID, STRICT
"""


class StoreError(LoopwrightError):
    """The store cannot be used now; the message says why, without naming places on the disk."""

    def __init__(self, what: str, *, full: bool = False) -> None:
        super().__init__(what)
        self.full = full


@dataclass(frozen=True, slots=True)
class StoredDesign:
    """One shared design, as it was handed in."""

    document: str
    """Its JSON text."""
    design_sha256: str
    stored_at: str
    """UTC, ISO 8601."""


@dataclass(frozen=True, slots=True)
class Ticket:
    """What the one who shares a design gets, once."""

    token: str
    withdraw_key: str
    """Known to nobody else: the store keeps its hash only."""


class LinkStore:
    """A file of shared designs. Any number of processes may use the same file at the same time.

    Each call opens the file anew. That costs a fraction of a millisecond, and no call can go on writing into a
    file that was moved away or replaced in the meantime.
    """

    def __init__(self, path: Path, most_designs: int) -> None:
        self._path = path
        self._most = most_designs

    def put(self, document: str, design_sha256: str) -> Ticket:
        """Store a design for good; when this returns, it is on disk."""
        ticket = Ticket(secrets.token_urlsafe(_TOKEN_BYTES), secrets.token_urlsafe(_KEY_BYTES))
        row = (ticket.token, document, design_sha256, _hashed(ticket.withdraw_key), _now())
        with self._connection() as db:
            db.execute("BEGIN IMMEDIATE")  # count and insert as one step among several writers
            (count,) = db.execute("SELECT count(*) FROM design").fetchone()
            if count >= self._most:
                raise StoreError(f"holds {count} designs and takes no more; withdraw some", full=True)
            db.execute("INSERT INTO design VALUES (?, ?, ?, ?, ?)", row)
            db.execute("COMMIT")
        return ticket

    def get(self, token: str) -> StoredDesign | None:
        """The design under a token; None if there is none."""
        with self._connection() as db:
            found = db.execute(
                "SELECT document, design_sha256, stored_at FROM design WHERE token = ?", (token,)
            ).fetchone()
        return StoredDesign(*found) if found else None

    def withdraw(self, token: str, withdraw_key: str) -> Literal["withdrawn", "unknown", "wrong key"]:
        """Remove a design, if the key is the one handed out with its token."""
        with self._connection() as db:
            db.execute("BEGIN IMMEDIATE")
            found = db.execute("SELECT withdraw_key_sha256 FROM design WHERE token = ?", (token,)).fetchone()
            if found is None:
                return "unknown"
            if not hmac.compare_digest(found[0], _hashed(withdraw_key)):
                return "wrong key"
            db.execute("DELETE FROM design WHERE token = ?", (token,))
            db.execute("COMMIT")
        return "withdrawn"

    def check(self) -> None:
        """Raise StoreError if designs cannot be stored here."""
        with self._connection() as db:
            db.execute("BEGIN IMMEDIATE")
            db.execute("ROLLBACK")

    @contextmanager
    def _connection(self) -> Iterator[sqlite3.Connection]:
        try:
            self._path.parent.mkdir(mode=0o700, parents=True, exist_ok=True)
            # Leaving the block closes the connection, which rolls back whatever was not committed.
            with closing(sqlite3.connect(self._path, timeout=_WAIT_FOR_WRITERS_S, isolation_level=None)) as db:
                self._prepare(db)
                yield db
        except (sqlite3.Error, OSError) as error:
            raise _explained(error) from error

    def _prepare(self, db: sqlite3.Connection) -> None:
        (version,) = db.execute("PRAGMA user_version").fetchone()
        db.execute("PRAGMA synchronous = FULL")
        if version == _SCHEMA_VERSION:
            return
        if version > _SCHEMA_VERSION:
            raise StoreError(f"was written by a later version (its format is {version}); update Loopwright")
        db.execute("PRAGMA journal_mode = WAL")
        db.execute("BEGIN IMMEDIATE")
        db.execute(_SCHEMA)
        db.execute(f"PRAGMA user_version = {_SCHEMA_VERSION}")
        db.execute("COMMIT")


def _hashed(withdraw_key: str) -> bytes:
    # The key is 192 random bits: a slow hash would protect nothing more.
    return hashlib.sha256(withdraw_key.encode(errors="replace")).digest()


def _now() -> str:
    return datetime.now(UTC).isoformat(timespec="seconds")


_CAUSES = {
    "SQLITE_BUSY": "is busy with other writers; try again",
    "SQLITE_CANTOPEN": "cannot be opened; see that its folder exists and may be written",
    "SQLITE_CORRUPT": "is damaged; restore it from a backup, or move it away to start a new one",
    "SQLITE_FULL": "cannot grow: the disk is full",
    "SQLITE_NOTADB": "is not a link store; see that LOOPWRIGHT_STORE names the right file",
    "SQLITE_PERM": "may not be written by this user",
    "SQLITE_READONLY": "is read-only; make the file and its folder writable",
}


def _explained(error: sqlite3.Error | OSError) -> StoreError:
    if isinstance(error, OSError):
        return StoreError(f"cannot be reached: {error.strerror or error}")
    name = getattr(error, "sqlite_errorname", "")
    for start, what in _CAUSES.items():  # extended names begin with the plain one
        if name.startswith(start):
            return StoreError(what, full=start == "SQLITE_FULL")
    return StoreError(f"cannot be used: {error}")
