"""Where the Chromium for the browser tests is, and how to get one.

Standard library only, and no syntax newer than Python 3.6: `python3 tests` uses it before anything is installed.
"""

import os
import shutil
import subprocess
import sys
from typing import List, Optional

from server import clone_environment

VARIABLE = "LOOPWRIGHT_BROWSER"
_NAMES = ("chromium", "chromium-browser", "google-chrome", "google-chrome-stable", "chrome")
_MAC_PLACES = (
    "/Applications/Chromium.app/Contents/MacOS/Chromium",
    "/Applications/Google Chrome.app/Contents/MacOS/Google Chrome",
)
_ASK_PLAYWRIGHT = (
    "from playwright.sync_api import sync_playwright as s\nwith s() as p: print(p.chromium.executable_path)"
)


def browser_executable() -> Optional[str]:
    """Path of a Chromium or Chrome that starts; None if there is none."""
    named = os.environ.get(VARIABLE)
    places = [named] if named else [found for name in _NAMES for found in [shutil.which(name)] if found]
    if not named:
        places += [place for place in _MAC_PLACES if os.path.exists(place)]
    for place in places:
        if _starts(place):
            return place
    return None if named else _playwrights_own()


def prepare() -> None:
    """Make sure that there is a browser, or say what to install and give up."""
    if browser_executable():
        return
    if os.environ.get(VARIABLE):
        clone_environment.give_up(VARIABLE + " does not name a browser that starts")
    if clone_environment.is_root_on_debian():
        clone_environment.say("installing Chromium for the browser tests by apt")
        if clone_environment.apt_install("chromium") and browser_executable():
            return
    clone_environment.say("installing Playwright's own Chromium for the browser tests")
    command = ["-m", "playwright", "install", "chromium"]
    if clone_environment.is_root_on_debian():
        command.insert(3, "--with-deps")
    _output([clone_environment.python_of_the_clone()] + command, 900)
    if not browser_executable():
        clone_environment.give_up(
            "the browser tests need Chromium or Chrome: install one (on Debian: sudo apt install chromium), "
            "or name one in " + VARIABLE
        )


def _starts(place: str) -> bool:
    # Ubuntu has a file of this name that only asks for another package.
    return _output([place, "--version"], 60) is not None


def _playwrights_own() -> Optional[str]:
    inside = clone_environment.python_of_the_clone()
    python = sys.executable if not os.path.exists(inside) else inside
    place = (_output([python, "-c", _ASK_PLAYWRIGHT], 60) or "").strip()
    return place if place and os.path.exists(place) and _starts(place) else None


def _output(command: List[str], seconds: int) -> Optional[str]:
    try:
        done = subprocess.run(
            command, stdout=subprocess.PIPE, stderr=subprocess.DEVNULL, timeout=seconds, universal_newlines=True
        )
    except (OSError, subprocess.SubprocessError):
        return None
    return done.stdout if done.returncode == 0 else None
