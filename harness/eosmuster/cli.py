"""The command line: thin. One error boundary, distinct exit statuses, heavy rooms entered only when used."""

from __future__ import annotations

import argparse
import importlib
import os
import re
import sys
import traceback
from collections.abc import Sequence
from typing import NoReturn

from eosmuster import __version__
from eosmuster.commands import COMMANDS
from eosmuster.commands.exits import INTERNAL_FAILURE, INTERRUPTED, complain, finish
from eosmuster.errors import EosmusterError, InputError

_SIGNED = ("-T", "--temperature", "-p", "--pressure")
_NEGATIVE = re.compile(r"-[.\d]")


class _Parser(argparse.ArgumentParser):
    """Usage errors in one sentence, like every other error."""

    def error(self, message: str) -> NoReturn:
        raise InputError(f"{message}; see '{self.prog} --help'")


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status.

    0 done; 1 the gate is not met, or there is drift; 2 bad plan, input or usage; 3 internal failure; 4 nothing could
    be judged.
    """
    # no matrix product here gains from threads, and waiting ones cost processor time; numpy reads this when loaded
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    given = list(sys.argv[1:] if arguments is None else arguments)
    debug = "--debug" in given
    try:
        return _run([argument for argument in given if argument != "--debug"])
    except KeyboardInterrupt:
        return _failed("interrupted; a results folder is written whole or not at all", INTERRUPTED, debug)
    except EosmusterError as error:
        return _failed(str(error), error.exit_status, debug)
    except Exception as error:
        what = f"internal failure: {type(error).__name__}: {error} (run again with --debug for the traceback)"
        return _failed(what, INTERNAL_FAILURE, debug)


def _run(arguments: Sequence[str]) -> int:
    try:
        options = _parser().parse_args(_joined(arguments))
        return int(options.command(options))
    finally:
        finish()  # after --help, too


def _joined(arguments: Sequence[str]) -> list[str]:
    """Join a quantity to its option: ``-40degC`` alone would be taken for an option of its own."""
    joined: list[str] = []
    for argument in arguments:
        if joined and joined[-1] in _SIGNED and _NEGATIVE.match(argument):
            option = joined.pop()
            argument = f"{option}={argument}" if option.startswith("--") else option + argument  # noqa: PLW2901
        joined.append(argument)
    return joined


def _failed(message: str, status: int, debug: bool) -> int:
    complain(message, before=traceback.format_exc() if debug else "")
    return status


def _parser() -> argparse.ArgumentParser:
    parser = _Parser(
        prog="eosmuster",
        allow_abbrev=False,
        description="Sweep pure components through cubic equations of state, compare with cited references, and "
        "say where each model is inside a stated tolerance.",
        epilog="Exit status: 0 done; 1 gate not met, or drift; 2 bad plan, input or usage; 3 internal failure; "
        "4 nothing could be judged: a run's folder is written all the same, unless no reference has anything to say. "
        "--debug shows the traceback of an error.",
    )
    parser.add_argument("--version", action="version", version=f"eosmuster {__version__}")
    commands = parser.add_subparsers(title="commands", required=True, metavar="COMMAND", parser_class=_Parser)
    for name, module in COMMANDS.items():
        command = importlib.import_module(f"eosmuster.commands.{module}")
        sub = commands.add_parser(name, help=command.HELP, description=f"{command.HELP}.", allow_abbrev=False)
        command.add(sub)
        sub.set_defaults(command=command.run)
    return parser
