"""Run all benchmark scripts and print what they find under a description of the machine.

    python tests/benchmarks/run.py [--quick]

About ten minutes; every script is a process of its own, and the targets of their issue stand beside the figures.
`--quick` proves only that the scripts work: it takes seconds, runs them one after the other in this process, and its
figures mean nothing.
"""

from __future__ import annotations

import runpy
import subprocess
import sys
from pathlib import Path

import measuring

FOLDER = Path(__file__).resolve().parent
SCRIPTS = (
    "kernel.py",
    "single_phase.py",
    "accuracy.py",
    "coverage.py",
    "whole_command.py",
    "catalogue.py",
    "growth.py",
    "points_writer.py",
    "dossier.py",
    "thermoml_reader.py",
)


def main() -> None:
    quick = measuring.asked_to_be_quick(__doc__)
    print("\n".join(measuring.machine()))
    for name in SCRIPTS:
        print(f"\n{name}", flush=True)
        if quick:
            sys.argv[1:] = ["--quick"]
            runpy.run_path(str(FOLDER / name), run_name="__main__")
        else:
            subprocess.run([sys.executable, str(FOLDER / name)], env=measuring.AS_STARTED, check=True)


if __name__ == "__main__":
    main()
