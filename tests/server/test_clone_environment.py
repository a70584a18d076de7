"""The bootstraps: set up once, say one clear line when that cannot be."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

from tests.workbench_process import CLONE

_TIMEOUT_S = 120


@pytest.fixture
def clone(tmp_path: Path) -> Path:
    """The bootstraps in a folder of their own, for a distribution that needs nothing."""
    folder = tmp_path / "clone"
    (folder / "server").mkdir(parents=True)
    (folder / "tests").mkdir()
    for name in ("server/__init__.py", "server/__main__.py", "server/clone_environment.py",
                 "tests/__main__.py", "tests/browser_place.py"):  # fmt: skip
        shutil.copy(CLONE / name, folder / name)
    (folder / "pyproject.toml").write_text('[project]\nname = "nothing"\nversion = "1"\n')
    return folder


def _run(clone: Path, code: str = "", *arguments: str, **environment: str) -> subprocess.CompletedProcess[str]:
    """Run a bootstrap as `python3 server` does, after some lines that change what it finds."""
    start = f"import sys\n{code}\nimport runpy\nsys.argv = {list(arguments)!r}\n"
    start += f"sys.path.insert(0, {arguments[0]!r})\nrunpy.run_path({arguments[0]!r}, run_name='__main__')"
    return subprocess.run(
        [sys.executable, "-c", start], cwd=clone, capture_output=True, text=True, timeout=_TIMEOUT_S,
        env={**os.environ, "PIP_CONFIG_FILE": os.devnull, **environment},
    )  # fmt: skip


@pytest.mark.parametrize("which", ["server", "tests"])
def test_a_python_that_is_too_old_is_told(clone: Path, which: str) -> None:
    done = _run(clone, "sys.version_info = (3, 9, 2, 'final', 0)", which)
    assert done.returncode == 2
    assert done.stdout == ""
    assert done.stderr == (
        f"loopwright: needs Python 3.11 or newer, this is 3.9; start it with a newer one, as in python3.12 {which}\n"
    )


def test_a_network_that_is_not_there_is_told(clone: Path) -> None:
    # The port is one on which nothing listens; building the distribution needs setuptools from somewhere.
    nowhere = "http://127.0.0.1:9/simple"
    done = _run(clone, "", "server", PIP_INDEX_URL=nowhere, PIP_EXTRA_INDEX_URL="", PIP_NO_CACHE_DIR="1")
    assert done.returncode == 2
    assert done.stderr.splitlines()[-1] == "loopwright: could not download what is needed; is there a network?"
    assert "Traceback" not in done.stderr
    assert not (clone / ".venv" / "loopwright-stamp").exists()  # the next start tries again


def test_a_missing_venv_module_is_told(clone: Path) -> None:
    code = "sys.modules['ensurepip'] = None\nimport os\nos.geteuid = lambda: 1000"
    done = _run(clone, code, "server")
    package = f"python3.{sys.version_info.minor}-venv"
    assert done.returncode == 2
    assert done.stderr.splitlines()[-1] == (
        f"loopwright: this Python cannot make environments; install {package} (sudo apt install {package})"
    )


def test_what_is_set_up_is_used_again_and_renewed_when_the_project_changes(clone: Path) -> None:
    """The clone's own interpreter is this one, seen through a link; what pip is asked to do is written down."""
    shutil.copytree(CLONE / "server", clone / "server", dirs_exist_ok=True, ignore=shutil.ignore_patterns("*.pyc"))
    inside = clone / ".venv" / "bin" / "python"
    inside.parent.mkdir(parents=True)
    inside.write_text(f'#!/bin/sh\necho "$@" >> {clone}/asked\n[ "$2" = pip ] || [ "$1" = -c ] || echo "runs $@"\n')
    inside.chmod(0o755)

    done = _run(clone, "", "server", "check", "x.json")
    assert (done.returncode, done.stdout) == (0, "runs -P -m server check x.json\n")
    assert "installing the workbench into .venv" in done.stderr

    done = _run(clone, "", "server")
    assert (done.stdout, done.stderr) == ("runs -P -m server\n", "")

    with (clone / "pyproject.toml").open("a") as file:
        file.write("dependencies = []\n")
    assert "installing" in _run(clone, "", "server").stderr
    asked = (clone / "asked").read_text()
    assert asked.count("-m pip install") == 2


def test_the_tests_say_what_to_install_when_there_is_no_browser() -> None:
    code = (
        "from tests import browser_place\nfrom server import clone_environment\n"
        "clone_environment.is_root_on_debian = lambda: False\n"
        "browser_place._playwrights_own = lambda: None\nbrowser_place._output = lambda *_: None\n"
        "browser_place.prepare()"
    )
    said = subprocess.run(
        [sys.executable, "-c", code], cwd=CLONE, capture_output=True, text=True, timeout=_TIMEOUT_S,
        env={name: text for name, text in os.environ.items() if name != "LOOPWRIGHT_BROWSER"},
    )  # fmt: skip
    assert said.returncode == 2
    assert "sudo apt install chromium" in said.stderr.splitlines()[-1]


def test_a_browser_that_is_named_wrongly_is_told() -> None:
    code = "from tests import browser_place\nbrowser_place.prepare()"
    said = subprocess.run(
        [sys.executable, "-c", code], cwd=CLONE, capture_output=True, text=True, timeout=_TIMEOUT_S,
        env={**os.environ, "LOOPWRIGHT_BROWSER": "/nowhere/chromium"},
    )  # fmt: skip
    assert (said.returncode, said.stderr) == (
        2, "loopwright: LOOPWRIGHT_BROWSER does not name a browser that starts\n"
    )  # fmt: skip


def test_there_is_a_browser_for_the_tests() -> None:
    from tests.browser_place import browser_executable

    place = browser_executable()
    assert place is not None
    assert Path(place).exists()
