"""The environment in the clone: make `.venv`, keep it in step with pyproject.toml, run something inside.

Used by `python3 server` and `python3 tests` before anything is installed: standard library only, and no syntax
newer than Python 3.6, so that an old Python can say that it is too old instead of failing on a line it cannot read.
"""

import hashlib
import os
import shutil
import subprocess
import sys
from typing import NoReturn, Sequence

LEAST_PYTHON = (3, 11)
CLONE = os.path.dirname(os.path.dirname(os.path.abspath(__file__)))
PLACE = os.path.join(CLONE, ".venv")
_STAMP = os.path.join(PLACE, "loopwright-stamp")
_SIGNS_OF_NO_NETWORK = (
    "name resolution",
    "NewConnectionError",
    "Name or service not known",
    "nodename nor servname",
    "Network is unreachable",
    "Connection refused",
    "ConnectTimeout",
    "ProxyError",
    "Connection to",
)


def say(text: str) -> None:
    """One line of progress."""
    print("loopwright: " + text, file=sys.stderr)
    sys.stderr.flush()


def give_up(text: str) -> NoReturn:
    """One clear line, and out."""
    say(text)
    sys.exit(2)


def python_of_the_clone() -> str:
    """Path of the interpreter inside `.venv`."""
    if os.name == "nt":
        return os.path.join(PLACE, "Scripts", "python.exe")
    return os.path.join(PLACE, "bin", "python")


def prepare(extra: str = "") -> str:
    """Make or refresh `.venv`; returns the path of its interpreter.

    extra: name of an optional group of pyproject.toml that is wanted as well, or "".
    """
    if sys.version_info < LEAST_PYTHON:
        give_up(
            "needs Python {}.{} or newer, this is {}.{}; start it with a newer one, as in python3.12 {}".format(
                LEAST_PYTHON[0], LEAST_PYTHON[1], sys.version_info[0], sys.version_info[1], sys.argv[0]
            )
        )
    if _usable() and _stamp() in (_wanted(extra), _wanted("test")):
        return python_of_the_clone()
    if not _usable():
        _make()
    _install(extra)
    return python_of_the_clone()


def run_inside(arguments: Sequence[str]) -> NoReturn:
    """Replace this process by the clone's interpreter with these arguments."""
    command = [python_of_the_clone()] + list(arguments)
    if os.name == "nt":  # there, exec returns to the shell at once
        sys.exit(subprocess.call(command))
    sys.stdout.flush()
    sys.stderr.flush()
    os.execv(command[0], command)


def is_root_on_debian() -> bool:
    """True where packages can be installed by apt without asking anyone."""
    return hasattr(os, "geteuid") and os.geteuid() == 0 and shutil.which("apt-get") is not None


def apt_install(*packages: str) -> bool:
    """Install Debian packages; returns whether that worked. Only as root, see is_root_on_debian."""
    quiet = dict(os.environ, DEBIAN_FRONTEND="noninteractive")
    codes = [
        subprocess.run(command, env=quiet, stdout=subprocess.PIPE, stderr=subprocess.STDOUT).returncode
        for command in (["apt-get", "-qq", "update"], ["apt-get", "-qq", "install", "-y"] + list(packages))
    ]
    return codes[-1] == 0  # a stale package list is no reason to fail


def _usable() -> bool:
    """Whether `.venv` has an interpreter that starts, is new enough and has pip."""
    python = python_of_the_clone()
    if not os.path.exists(python):
        return False
    question = "import sys, pip; sys.exit(sys.version_info < {!r})".format(LEAST_PYTHON)
    done = subprocess.run([python, "-c", question], stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    return done.returncode == 0


def _make() -> None:
    say("making an environment of its own in .venv")
    try:
        import ensurepip  # noqa: F401  Debian and Ubuntu ship it in a package of its own
        import venv
    except ImportError:
        package = "python{}.{}-venv".format(sys.version_info[0], sys.version_info[1])
        if not is_root_on_debian():
            give_up("this Python cannot make environments; install {0} (sudo apt install {0})".format(package))
        say("installing " + package + " by apt")
        if not apt_install(package):
            give_up("could not install {}; is there a network?".format(package))
        # This process has already looked for the module in vain; a new one finds it.
        done = subprocess.run([sys.executable, "-m", "venv", "--clear", PLACE], stdout=subprocess.DEVNULL)
        if done.returncode != 0:
            give_up("could not make " + PLACE)
        return
    try:
        venv.create(PLACE, with_pip=True, clear=True)
    except (OSError, subprocess.CalledProcessError) as error:
        give_up("could not make {}: {}".format(PLACE, error))


def _install(extra: str) -> None:
    what = "the workbench and what its tests need" if extra else "the workbench"
    say("installing {} into .venv (only now and after an update; takes a minute or two)".format(what))
    target = CLONE + ("[{}]".format(extra) if extra else "")
    command = [python_of_the_clone(), "-m", "pip", "install", "--quiet", "--disable-pip-version-check"]
    command += ["--no-input", "--retries", "1", "--timeout", "20", "--editable", target]
    try:
        done = subprocess.run(command, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, universal_newlines=True)
    except KeyboardInterrupt:
        give_up("stopped before the installation was complete; the next start goes on with it")
    if done.returncode != 0:
        if any(sign in done.stdout for sign in _SIGNS_OF_NO_NETWORK):
            give_up("could not download what is needed; is there a network?")
        lines = [line for line in done.stdout.splitlines() if "ERROR" in line] or done.stdout.splitlines() or ["?"]
        give_up("could not install: " + lines[0].replace("ERROR: ", ""))
    with open(_STAMP, "w") as stamp:  # last, so that an interrupted installation is taken up again
        stamp.write(_wanted(extra))


def _wanted(extra: str) -> str:
    with open(os.path.join(CLONE, "pyproject.toml"), "rb") as file:
        return hashlib.sha256(file.read() + extra.encode() + CLONE.encode()).hexdigest()


def _stamp() -> str:
    try:
        with open(_STAMP) as stamp:
            return stamp.read()
    except OSError:
        return ""
