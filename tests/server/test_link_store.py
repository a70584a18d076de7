"""The link store: nothing acknowledged is lost, nothing is found without its token, trouble is told in one line."""

from __future__ import annotations

import os
import re
import signal
import sqlite3
import subprocess
import sys
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import pytest

from server.link_store import LinkStore, StoreError
from tests.workbench_process import CLONE

_WRITER = """
import sys
from pathlib import Path
from server.link_store import LinkStore
store = LinkStore(Path(sys.argv[1]), 1_000_000)
number = 0
while True:
    number += 1
    document = f"{sys.argv[2]}-{number}-" + "x" * 5000
    print(store.put(document, "0" * 64).token, document[:40], flush=True)
"""


@pytest.fixture
def place(tmp_path: Path) -> Path:
    return tmp_path / "folder" / "links.sqlite"


@pytest.fixture
def store(place: Path) -> LinkStore:
    return LinkStore(place, 1000)


def test_a_design_comes_back_as_it_was_stored(store: LinkStore) -> None:
    ticket = store.put('{"title":"Gier ψ"}', "ab" * 32)
    found = store.get(ticket.token)
    assert found is not None
    assert (found.document, found.design_sha256) == ('{"title":"Gier ψ"}', "ab" * 32)
    assert re.fullmatch(r"20\d\d-\d\d-\d\dT\d\d:\d\d:\d\d\+00:00", found.stored_at)


def test_tokens_carry_128_bits_or_more_and_never_repeat(store: LinkStore) -> None:
    tickets = [store.put("{}", "0" * 64) for _ in range(50)]
    for secret in [*(ticket.token for ticket in tickets), *(ticket.withdraw_key for ticket in tickets)]:
        assert re.fullmatch(r"[A-Za-z0-9_-]{22,}", secret)  # 6 bits a character
    assert len({ticket.token for ticket in tickets} | {ticket.withdraw_key for ticket in tickets}) == 100


def test_unknown_tokens_find_nothing(store: LinkStore) -> None:
    store.put("{}", "0" * 64)
    for token in ("", "nothing", "%", "' OR 1=1 --", "x" * 100_000, "a\0b"):
        assert store.get(token) is None


def test_only_its_key_withdraws_a_design(store: LinkStore) -> None:
    ticket, other = store.put("{}", "0" * 64), store.put("{}", "1" * 64)
    assert store.withdraw(ticket.token, other.withdraw_key) == "wrong key"
    assert store.withdraw(ticket.token, "") == "wrong key"
    assert store.get(ticket.token) is not None
    assert store.withdraw("nothing", ticket.withdraw_key) == "unknown"
    assert store.withdraw(ticket.token, ticket.withdraw_key) == "withdrawn"
    assert store.get(ticket.token) is None
    assert store.get(other.token) is not None
    assert store.withdraw(ticket.token, ticket.withdraw_key) == "unknown"


def test_the_file_holds_no_withdraw_key(store: LinkStore, place: Path) -> None:
    ticket = store.put("{}", "0" * 64)
    kept = b"".join(file.read_bytes() for file in place.parent.iterdir())
    assert ticket.token.encode() in kept
    assert ticket.withdraw_key.encode() not in kept


def test_a_commit_is_flushed_to_the_disk(store: LinkStore, place: Path) -> None:
    store.put("{}", "0" * 64)
    with store._connection() as db:
        assert db.execute("PRAGMA synchronous").fetchone() == (2,)  # FULL, by the SQLite documentation of the pragma
        assert db.execute("PRAGMA journal_mode").fetchone() == ("wal",)


def test_a_full_store_takes_no_more(place: Path) -> None:
    store = LinkStore(place, 2)
    first = store.put("{}", "0" * 64)
    store.put("{}", "0" * 64)
    with pytest.raises(StoreError, match="holds 2 designs") as raised:
        store.put("{}", "0" * 64)
    assert raised.value.full
    store.withdraw(first.token, first.withdraw_key)
    store.put("{}", "0" * 64)


def test_killing_writers_loses_nothing_acknowledged(place: Path) -> None:
    for round_number in range(3):
        writers = [
            subprocess.Popen(
                [sys.executable, "-c", _WRITER, str(place), f"{round_number}{name}"],
                cwd=CLONE, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True,
            )
            for name in "ab"
        ]  # fmt: skip
        acknowledged = [writer.stdout.readline() for _ in range(15) for writer in writers]
        for writer in writers:
            os.kill(writer.pid, signal.SIGKILL)
        for writer in writers:
            with writer:
                acknowledged += writer.stdout.readlines()
                assert writer.stderr.read() == ""
        complete = [line.split() for line in acknowledged if line.endswith("\n")]
        assert len(complete) >= 30
        store = LinkStore(place, 1_000_000)
        for token, beginning in complete:
            found = store.get(token)
            assert found is not None, f"round {round_number}: {token} is lost"
            assert found.document.startswith(beginning)
            assert len(found.document) > 5000


def test_several_threads_and_stores_write_at_once(place: Path) -> None:
    stores = [LinkStore(place, 1000) for _ in range(4)]
    with ThreadPoolExecutor(4) as threads:
        tickets = list(threads.map(lambda number: stores[number % 4].put(str(number), "0" * 64), range(60)))
    documents = [found.document for ticket in tickets if (found := stores[0].get(ticket.token))]
    assert documents == [str(number) for number in range(60)]


def test_a_damaged_file_is_told(store: LinkStore, place: Path) -> None:
    store.put("x" * 50_000, "0" * 64)
    whole = place.read_bytes()
    place.write_bytes(whole[:4096] + b"\xff" * (len(whole) - 4096))
    with pytest.raises(StoreError, match="damaged"):
        store.put("{}", "0" * 64)


def test_another_kind_of_file_is_told_and_left_alone(place: Path) -> None:
    place.parent.mkdir()
    place.write_text("these are my notes, and no store " * 100)
    with pytest.raises(StoreError, match=r"not a link store.*LOOPWRIGHT_STORE"):
        LinkStore(place, 10).put("{}", "0" * 64)
    assert place.read_text().startswith("these are my notes")


def test_a_folder_in_the_place_of_the_file_is_told(place: Path) -> None:
    place.mkdir(parents=True)
    with pytest.raises(StoreError, match="cannot be opened"):
        LinkStore(place, 10).put("{}", "0" * 64)


def test_a_file_in_the_place_of_the_folder_is_told(place: Path) -> None:
    place.parent.write_text("")
    with pytest.raises(StoreError, match="cannot be reached"):
        LinkStore(place, 10).put("{}", "0" * 64)


def test_a_store_of_a_later_version_is_told(store: LinkStore, place: Path) -> None:
    store.check()
    with sqlite3.connect(place) as db:
        db.execute("PRAGMA user_version = 99")
    db.close()
    with pytest.raises(StoreError, match="later version"):
        store.get("x")


@pytest.mark.parametrize(
    ("mark", "told", "full"), [("SQLITE_FULL", "disk is full", True), ("SQLITE_READONLY_DBMOVED", "read-only", False)]
)
def test_trouble_with_the_disk_is_told(
    store: LinkStore, monkeypatch: pytest.MonkeyPatch, mark: str, told: str, full: bool
) -> None:
    # Neither can be had for real here: root may write everywhere, and disks are not filled for a test.
    error = sqlite3.OperationalError("no")
    error.sqlite_errorname = mark

    def failing(*_: object, **__: object) -> None:
        raise error

    monkeypatch.setattr(sqlite3, "connect", failing)
    with pytest.raises(StoreError, match=told) as raised:
        store.put("{}", "0" * 64)
    assert raised.value.full is full


def test_a_disk_that_is_full_loses_nothing(store: LinkStore, place: Path) -> None:
    """A bound on the file's pages makes SQLite fail as a full disk does."""
    kept = store.put("{}", "0" * 64)
    prepare = store._prepare

    def bounded(db: sqlite3.Connection) -> None:
        prepare(db)
        db.execute("PRAGMA max_page_count = 3")

    store._prepare = bounded  # type: ignore[method-assign]
    with pytest.raises(StoreError, match="disk is full") as raised:
        store.put("x" * 100_000, "0" * 64)
    assert raised.value.full
    assert LinkStore(place, 10).get(kept.token) is not None
