"""What is installed from the wheel is complete: unpacked elsewhere, it serves the page with all its files."""

from __future__ import annotations

import re
import shutil
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

from tests.server.asking import client
from tests.workbench_process import CLONE, WorkbenchProcess

_SHIPPED = ("engine", "server", "web", "demo_plants")


@pytest.fixture(scope="module")
def installed(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The wheel's content, as an installation lays it out."""
    source = tmp_path_factory.mktemp("source")
    for name in _SHIPPED:
        shutil.copytree(CLONE / name, source / name, ignore=shutil.ignore_patterns("__pycache__"))
    for name in ("pyproject.toml", "README.md", "LICENSE"):
        shutil.copy(CLONE / name, source / name)
    place = tmp_path_factory.mktemp("wheel")
    code = f"from setuptools import build_meta; build_meta.build_wheel({str(place)!r})"
    done = subprocess.run([sys.executable, "-c", code], cwd=source, capture_output=True, text=True, timeout=120)
    assert done.returncode == 0, done.stderr
    assert "is absent from" not in done.stderr  # setuptools warns so about data it may leave out in future
    (wheel,) = place.glob("loopwright-*-py3-none-any.whl")
    folder = tmp_path_factory.mktemp("installed")
    with zipfile.ZipFile(wheel) as packed:
        packed.extractall(folder)
    return folder


def test_every_shipped_file_is_in_the_wheel(installed: Path) -> None:
    def files(folder: Path) -> set[str]:
        return {
            str(path.relative_to(folder))
            for name in _SHIPPED
            for path in (folder / name).rglob("*")
            if path.is_file() and not {"__pycache__", "pictures"} & set(path.parts)  # the README's picture stays behind
        }

    assert files(installed) == files(CLONE)
    assert not (installed / "tests").exists()


def test_the_command_is_installed(installed: Path) -> None:
    (entry,) = installed.glob("*.dist-info/entry_points.txt")
    assert "loopwright = server.command_line:main" in entry.read_text()
    assert list(installed.glob("*.dist-info/licenses/LICENSE"))


def test_the_installed_workbench_serves_its_page(installed: Path, tmp_path: Path) -> None:
    process = WorkbenchProcess(tmp_path / "links.sqlite", folder=installed)
    try:
        with client(process.url) as ask:
            page = ask.get("/")
            assert page.status_code == 200
            for path in re.findall(r"""(?:src|href)=["']([^"']+)["']""", page.text):
                assert ask.get(path).status_code == 200, path
            assert len(ask.get("/api/demos").json()) >= 6
    finally:
        process.stop()
