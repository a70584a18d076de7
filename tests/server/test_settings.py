"""Settings: each is read from its variable, and a wrong one is named."""

from __future__ import annotations

import dataclasses
import re
from pathlib import Path

import pytest

from engine.design.limits import Limits
from server import settings as module
from server.settings import SettingError, Settings


def test_without_variables_the_defaults_hold() -> None:
    assert Settings.from_environment({}) == Settings()
    assert Settings.from_environment({"LOOPWRIGHT_PORT": ""}) == Settings()
    assert Settings().host == "127.0.0.1"


def test_every_variable_is_read() -> None:
    read = Settings.from_environment(
        {
            "LOOPWRIGHT_HOST": "0.0.0.0",
            "LOOPWRIGHT_PORT": "9000",
            "LOOPWRIGHT_STORE": "~/links.sqlite",
            "LOOPWRIGHT_BASE_URL": "https://Loops.example:8443/",
            "LOOPWRIGHT_HOSTS": "a.example, B.example,",
            "LOOPWRIGHT_MAX_BODY_BYTES": "1000",
            "LOOPWRIGHT_MAX_STORED_DESIGNS": "5",
            "LOOPWRIGHT_MAX_SOCKETS": "7",
            "LOOPWRIGHT_MAX_PLANT_CASES": "3",
        }
    )
    assert (read.host, read.port, read.body_bytes, read.stored_designs, read.sockets) == ("0.0.0.0", 9000, 1000, 5, 7)
    assert read.store == Path.home() / "links.sqlite"
    assert read.base_url == "https://Loops.example:8443"
    assert read.hosts == ("a.example", "b.example")
    assert read.limits == dataclasses.replace(Limits(), plant_cases=3)


@pytest.mark.parametrize("field", [field.name for field in dataclasses.fields(Limits)])
def test_every_limit_is_a_setting(field: str) -> None:
    read = Settings.from_environment({f"LOOPWRIGHT_MAX_{field.upper()}": "17"})
    assert getattr(read.limits, field) == 17


@pytest.mark.parametrize(
    ("name", "text"),
    [
        ("PORT", "eighty"), ("PORT", "70000"), ("PORT", "-1"), ("PORT", "²"),
        ("MAX_BODY_BYTES", "0"), ("MAX_BODY_BYTES", "2e6"), ("MAX_SOCKETS", "9" * 50), ("MAX_STAGES", "many"),
        ("STORE", "postgresql://host/base"),
        ("BASE_URL", "loops.example"), ("BASE_URL", "https://loops.example/under"), ("BASE_URL", "ftp://loops.example"),
    ],
)  # fmt: skip
def test_a_wrong_variable_is_named(name: str, text: str) -> None:
    with pytest.raises(SettingError, match=f"^LOOPWRIGHT_{name} must be "):
        Settings.from_environment({f"LOOPWRIGHT_{name}": text})


def test_each_setting_says_its_variable_beside_it() -> None:
    source = Path(module.__file__).read_text()
    for name, (variable, _) in module._VARIABLES.items():
        assert re.search(rf'^    {name}: .*\n    """{variable}: ', source, re.MULTILINE)


def test_the_store_follows_the_platform(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("sys.platform", "linux")
    monkeypatch.setenv("XDG_DATA_HOME", "/data")
    assert module.default_store() == Path("/data/loopwright/links.sqlite")
    monkeypatch.delenv("XDG_DATA_HOME")
    assert module.default_store() == Path.home() / ".local/share/loopwright/links.sqlite"
    monkeypatch.setattr("sys.platform", "darwin")
    assert module.default_store() == Path.home() / "Library/Application Support/loopwright/links.sqlite"
