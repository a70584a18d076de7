"""Layers proven: each floor imports only downwards, and the engine pulls in nothing of the web."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

from tests.workbench_process import CLONE

# From architecture.md's table of floors, lowest first. engine.errors stands beside floor 0.
_FLOORS = (("engine.model", "engine.errors"), ("engine.loop",), ("engine.realise",), ("engine.design",), ("server",))
_WEB = {"fastapi", "starlette", "uvicorn", "websockets", "jinja2", "httpx", "sqlite3", "asyncio", "http", "socket"}
_NUMERICS = {"scipy", "mpmath", "sympy"}
_DISK_AND_CLOCK = {"os", "pathlib", "shutil", "tempfile", "time", "datetime", "sqlite3", "random", "secrets"}


def _sources(*packages: str) -> list[Path]:
    return sorted(path for package in packages for path in (CLONE / package).rglob("*.py"))


def _name_of(path: Path) -> str:
    return ".".join(path.relative_to(CLONE).with_suffix("").parts).removesuffix(".__init__")


def _imports(path: Path) -> set[str]:
    """Full names of everything a module imports, also inside functions."""
    found: set[str] = set()
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{path}: relative import; write the whole name"
            found |= {f"{node.module}.{alias.name}" for alias in node.names}
    return found


def _floor_of(name: str) -> int | None:
    for level, packages in enumerate(_FLOORS):
        if any(name == package or name.startswith(f"{package}.") for package in packages):
            return level
    return None


def _id(path: Path) -> str:
    return _name_of(path)


@pytest.mark.parametrize("path", _sources("engine", "server"), ids=_id)
def test_no_module_imports_a_higher_floor(path: Path) -> None:
    own = _floor_of(_name_of(path))
    if own is None:
        assert _name_of(path) == "engine"
        own = -1
    for name in _imports(path):
        level = _floor_of(name)
        assert level is None or level <= own, f"{_name_of(path)} reaches up to {name}"
        assert name.partition(".")[0] not in ("tests", "web", "demo_plants")


@pytest.mark.parametrize("path", _sources("engine"), ids=_id)
def test_the_engine_knows_no_web_no_disk_no_clock(path: Path) -> None:
    roots = {name.partition(".")[0] for name in _imports(path)}
    assert not roots & (_WEB | _DISK_AND_CLOCK)
    called = {node.func.id for node in ast.walk(ast.parse(path.read_text(encoding="utf-8")))
              if isinstance(node, ast.Call) and isinstance(node.func, ast.Name)}  # fmt: skip
    assert not called & {"open", "print", "input", "eval", "exec", "compile", "__import__"}


@pytest.mark.parametrize("path", _sources("server"), ids=_id)
def test_the_server_computes_nothing(path: Path) -> None:
    assert not {name.partition(".")[0] for name in _imports(path)} & _NUMERICS


def test_importing_all_of_the_engine_loads_no_web_package() -> None:
    modules = [_name_of(path) for path in _sources("engine")]
    assert len(modules) > 20
    code = (
        "import importlib, sys\n"
        f"for name in {modules!r}: importlib.import_module(name)\n"
        "web = {'fastapi', 'starlette', 'uvicorn', 'websockets', 'jinja2', 'server', 'plotly'}\n"
        "print(sorted(web & {name.partition('.')[0] for name in sys.modules}))"
    )
    done = subprocess.run([sys.executable, "-c", code], cwd=CLONE, capture_output=True, text=True, timeout=120)
    assert (done.stdout.strip(), done.stderr) == ("[]", "")


@pytest.mark.parametrize("name", ["server/__init__.py", "server/__main__.py", "server/clone_environment.py",
                                  "tests/__main__.py", "tests/browser_place.py"])  # fmt: skip
def test_an_old_python_can_read_the_bootstraps(name: str) -> None:
    path = CLONE / name
    ast.parse(path.read_text(encoding="utf-8"), feature_version=(3, 6))
    own = {"server.command_line.main", "server.clone_environment", "tests.browser_place"}
    standard = {name for name in _imports(path) if name.partition(".")[0] in sys.stdlib_module_names}
    assert _imports(path) - standard <= own
