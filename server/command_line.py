"""The command `loopwright`: serve, check, export. One line on standard error for every mistake, no traceback."""

from __future__ import annotations

import argparse
import os
import sys
from collections.abc import Callable, Sequence
from typing import NoReturn

from engine.errors import LoopwrightError
from server.quiet_numerics import quiet_numerics

MET, NOT_MET, UNUSABLE, NOT_ASSESSABLE = 0, 1, 2, 3
_EXIT_CODES = {"met": MET, "not met": NOT_MET, "not assessable": NOT_ASSESSABLE}
_LATER_COMMANDS = ("propose", "report")
_WITH_TRACEBACK = "LOOPWRIGHT_TRACEBACK"


class CommandError(LoopwrightError):
    """A command that cannot be carried out as it was given."""


def main(arguments: Sequence[str] | None = None) -> int:
    """Carry out a command; returns the exit code of the contract."""
    given = list(sys.argv[1:] if arguments is None else arguments)
    quiet_numerics()
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):  # JSON and CSV are UTF-8 wherever they are written
            stream.reconfigure(encoding="utf-8", errors="backslashreplace")
    try:
        code = _carry_out(given)
        sys.stdout.flush()
        return code
    except KeyboardInterrupt:
        return 130
    except BrokenPipeError:
        # Whoever read the output has had enough. Python would complain once more when it closes the pipe.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 141
    except LoopwrightError as error:
        return _complain(str(error))
    except Exception as error:
        if os.environ.get(_WITH_TRACEBACK):
            raise
        what = f"something went wrong in Loopwright itself: {type(error).__name__}: {error}"
        return _complain(f"{what} (set {_WITH_TRACEBACK}=1 to see where)")


def _carry_out(given: list[str]) -> int:
    if not given or (given[0].startswith("-") and given[0] not in ("-h", "--help", "--version")):
        given = ["serve", *given]
    if given[0] in _LATER_COMMANDS:
        raise CommandError(f"{given[0]} is not in this version yet; there are serve, check and export")
    chosen = _parser().parse_args(given)
    command: Callable[[argparse.Namespace], int] = chosen.command
    return command(chosen)


def _complain(text: str) -> int:
    line = " ".join(text.split())
    print(f"loopwright: {line}", file=sys.stderr)
    return UNUSABLE


class _Parser(argparse.ArgumentParser):
    def error(self, message: str) -> NoReturn:
        raise CommandError(f"{message} (see {self.prog} --help)")


def _parser() -> argparse.ArgumentParser:
    from server.version import loopwright_version

    parser = _Parser(
        prog="loopwright",
        description="Design feedback compensators against a requirement sheet, on every plant case at once.",
        epilog="Exit codes of check: 0 met, 1 not met, 3 not assessable, 2 unusable input.",
    )
    parser.add_argument("--version", action="version", version=f"loopwright {loopwright_version()}")
    commands = parser.add_subparsers(metavar="COMMAND", required=True)

    serve = commands.add_parser("serve", help="open the workbench in the browser (the default)")
    serve.add_argument("--host", help="address to listen on (default 127.0.0.1: this machine only)")
    serve.add_argument("--port", type=_port, help="port to listen on; 0 takes any free one")
    serve.add_argument("--no-browser", action="store_true", help="do not open a browser")
    serve.set_defaults(command=_serve)

    check = commands.add_parser("check", help="judge a design: the requirement table, or the whole assessment")
    check.add_argument("file", metavar="FILE", help="design file, - for standard input")
    check.add_argument("--json", action="store_true", help="print the assessment as JSON")
    check.add_argument("--curves", action="store_true", help="with --json: include the curves")
    check.set_defaults(command=_check)

    export = commands.add_parser("export", help="hand over the transfer function (JSON) or the curves (CSV)")
    export.add_argument("file", metavar="FILE", help="design file, - for standard input")
    export.add_argument("--as", dest="kind", metavar="KIND", required=True, help="transfer-function or curves")
    export.add_argument("-o", dest="out", metavar="OUT", help="file to write; default standard output")
    export.set_defaults(command=_export)
    return parser


def _port(text: str) -> int:
    if not (text.isascii() and text.isdigit() and len(text) < 6 and int(text) < 65536):
        raise argparse.ArgumentTypeError(f"must be a whole number from 0 to 65535, is {text!r}")
    return int(text)


# Each command imports what it needs: numpy and the web are slow to load, and --help needs neither.


def _serve(chosen: argparse.Namespace) -> int:
    from dataclasses import replace

    from server.serving import serve
    from server.settings import Settings

    settings = Settings.from_environment()
    host = settings.host if chosen.host is None else chosen.host
    port = settings.port if chosen.port is None else chosen.port
    return serve(replace(settings, host=host, port=port), open_browser=not chosen.no_browser)


def _check(chosen: argparse.Namespace) -> int:
    if chosen.curves and not chosen.json:
        raise CommandError("--curves goes with --json; for a table use export --as curves")
    from engine.design.assess import assess
    from server.design_file import read_design
    from server.json_text import json_text
    from server.requirement_table import requirement_table

    design = read_design(chosen.file)
    assessment = assess(design, chosen.curves)
    print(json_text(assessment, indent=2) if chosen.json else requirement_table(design, assessment))
    return _EXIT_CODES[assessment["verdict"]]


def _export(chosen: argparse.Namespace) -> int:
    from server.export_kinds import EXPORTS, refusal_of

    refusal = refusal_of(chosen.kind)
    if refusal:
        raise CommandError(refusal)
    from server.design_file import read_design, write_whole

    design = read_design(chosen.file)
    text = EXPORTS[chosen.kind].write(design, None)
    if chosen.out is None:
        print(text, end="" if text.endswith("\n") else "\n")
    else:
        write_whole(chosen.out, text)
    return 0


if __name__ == "__main__":
    sys.exit(main())
