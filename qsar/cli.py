"""The command ``acidity``: finds the command that is asked for, runs it, and turns errors into one line.

Only the module of that command is imported, so that a single prediction starts quickly.
"""

from __future__ import annotations

import argparse
import difflib
import importlib
import importlib.util
import os
import signal
import sys
import threading
import warnings
from collections.abc import Sequence
from types import FrameType, ModuleType
from typing import NoReturn

from qsar import __version__
from qsar.errors import UserError

COMMANDS = (
    "predict",
    "explain",
    "analogues",
    "ionise",
    "workup",
    "buffer",
    "train",
    "validate",
    "compare",
    "models",
    "curate",
    "suggest",
    "check-table",
    "serve",
)
"""Every command, in the order of the help; those whose module is there can be used."""

INTERRUPTED = 130
FAILED = 1
PIPE_CLOSED = 141


class _Parser(argparse.ArgumentParser):
    """A parser that reports wrong usage in one line."""

    def error(self, message: str) -> NoReturn:
        self.exit(2, f"{self.prog}: {message} (see {self.prog} --help)\n")


def main(argv: Sequence[str] | None = None) -> int:
    """Run ``acidity``.

    Parameters
    ----------
    argv : sequence of str, optional
        Arguments without the program's name; by default those of the process.

    Returns
    -------
    int
        Exit status: 0 all well, 3 some inputs could not be used, 2 wrong usage or a file that cannot be
        read or written, 130 interrupted, 1 an error of the program itself.
    """
    arguments = list(sys.argv[1:] if argv is None else argv)
    debug = "--debug" in arguments
    arguments = [text for text in arguments if text != "--debug"]
    _prepare_streams()
    try:
        return _run(arguments, debug)
    except (Exception, KeyboardInterrupt) as problem:
        if debug and not isinstance(problem, KeyboardInterrupt):
            raise
        status, line = _explained(problem)
    if line:
        print(f"acidity: {' '.join(line.split())}", file=sys.stderr)
    return status


def _explained(problem: BaseException) -> tuple[int, str]:
    """Exit status and line for the user of whatever ended a command."""
    if isinstance(problem, UserError):
        return problem.exit_status, str(problem)
    if isinstance(problem, KeyboardInterrupt):
        return INTERRUPTED, "interrupted"
    if isinstance(problem, BrokenPipeError):
        # Whoever read the output has left; point it elsewhere, or Python complains at exit.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return PIPE_CLOSED, ""
    if isinstance(problem, OSError):
        place = f"{problem.filename}: " if problem.filename else ""
        return UserError.exit_status, f"{place}{problem.strerror or problem}"
    if isinstance(problem, MemoryError):
        return FAILED, "not enough memory; give fewer or smaller structures, or a smaller --jobs"
    return FAILED, f"an error of the program ({type(problem).__name__}: {problem}); --debug shows where"


def available() -> list[str]:
    """Names of the commands whose module is there."""
    return [name for name in COMMANDS if importlib.util.find_spec(_module_name(name)) is not None]


def _module_name(command: str) -> str:
    return f"qsar.commands.{command.replace('-', '_')}"


def _run(arguments: list[str], debug: bool) -> int:
    if not arguments or arguments[0].startswith("-"):
        return _general(arguments)
    name, *rest = arguments
    if name not in COMMANDS or importlib.util.find_spec(_module_name(name)) is None:
        raise UserError(_unknown(name))
    module = importlib.import_module(_module_name(name))
    parser = _command_parser(name, module)
    args = parser.parse_args(rest)
    args.debug = debug
    if threading.current_thread() is threading.main_thread():
        signal.signal(signal.SIGTERM, _terminated)
    return int(module.run(args))


def _command_parser(name: str, module: ModuleType) -> argparse.ArgumentParser:
    parser = _Parser(prog=f"acidity {name}", description=module.HELP)
    module.add_arguments(parser)
    parser.add_argument("--debug", action="store_true", help="show the traceback of an error")
    return parser


def _general(arguments: list[str]) -> int:
    """Answer ``acidity``, ``acidity --help`` and ``acidity --version``."""
    parser = _Parser(
        prog="acidity",
        usage="acidity COMMAND …",
        description="Aqueous pKa of carboxylic acids from structure. `acidity COMMAND --help` says more.",
        formatter_class=argparse.RawDescriptionHelpFormatter,
        epilog=_listed_commands(),
    )
    parser.add_argument("--version", action="version", version=f"acidity {__version__}")
    parser.add_argument("--debug", action="store_true", help="show the traceback of an error")
    parser.parse_args(arguments)
    parser.print_help(sys.stderr)
    return UserError.exit_status


def _listed_commands() -> str:
    lines = [f"  {name:12} {importlib.import_module(_module_name(name)).HELP}" for name in available()]
    return "\n".join(["commands:", *lines])


def _unknown(name: str) -> str:
    names = available()
    close = difflib.get_close_matches(name, names, n=1)
    meant = f"did you mean {close[0]}? The" if close else "the"
    return f"no command {name[:40]!r}; {meant} commands are {', '.join(names)}"


def _terminated(number: int, frame: FrameType | None) -> NoReturn:
    """Clean up on a polite request to end as on Ctrl-C."""
    raise KeyboardInterrupt


def _prepare_streams() -> None:
    """Never fail on a character that the terminal cannot show."""
    for stream in (sys.stdout, sys.stderr):
        reconfigure = getattr(stream, "reconfigure", None)
        if reconfigure is not None:
            reconfigure(errors="replace")
    warnings.filterwarnings("ignore", module="openpyxl")  # on parts of a workbook that are not read


if __name__ == "__main__":
    sys.exit(main())
