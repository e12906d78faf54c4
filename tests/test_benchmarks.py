"""The benchmark scripts work and print their figures; how fast anything is, is not tested (machines are noisy)."""

from __future__ import annotations

import ast
import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

FOLDER = Path(__file__).parent / "benchmarks"

pytestmark = pytest.mark.skipif(not hasattr(os, "fork"), reason="child processes are measured the POSIX way")

SHARED = {"measuring.py", "plans.py", "run.py"}
SCRIPTS = sorted(path.name for path in FOLDER.glob("*.py") if path.name not in SHARED)
FIGURES = {
    "thermoml_reader.py": [
        r"ThermoML, every value judged: .* MB/s a core .*\[target: 20 MB/s\]",
        r"ThermoML, memory over the number of files: .* kB a file",
    ],
    "kernel.py": [
        r"curve tables of PR, first use: .* ms",
        r"PR, ordered: .* ns a point, .* x as fast \(CoolProp PR .* ns; .* x the cost of exp and log.*40 x\]",
        r"PR, shuffled: .*\[target: 25 x\]",
        r"PR, with slope, ordered: .* ns a point",
        r"PR, T\(p\), shuffled: .*\[target: 15 x\]",
        r"PT, ordered: .*\[target: 10 x\]",
        r"PT, \d+ components x \d+ states in one array, T\(p\): .* ns a point",
        r"SRK, ordered, against CoolProp's SRK back end: .* x as fast",
        r"PR, ordered, against a brentq loop with numpy\.roots: .* x as fast",
        r"1 two-parameter models, ordered: .* x as fast \(PR and PR, .*\[target: 40 x\]",
        r"1 three-parameter models, T\(p\), shuffled: .* x as fast",
    ],
    "single_phase.py": [
        r"PR, T and p, vapor: .* ns a state, .* x as fast \(CoolProp PR .* ns\)",
        r"PR, T and p, liquid: .* ns a state, .* x as fast",
    ],
    "accuracy.py": [
        r"own_components\.csv, SRK, vapor density, \d+ states: .* digits at worst, .* \(CoolProp: .* digits",
        r"reduced_states\.csv, vdW form, T\(p\), \d+ states: .* digits at worst, .* \(CoolProp: has no such form\)",
        r"kernel at Tc \(1 - 1e-9\), digits at worst of 3 forms: pressure .*, T\(p\)",
    ],
    "coverage.py": [
        r"kernel, states without a solution: 0 of \d+, 0\.0000 %",
        r"kernel, T\(p\) at the pressures found: .* at worst",
        r"CoolProp's PR back end, failures, Tr 0\.35 to 0\.999: \d+ of \d+, .* % \(\d+ without an answer, \d+ off",
        r"CoolProp's SRK back end, failures, Tr above 0\.99: \d+ of \d+",
    ],
    "whole_command.py": [
        r"eosmuster --help: .* s, .* x \(.* s of python -c pass\) \[target: 0\.25 s\]",
        r"eosmuster list models: .* s",
        r"eosmuster sweep: .* x \(.* s beside .* s of python -c .*\)",
        r"eosmuster sweep --dossier no: .* x \(.* s beside .* s of python -c .*\) \[target: 1\.5 x\]",
    ],
    "catalogue.py": [
        r"whole catalogue, --points all: .* s, .* MB at the peak \(\d+ points, .*\[target: 25 s and 1 GB\]",
        r"whole catalogue, --points none --dossier no: .* s, .* MB at the peak \(\d+ points, .*\[target: 8 s\]",
    ],
    "growth.py": [
        r"kernel at_pressure, 10\^3 states: .* ns a point \(.* MB of memory beyond its results",
        r"sweep with points\.csv, \d+ points: .* x the work of the smallest .*\[target: 10\.5 x\]",
        r"sweep without points\.csv, \d+ points: .* bytes a point",
    ],
    "dossier.py": [r"dossier of the broad plan: .* s, .* MB \(\d+ points; .*\) \[target: 5 s and 5 MB\]"],
    "points_writer.py": [
        r"points\.csv, \d+ rows: .* ns a row \(.* MB of memory",
        r"points\.csv, \d+ rows of \d+ bytes: .* x as fast \(.* of pandas' to_csv\)",
    ],
}


@pytest.fixture(scope="module")
def printed(tmp_path_factory: pytest.TempPathFactory) -> dict[str, str]:
    """What a quick run of all scripts prints, by script; the machine's description under ""."""
    source = str(FOLDER.parent.parent / "harness")
    path = os.pathsep.join(filter(None, [source, os.environ.get("PYTHONPATH")]))
    done = subprocess.run(
        [sys.executable, "-W", "error", str(FOLDER / "run.py"), "--quick"],
        cwd=tmp_path_factory.mktemp("elsewhere"),
        env=os.environ | {"PYTHONPATH": path},
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 0, done.stdout + done.stderr
    assert done.stderr == ""
    sections = re.split(r"^(\w+\.py)$", done.stdout, flags=re.MULTILINE)
    return dict(zip(["", *sections[1::2]], sections[::2], strict=True))


@pytest.mark.slow
def test_the_machine_is_described(printed: dict[str, str]) -> None:
    processor, system, versions = printed[""].strip().splitlines()
    assert re.fullmatch(r"processor: .+, \d+ cores; one thread is used", processor)
    assert system.startswith("system: ")
    for package in ("Python", "numpy", "scipy", "pandas", "CoolProp"):
        assert re.search(rf"\b{package} \d+\.\d+", versions)


@pytest.mark.slow
@pytest.mark.parametrize("script", SCRIPTS)
def test_every_script_prints_its_figures(script: str, printed: dict[str, str]) -> None:
    lines = printed[script].strip().splitlines()
    for pattern in FIGURES[script]:
        assert any(re.match(pattern, line) for line in lines), f"{pattern} is not in\n{printed[script]}"


@pytest.mark.slow
@pytest.mark.parametrize("script", SCRIPTS)
def test_every_line_is_one_figure(script: str, printed: dict[str, str]) -> None:
    for line in printed[script].strip().splitlines():
        name, _, value = line.partition(": ")
        assert name
        assert re.search(r"\d", value), line
        assert not re.search(r"\b(nan|inf)\b", value), line


@pytest.mark.parametrize("script", [*SCRIPTS, "run.py"])
def test_every_script_says_how_to_run_it(script: str) -> None:
    about = ast.get_docstring(ast.parse((FOLDER / script).read_text(encoding="utf-8")))
    assert about is not None
    assert f"    python tests/benchmarks/{script} [--quick]" in about.splitlines()


def test_numpy_must_not_be_loaded_before_the_threads_are_set() -> None:
    code = "import numpy, measuring"
    environment = {k: v for k, v in os.environ.items() if not k.endswith("_NUM_THREADS")} | {
        "PYTHONPATH": str(FOLDER)
    }
    done = subprocess.run([sys.executable, "-c", code], env=environment, capture_output=True, text=True, check=False)
    assert done.returncode == 1
    assert "import measuring before numpy" in done.stderr
