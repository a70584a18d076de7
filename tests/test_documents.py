"""README, DEVELOPERS and CHANGELOG say what is there: every table is held against the code, both ways."""

from __future__ import annotations

import dataclasses
import json
import re
import shlex
import subprocess
import sys
import tomllib
from importlib.util import find_spec
from pathlib import Path
from typing import Any, get_args

import pytest

from engine.design import document as doc
from engine.design.assess import assess
from engine.design.document import Design
from engine.design.limits import Limits
from engine.design.measures import MEASURES
from engine.design.parse import parse_design
from engine.design.purposes import stage_for
from engine.design.transfer_function import CAUTIONS
from server.application import web_application
from server.export_kinds import EXPORTS
from server.services import Services
from server.settings import LIMIT_PREFIX, Settings

CLONE = Path(__file__).parents[1]
README = (CLONE / "README.md").read_text("utf-8")
DEVELOPERS = (CLONE / "DEVELOPERS.md").read_text("utf-8")
CHANGELOG = (CLONE / "CHANGELOG.md").read_text("utf-8")


def table(text: str, first_heading: str) -> list[list[str]]:
    """The rows below the heading row that starts with `first_heading`, cells stripped."""
    lines = iter(text.splitlines())
    for line in lines:
        if line.startswith(f"| {first_heading} |"):
            break
    else:
        raise LookupError(f"no table with the heading {first_heading!r}")
    next(lines)
    rows = []
    for line in lines:
        if not line.startswith("|"):
            break
        rows.append([cell.strip().replace("\\|", "|") for cell in re.split(r"(?<!\\)\|", line)[1:-1]])
    return rows


def in_ticks(text: str) -> list[str]:
    return re.findall(r"`([^`]+)`", text)


def kinds_of(union: Any) -> dict[str, type]:
    """The members of a discriminated union by their `kind`."""
    members = get_args(get_args(union)[0])
    return {get_args(member.model_fields["kind"].annotation)[0]: member for member in members}


# --- README -----------------------------------------------------------------------------------------------------


def test_the_settings_table_is_the_settings() -> None:
    told = {in_ticks(row[0])[0]: row[1] for row in table(README, "variable")}
    defaults = {field.name: getattr(Settings(), field.name) for field in dataclasses.fields(Settings)}
    bounds = {LIMIT_PREFIX + field.name.upper(): field.default for field in dataclasses.fields(Limits)}
    source = (CLONE / "server" / "settings.py").read_text("utf-8")
    named = set(re.findall(r'"""(LOOPWRIGHT_[A-Z_]+):', source))
    assert set(told) == named | set(bounds)
    assert len(named) == len(defaults) - 1, "each field but `limits` names its variable in its docstring"
    for variable, bound in bounds.items():
        assert told[variable] == str(bound)
    assert told["LOOPWRIGHT_HOST"] == defaults["host"]
    assert told["LOOPWRIGHT_PORT"] == str(defaults["port"])
    assert told["LOOPWRIGHT_MAX_BODY_BYTES"] == str(defaults["body_bytes"])
    assert told["LOOPWRIGHT_MAX_STORED_DESIGNS"] == str(defaults["stored_designs"])
    assert told["LOOPWRIGHT_MAX_SECONDS"] == str(defaults["seconds"])
    assert told["LOOPWRIGHT_MAX_SOCKETS"] == str(defaults["sockets"])


@pytest.mark.parametrize(("heading", "union"), [("model", doc.Model), ("stage", doc.Stage)])
def test_the_kinds_in_the_readme_are_those_of_the_document(heading: str, union: Any) -> None:
    rows = {in_ticks(row[0])[0]: in_ticks(row[1]) for row in table(README, heading)}
    kinds = kinds_of(union)
    assert set(rows) == set(kinds)
    for kind, fields in rows.items():
        own = set(kinds[kind].model_fields) - {"kind", "name", "enabled", "dead_time_s"}
        assert {name for name in fields if name.isidentifier()} == own, kind


def test_the_fields_of_a_design_are_all_told() -> None:
    told = {name for row in table(README, "field") for name in in_ticks(row[0])}
    assert told == set(Design.model_fields) - {"format"}


def test_the_measures_table_is_the_table_of_measures() -> None:
    told = {in_ticks(row[0])[0]: row[1:] for row in table(README, "measure")}
    assert list(told) == list(MEASURES)
    for name, (unit, what) in told.items():
        assert what == MEASURES[name].what
        assert unit == MEASURES[name].unit or unit.startswith("of the ")
    first = next(name for name, measure in MEASURES.items() if measure.per_frequency)
    assert all(measure.per_frequency for measure in list(MEASURES.values())[list(MEASURES).index(first) :])
    assert f"The measures from `{first}` on need a place" in README


def test_the_cautions_are_those_of_the_files() -> None:
    section = README.split("## Cautions")[1].split("\n## ")[0]
    words = " ".join(section.split())
    assert words.startswith(" ".join(CAUTIONS))
    assert words.endswith("is possible but says so in the file itself.")


def loopwright(*words: str) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "server.command_line", *words]
    return subprocess.run(command, capture_output=True, text=True, cwd=CLONE, timeout=60, check=False)


def test_commands_options_and_exports_are_there() -> None:
    told: dict[str, set[str]] = {}
    for row in table(README, "command"):
        words = [shlex.split(text) for text in in_ticks(row[0])]
        command = next((w[1] for w in words if len(w) > 1), "")
        options = {word for text in in_ticks(" ".join(row)) for word in text.split() if word.startswith("-")}
        told.setdefault(command, set()).update(options)
    there = set(re.findall(r"^    (\w+) ", loopwright("--help").stdout, re.MULTILINE))
    assert {command for command in told if not command.startswith("-")} == there
    for command in there:
        offered = set(re.findall(r"(?<![\w-])(--?[a-z][a-z-]*)", loopwright(command, "--help").stdout))
        assert told[command] == offered - {"-h", "--help"}, command
    exports = next(row[1] for row in table(README, "command") if "export" in row[0])
    assert set(EXPORTS) <= set(in_ticks(exports))


def test_the_exit_codes_are_the_contract() -> None:
    from server import command_line

    told = {int(row[0]): row[1].split(":")[0] for row in table(README, "exit code")}
    assert told == {
        command_line.MET: "every requirement met",
        command_line.NOT_MET: "a requirement not met",
        command_line.UNUSABLE: "unusable input",
        command_line.NOT_ASSESSABLE: "not assessable",
    }


WALK = README.split("## Five minutes")[1].split("\n## ")[0]


def test_the_walk_prints_what_check_prints() -> None:
    printed = loopwright("check", "demo_plants/falcon-pan.json")
    assert printed.returncode == 1
    assert printed.stdout.rstrip() in WALK


def test_the_walk_has_the_landing_demos_numbers() -> None:
    words = " ".join(WALK.split())
    document = json.loads((CLONE / "demo_plants" / "falcon-pan.json").read_text("utf-8"))
    lead = document["compensator"]["stages"][0]
    assert f"the o at {lead['zero_rad_s']:.2f} rad/s" in words
    lead["zero_rad_s"] = 8.0
    assessment = assess(parse_design(document))
    margin = assessment["requirements"][0]["reading"]["value"]
    assert "to 8.00 rad/s" in words
    assert f"The phase margin now reads {margin:.1f}°" in words
    assert assessment["headline"].rstrip(".").lower() in words
    document["compensator"]["stages"].append(stage_for(parse_design(document), "roll off noise").stage)
    short = [row["measure"] for row in assess(parse_design(document))["requirements"] if not row["met"]]
    assert "phase_margin_deg" in short
    lead["zero_rad_s"] = 5.4
    document["compensator"]["stages"].pop()
    too_far = {row["measure"]: row["case"] for row in assess(parse_design(document))["requirements"] if not row["met"]}
    assert too_far == {"peak_sensitivity": "300 mm lens"}


def test_pictures_and_links_lead_somewhere() -> None:
    for text in (README, DEVELOPERS, CHANGELOG):
        for target in re.findall(r"\]\(([^)#]+)\)", text):
            assert (CLONE / target).is_file(), target
    assert (CLONE / "web" / "pictures" / "workbench.png").stat().st_size < 400_000


# --- DEVELOPERS -------------------------------------------------------------------------------------------------


def test_the_routes_are_those_of_the_application(tmp_path: Path) -> None:
    services = Services.of(dataclasses.replace(Settings(), store=tmp_path / "links.sqlite"))
    try:
        app = web_application(services)
    finally:
        services.close()
    described = {f"{method.upper()} {path}" for path, methods in app.openapi()["paths"].items() for method in methods}
    # Pages and the socket are not in the description; their decorators are read instead.
    sources = "".join(path.read_text("utf-8") for path in (CLONE / "server").glob("*.py"))
    pages = {f"GET {path}" for path in re.findall(r'@router\.api_route\("([^"]+)"', sources)} - {
        "GET /static/plotly.min.js"
    }
    sockets = {f"WebSocket {path}" for path in re.findall(r'@router\.websocket\("([^"]+)"', sources)}
    there = described | pages | sockets | {f"GET {app.openapi_url}"}
    assert {in_ticks(row[0])[0] for row in table(DEVELOPERS, "route")} == there


def test_files_that_are_named_exist() -> None:
    names = set(in_ticks(DEVELOPERS)) | set(in_ticks(README))
    everywhere = {path.name for folder in ("engine", "server", "web", "tests") for path in (CLONE / folder).rglob("*")}
    for name in names:
        if re.fullmatch(r"(engine|server|web|tests|demo_plants|static|\.ci)/[\w./-]*", name):
            assert (CLONE / name).exists() or (CLONE / "web" / name).exists(), name
        elif re.fullmatch(r"\w+\.(py|js)", name):
            assert name in everywhere, name


def test_the_verbs_can_be_run() -> None:
    verbs = {row[0]: in_ticks(row[1]) for row in table(DEVELOPERS, "verb")}
    assert {"format", "lint", "types", "test", "bench", "pictures"} <= set(verbs)
    for command in (command for commands in verbs.values() for command in commands):
        words = command.split()
        if "-m" in words:
            assert find_spec(words[words.index("-m") + 1]) is not None, command
    ci = (CLONE / ".ci" / "run").read_text("utf-8")
    for verb in ("ruff format", "ruff check", "mypy", "python3 tests"):
        assert verb in ci


def test_the_changes_begin_with_this_version() -> None:
    version = tomllib.loads((CLONE / "pyproject.toml").read_text("utf-8"))["project"]["version"]
    headings = re.findall(r"^## (\S+)", CHANGELOG, re.MULTILINE)
    assert headings[0] == version
