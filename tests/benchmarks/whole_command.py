"""Cost of whole commands, side by side with importing the libraries that they stand on.

    python tests/benchmarks/whole_command.py [--quick]

Processor time (user and system) of child processes that take turns, as a user's shell would start them, in empty
temporary folders: `eosmuster sweep` (the built-in broad plan: points, summaries, windows, manifest and, unless it
is left out, the dossier written)
against `python -c "import CoolProp, pandas, scipy.optimize"`; `eosmuster --help` and `eosmuster list models` against
`python -c pass`. Each is started once beforehand, so that compiled files are there.
"""

from __future__ import annotations

import sys
import tempfile
from collections.abc import Callable
from pathlib import Path
from statistics import median

import measuring
import plans
from measuring import EOSMUSTER, alternating, figure, ratio, seconds

START_UP = {"--help": "0.25 s", "list models": ""}


def command(*arguments: str, plan: str = "") -> Callable[[], float]:
    """Measure a command in a folder that holds at most a plan."""

    def measure() -> float:
        with tempfile.TemporaryDirectory() as folder:
            if plan:
                Path(folder, "plan.toml").write_text(plan, encoding="utf-8")
            return measuring.child(arguments, folder).seconds

    return measure


def sweeping(quick: bool) -> None:
    sweep = command(*EOSMUSTER, "sweep", "plan.toml", plan=plans.two_fluids(5))
    tasks = {
        "sweep": sweep if quick else command(*EOSMUSTER, "sweep"),
        "tables": command(*EOSMUSTER, "sweep", "--dossier", "no") if not quick else sweep,
        "imports": command(*plans.imports(quick)),
        "first": command(sys.executable, "-c", plans.imports(quick)[-1].split(",")[0]),
    }
    times = alternating(tasks, rounds=1 if quick else 7, warm=not quick)
    for name, what, target in (("sweep", "", ""), ("tables", " --dossier no", "1.5 x")):
        figure(
            f"eosmuster sweep{what}",
            f"{ratio(times, name, 'imports'):.3g} x",
            f'{seconds(times[name])} beside {seconds(times["imports"])} of python -c "{plans.imports(quick)[-1]}"',
            target,
        )
    beyond = median(a - b for a, b in zip(times["sweep"], times["first"], strict=True))
    figure(
        "eosmuster sweep beyond the import of the reference library",
        f"{beyond:.3g} s",
        f"that import alone takes {seconds(times['first'])}",
    )


def starting(quick: bool) -> None:
    commands = {name: command(*EOSMUSTER, *name.split()) for name in START_UP}
    times = alternating(commands | {"pass": command(sys.executable, "-c", "pass")}, rounds=1 if quick else 15)
    for name, target in START_UP.items():
        figure(
            f"eosmuster {name}",
            f"{seconds(times[name])}, {ratio(times, name, 'pass'):.3g} x",
            f"{seconds(times['pass'])} of python -c pass",
            target,
        )


def main() -> None:
    quick = measuring.asked_to_be_quick(__doc__)
    starting(quick)
    sweeping(quick)


if __name__ == "__main__":
    main()
