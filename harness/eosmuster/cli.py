"""The command line: thin. One error boundary, distinct exit statuses, heavy rooms entered only when used."""

from __future__ import annotations

import argparse
import os
import re
import shutil
import sys
import traceback
from collections.abc import Callable, Sequence
from typing import NoReturn

from eosmuster import __version__
from eosmuster.errors import EosmusterError, InputError

INTERNAL_FAILURE = 3
INTERRUPTED = 130
GATE_NOT_MET = 1
NOTHING_JUDGED = 4
TOPICS = ("models", "components", "references", "properties", "plans")

_SIGNED = ("-T", "--temperature", "-p", "--pressure")
_NEGATIVE = re.compile(r"-[.\d]")

_PHASE_RULE = (
    "give exactly one of --temperature and --pressure: by the phase rule a saturated pure substance has one "
    "degree of freedom, so the other follows from it"
)


class _Parser(argparse.ArgumentParser):
    """Usage errors in one sentence, like every other error."""

    def error(self, message: str) -> NoReturn:
        raise InputError(f"{message}; see '{self.prog} --help'")


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command and return its exit status.

    0 done; 1 the gate is not met; 2 bad plan, input or usage; 3 internal failure; 4 nothing could be judged.
    """
    # no matrix product here gains from threads, and waiting ones cost processor time; numpy reads this when loaded
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    given = list(sys.argv[1:] if arguments is None else arguments)
    debug = "--debug" in given
    try:
        options = _parser().parse_args(_joined([a for a in given if a != "--debug"]))
        command: Callable[[argparse.Namespace], int] = options.command
        status = command(options)
        sys.stdout.flush()
    except BrokenPipeError:
        # the reader of a pipe has gone: no more can be said, and the interpreter must not try again at exit
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except KeyboardInterrupt:
        return _complain("interrupted; a results folder is written whole or not at all", INTERRUPTED, debug)
    except EosmusterError as error:
        return _complain(str(error), error.exit_status, debug)
    except Exception as error:
        what = f"internal failure: {type(error).__name__}: {error} (run again with --debug for the traceback)"
        return _complain(what, INTERNAL_FAILURE, debug)
    return status


def _joined(arguments: Sequence[str]) -> list[str]:
    """Join a quantity to its option: ``-40degC`` alone would be taken for an option of its own."""
    joined: list[str] = []
    for argument in arguments:
        if joined and joined[-1] in _SIGNED and _NEGATIVE.match(argument):
            option = joined.pop()
            argument = f"{option}={argument}" if option.startswith("--") else option + argument  # noqa: PLW2901
        joined.append(argument)
    return joined


def _complain(message: str, status: int, debug: bool) -> int:
    if debug:
        traceback.print_exc()
    print(f"eosmuster: {' '.join(message.split())}", file=sys.stderr)
    return status


def _parser() -> argparse.ArgumentParser:
    parser = _Parser(
        prog="eosmuster",
        description="Sweep pure components through cubic equations of state, compare with cited references, and "
        "say where each model is inside a stated tolerance.",
        epilog="Exit status: 0 done; 1 gate not met; 2 bad plan, input or usage; 3 internal failure; "
        "4 nothing could be judged. --debug shows the traceback of an error.",
    )
    parser.add_argument("--version", action="version", version=f"eosmuster {__version__}")
    commands = parser.add_subparsers(title="commands", required=True, metavar="COMMAND", parser_class=_Parser)
    _add_sweep(commands.add_parser("sweep", help="run a plan: every component x model x state x property"))
    _add_saturate(commands.add_parser("saturate", help="one substance at one temperature or pressure, all models"))
    _add_precheck(commands.add_parser("precheck", help="constants, alpha functions and references before any sweep"))
    listing = commands.add_parser("list", help="what is there: models, components, references, properties, plans")
    listing.add_argument("topic", choices=TOPICS)
    listing.set_defaults(command=_list)
    return parser


def _add_sweep(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("plan", nargs="?", help="a TOML file, or the name of a built-in plan (default: broad)")
    parser.add_argument("--out", metavar="DIR", help="results folder (default: eosmuster-results/<plan name>)")
    parser.add_argument("--gate", action="store_true", help="exit with 1 if a verdict of the plan's [gate] occurs")
    parser.add_argument(
        "--points", choices=("all", "none"), default="all", help="write points.csv, or leave it out (default: all)"
    )
    parser.set_defaults(command=_sweep)


def _add_precheck(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("plan", nargs="?", help="a TOML file, or the name of a built-in plan (default: broad)")
    parser.add_argument("--csv", metavar="FILE", help="write every finding as a row of a CSV file as well")
    parser.set_defaults(command=_precheck)


def _add_saturate(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("substance", help="a name, alias or CAS number")
    parser.add_argument("--temperature", "-T", metavar="T", help='e.g. "25 degC"; a bare number is in K')
    parser.add_argument("--pressure", "-p", metavar="P", help='e.g. "1 atm"; a bare number is in Pa')
    parser.add_argument("--model", "-m", metavar="M", action="append", help="a model (again for more; default: all)")
    parser.set_defaults(command=_saturate)


def _width() -> int:
    return min(100, shutil.get_terminal_size((100, 24)).columns) if sys.stdout.isatty() else 100


def _show(text: str) -> None:
    """Print text, replacing what the terminal's encoding cannot show."""
    from eosmuster.report.text import for_encoding

    print(for_encoding(text, sys.stdout.encoding or "utf-8"))


def _sweep(options: argparse.Namespace) -> int:
    from datetime import UTC, datetime
    from pathlib import Path

    from eosmuster.api import read_plan
    from eosmuster.progress import Bar
    from eosmuster.report.folder import checked, save
    from eosmuster.report.terminal import terminal_summary
    from eosmuster.sweeping.gate import gate_failures, nothing_judged
    from eosmuster.sweeping.run import run

    started = datetime.now(UTC)
    plan = read_plan(options.plan)
    named = Path("eosmuster-results") / plan.name if options.out is None else options.out
    folder = checked(named, overwrite=True)
    with Bar(sys.stderr) as bar:
        record = run(plan, bar)
        bar("writing", 0, 1)
        folder = save(record, folder, points=options.points == "all", overwrite=True, started=started)
    _show(terminal_summary(record, folder, _width()))
    if nothing_judged(record):
        print("eosmuster: nothing could be judged: no point has both a prediction and a reference", file=sys.stderr)
        return NOTHING_JUDGED
    failures = gate_failures(record, plan.gate_fail_on) if options.gate else {}
    if failures:
        counted = ", ".join(f"{count} {verdict}" for verdict, count in failures.items())
        print(f"eosmuster: the gate is not met: {counted}", file=sys.stderr)
        return GATE_NOT_MET
    return 0


def _saturate(options: argparse.Namespace) -> int:
    from eosmuster.components import find
    from eosmuster.inquiry import ask
    from eosmuster.listing import chosen_models, positive, saturation_text

    if (options.temperature is None) == (options.pressure is None):
        raise InputError(_PHASE_RULE)
    component = find(options.substance)
    models = chosen_models(options.model)
    temperature = positive(options.temperature, "temperature", "--temperature")
    pressure = positive(options.pressure, "pressure", "--pressure")
    answers = ask(component, models, temperature=temperature, pressure=pressure)
    _show(saturation_text(component, answers, temperature, pressure, _width()))
    if not any(answer.status == "solved" for answer in answers):
        print("eosmuster: no model has a saturated state there", file=sys.stderr)
        return NOTHING_JUDGED
    return 0


def _precheck(options: argparse.Namespace) -> int:
    from eosmuster.api import read_plan
    from eosmuster.prechecks.checks import precheck
    from eosmuster.prechecks.text import precheck_text, write_csv
    from eosmuster.progress import Bar

    plan = read_plan(options.plan)
    with Bar(sys.stderr) as bar:
        findings = precheck(plan, bar)
    _show(precheck_text(plan, findings, _width()))
    if options.csv:
        print(f"\nfindings: {write_csv(findings, options.csv)}")
    return 0


def _list(options: argparse.Namespace) -> int:
    from eosmuster import listing

    _show(listing.LISTS[options.topic](_width()))
    return 0
