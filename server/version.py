"""The version of what is installed."""

from __future__ import annotations

from importlib.metadata import PackageNotFoundError, version


def loopwright_version() -> str:
    """As in pyproject.toml; "unknown" where the folder is run without having been installed."""
    try:
        return version("loopwright")
    except PackageNotFoundError:
        return "unknown"
