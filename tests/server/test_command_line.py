"""The command: the table, the files, the exit codes, and one line for every mistake."""

from __future__ import annotations

import contextlib
import io
import json
import os
import re
import signal
import socket
import subprocess
import sys
from pathlib import Path
from typing import Any
from unittest import mock

import pytest

from server import command_line
from tests.workbench_process import CLONE

_TIMEOUT_S = 60


def _run(*arguments: str | Path, given: str | bytes = "", **environment: str) -> subprocess.CompletedProcess[str]:
    """Run the command in this process, with streams of its own; any exception that gets out fails the test."""
    streams = [io.TextIOWrapper(io.BytesIO(), encoding="ascii") for _ in range(2)]
    standard_input = io.TextIOWrapper(io.BytesIO(given.encode() if isinstance(given, str) else given))
    with (
        contextlib.redirect_stdout(streams[0]),
        contextlib.redirect_stderr(streams[1]),
        mock.patch("sys.stdin", standard_input),
        mock.patch.dict(os.environ, environment),
    ):
        try:
            code: object = command_line.main([str(argument) for argument in arguments])
        except SystemExit as ended:  # --help and --version
            code = ended.code
    written = []
    for stream in streams:
        stream.flush()
        written.append(stream.buffer.getvalue().decode("utf-8"))
    return subprocess.CompletedProcess(arguments, code, *written)


def _run_outside(*arguments: str | Path, **environment: str) -> subprocess.CompletedProcess[str]:
    """Run the command as a user does, in a process of its own."""
    done = subprocess.run(
        [sys.executable, "-m", "server", *map(str, arguments)], cwd=CLONE, capture_output=True, timeout=_TIMEOUT_S,
        env={**os.environ, **environment},
    )  # fmt: skip
    out, err = done.stdout.decode("utf-8"), done.stderr.decode("utf-8")
    assert "Traceback" not in out + err
    return subprocess.CompletedProcess(arguments, done.returncode, out, err)


def _assert_one_line(done: subprocess.CompletedProcess[str], told: str) -> None:
    assert (done.returncode, done.stdout) == (2, "")
    assert re.fullmatch(rf"loopwright: .*{told}.*\n", done.stderr), done.stderr


@pytest.fixture
def file(tmp_path: Path, plain_design: dict[str, Any]) -> Path:
    path = tmp_path / "axis.json"
    path.write_text(json.dumps(plain_design), encoding="utf-8")
    return path


def _change(file: Path, **fields: Any) -> None:
    file.write_text(json.dumps({**json.loads(file.read_text()), **fields}), encoding="utf-8")


# --- check ------------------------------------------------------------------------------------------------------


def test_check_prints_the_sheet(file: Path) -> None:
    done = _run("check", file)
    assert (done.returncode, done.stderr) == (0, "")
    lines = done.stdout.splitlines()
    assert lines[0] == "Bench axis"
    assert lines[1] == "All 3 requirements met."
    heading = next(line for line in lines if "requirement" in line and "plant case" in line)
    rows = [line for line in lines if line.startswith("met ")]
    assert len(rows) == 3
    for words in ("limit", "plant case"):  # the columns stand under their headings
        column = heading.index(words)
        assert all(row[column - 1] == " " and row[column] != " " for row in rows)
    assert "at least 45°" in rows[0]
    assert lines[-1] == "verdict: met"
    assert all(line == line.rstrip() for line in lines)


@pytest.mark.parametrize(
    ("change", "code", "verdict"),
    [
        ({}, 0, "met"),
        ({"requirements": [{"measure": "phase_margin_deg", "at_least": 170}]}, 1, "not met"),
        ({"compensator": {"gain": -1.0}}, 1, "not met"),
        ({"implementation": {"kind": "digital", "period_s": 0.001}}, 3, "not assessable"),
        ({"requirements": [{"measure": "gain_margin_db", "at_least": 6}]}, 0, "met"),  # nothing limits it: met
    ],
)
def test_the_exit_code_tells_the_verdict(file: Path, change: dict[str, Any], code: int, verdict: str) -> None:
    _change(file, **change)
    done = _run("check", file)
    assert (done.returncode, done.stderr) == (code, "")
    assert done.stdout.splitlines()[-1] == f"verdict: {verdict}"
    as_json = _run("check", file, "--json")
    assert as_json.returncode == code
    assert json.loads(as_json.stdout)["verdict"] == verdict


def test_a_shortfall_is_told_with_its_case(file: Path) -> None:
    _change(file, requirements=[{"measure": "phase_margin_deg", "at_least": 170}])
    row = next(line for line in _run("check", file).stdout.splitlines() if line.startswith("NOT MET"))
    assert re.search(r"at least 170°  +\S+°  +−\S+  +(empty|loaded)  +\S+° short$", row)


def test_check_json_has_curves_on_request(file: Path) -> None:
    plain = json.loads(_run("check", file, "--json").stdout)
    with_curves = json.loads(_run("check", file, "--json", "--curves").stdout)
    assert plain["format"] == "loopwright-assessment/1"
    assert "curves" not in plain
    assert len(with_curves.pop("curves")["magnitude_db"]) == 2
    assert with_curves == plain
    _assert_one_line(_run("check", file, "--curves"), "--curves goes with --json")


def test_a_dash_is_standard_input(file: Path) -> None:
    assert _run("check", "-", given=file.read_text()).stdout == _run("check", file).stdout


def test_every_demo_can_be_checked(demo_design: dict[str, Any]) -> None:
    done = _run("check", "-", given=json.dumps(demo_design))
    assert done.returncode in (0, 1)
    assert done.stdout.startswith(demo_design["title"])


def test_other_encodings_of_the_terminal_do_no_harm(file: Path) -> None:
    done = _run_outside("check", file, PYTHONIOENCODING="ascii", PYTHONUTF8="0")
    assert "°" in done.stdout
    assert done.stdout == _run("check", file).stdout


# --- files that are none ----------------------------------------------------------------------------------------


def test_files_that_cannot_be_used_are_told_in_one_line(tmp_path: Path, file: Path) -> None:
    _assert_one_line(_run("check", tmp_path / "nothing.json"), "nothing.json: cannot be read: No such file")
    _assert_one_line(_run("check", tmp_path), "cannot be read: Is a directory")
    _assert_one_line(_run("check", "a\nb"), "cannot be read: No such file")
    binary = tmp_path / "binary"
    binary.write_bytes(bytes(range(128, 256)) * 1000)
    _assert_one_line(_run("check", binary), "binary: must be JSON in UTF-8, byte 0 is not")
    _assert_one_line(_run("check", "/dev/zero"), "is too large, at most 2000000 bytes")
    _assert_one_line(_run("check", "-"), "standard input: must be JSON, is empty")
    _change(file, titel="x", notez="y")
    _assert_one_line(_run("check", file), r"axis.json: titel: .* \(and 1 more\)")
    _assert_one_line(_run("check", file, LOOPWRIGHT_MAX_BODY_BYTES="10"), "at most 10 bytes")
    _assert_one_line(_run("check", file, LOOPWRIGHT_MAX_STAGES="x"), "LOOPWRIGHT_MAX_STAGES must be a whole number")


def test_limits_are_settings_here_too(file: Path) -> None:
    _assert_one_line(_run("check", file, LOOPWRIGHT_MAX_PLANT_CASES="1"), "plant_cases: has 2 entries, at most 1")


# --- export -----------------------------------------------------------------------------------------------------


def test_export_writes_the_transfer_function(file: Path, tmp_path: Path) -> None:
    out = tmp_path / "handed-over.json"
    done = _run("export", file, "--as", "transfer-function", "-o", out)
    assert (done.returncode, done.stdout, done.stderr) == (0, "", "")
    printed = _run("export", file, "--as", "transfer-function")
    assert out.read_text(encoding="utf-8") == printed.stdout
    assert json.loads(printed.stdout)["format"] == "loopwright-transfer-function/1"
    assert out.stat().st_mode & 0o777 == file.stat().st_mode & 0o777  # as any new file of this user
    assert sorted(path.name for path in tmp_path.iterdir()) == ["axis.json", "handed-over.json"]


def test_export_writes_the_curves(file: Path, tmp_path: Path) -> None:
    out = tmp_path / "curves.csv"
    assert _run("export", "-", "--as", "curves", "-o", out, given=file.read_text()).returncode == 0
    text = out.read_bytes().decode("utf-8")
    assert text.startswith("case,curve,unit,axis,axis_unit,at,value\r\n")  # RFC 4180, section 2: CRLF
    assert text == _run("export", file, "--as", "curves").stdout


def test_an_old_file_stays_when_the_new_one_cannot_be_written(file: Path, tmp_path: Path) -> None:
    out = tmp_path / "out"
    out.mkdir()
    _assert_one_line(_run("export", file, "--as", "curves", "-o", out), "cannot be written")
    _assert_one_line(_run("export", file, "--as", "curves", "-o", tmp_path / "no" / "x"), "No such file")
    kept = tmp_path / "kept.csv"
    kept.write_text("kept")
    _change(file, titel="x")
    assert _run("export", file, "--as", "curves", "-o", kept).returncode == 2
    assert kept.read_text() == "kept"


def test_export_takes_a_device_for_its_file(file: Path) -> None:
    assert _run("export", file, "--as", "curves", "-o", "/dev/null").returncode == 0
    assert not Path("/dev/null").is_file()


@pytest.mark.parametrize("kind", ["c", "structured-text", "python", "netlist"])
def test_later_exports_are_refused_by_name(file: Path, kind: str) -> None:
    _assert_one_line(_run("export", file, "--as", kind), f"the export {kind} is not in this version yet")


# --- everything else one can type -------------------------------------------------------------------------------


@pytest.mark.parametrize("command", ["propose", "report"])
def test_later_commands_are_refused_by_name(file: Path, command: str) -> None:
    _assert_one_line(_run(command, file, "-o", "x"), f"{command} is not in this version yet")


@pytest.mark.parametrize(
    "arguments",
    [("nothing",), ("check",), ("check", "a", "b"), ("export", "x"), ("export", "x", "--as"), ("check", "x", "--more"),
     ("--port", "x"), ("--port", "70000"), ("--port", "-1"), ("serve", "x"), ("export", "x", "--as", "y")],
)  # fmt: skip
def test_wrong_arguments_are_told_in_one_line(arguments: tuple[str, ...]) -> None:
    _assert_one_line(_run(*arguments), "")


def test_help_and_version() -> None:
    done = _run("--help")
    assert done.returncode == 0
    for word in ("serve", "check", "export", "Exit codes"):
        assert word in done.stdout
    assert re.fullmatch(r"loopwright \S+\n", _run("--version").stdout)
    assert "--no-browser" in _run("serve", "--help").stdout


def test_a_reader_that_has_had_enough_is_no_error(file: Path) -> None:
    with subprocess.Popen(
        [sys.executable, "-m", "server", "export", str(file), "--as", "curves"], cwd=CLONE,
        stdout=subprocess.PIPE, stderr=subprocess.PIPE,
    ) as process:  # fmt: skip
        process.stdout.read(10)
        process.stdout.close()
        assert process.stderr.read() == b""


def test_a_surprise_is_one_line_too(
    file: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def broken(*_: object) -> None:
        raise ZeroDivisionError("inside")

    monkeypatch.setattr("engine.design.assess.assess", broken)
    assert command_line.main(["check", str(file)]) == 2
    told = capsys.readouterr().err
    assert told.startswith("loopwright: something went wrong in Loopwright itself: ZeroDivisionError: inside")
    assert told.count("\n") == 1


# --- serve ------------------------------------------------------------------------------------------------------


def test_a_port_that_is_taken_is_told_in_one_line(tmp_path: Path) -> None:
    with socket.create_server(("127.0.0.1", 0)) as taken:
        port = taken.getsockname()[1]
        for arguments in (("serve", "--port", str(port)), (f"--port={port}",)):
            done = _run_outside(*arguments, "--no-browser", LOOPWRIGHT_STORE=str(tmp_path / "links.sqlite"))
            _assert_one_line(done, rf"port {port} is taken; choose another with --port")


@pytest.mark.parametrize("host", ["no.such.host.invalid", "192.0.2.1", "x" * 300])
def test_a_host_that_is_none_is_told_in_one_line(host: str, tmp_path: Path) -> None:
    done = _run("--host", host, "--port", "0", "--no-browser", LOOPWRIGHT_STORE=str(tmp_path / "links.sqlite"))
    _assert_one_line(done, "the host")


@pytest.mark.parametrize("sign", [signal.SIGINT, signal.SIGTERM])
def test_it_stops_when_asked_without_a_word(sign: signal.Signals, tmp_path: Path) -> None:
    with subprocess.Popen(
        [sys.executable, "-m", "server", "--port", "0", "--no-browser"], cwd=CLONE, text=True,
        stdout=subprocess.PIPE, stderr=subprocess.PIPE,
        env={**os.environ, "LOOPWRIGHT_STORE": str(tmp_path / "links.sqlite")},
    ) as process:  # fmt: skip
        assert "is open at http://127.0.0.1:" in process.stdout.readline()
        process.send_signal(sign)
        rest, told = process.communicate(timeout=_TIMEOUT_S)
        assert (rest, told) == ("", "")
        assert process.returncode in (0, 130, -sign)
