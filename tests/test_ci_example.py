"""The CI job that README gives to copy, run as it stands there: a gate that is met, and one that is not."""

from __future__ import annotations

import os
import re
import shlex
import subprocess
import tomllib
from collections.abc import Mapping
from pathlib import Path
from xml.etree import ElementTree

import pytest

from eosmuster.plan.reading import parse_plan

# invented, and judged against the handbook alone: no command has to load the reference library
PLAN = """
title = "Propane chiller (invented)"
components = ["propane", "ethane"]
models = ["PR", "SRK", "vdW"]
properties = ["saturation_pressure"]
[states]
temperature = { from = "-40 degC", to = "20 degC", points = 5 }
[tolerance]
saturation_pressure = "3 %"
[references]
use = ["handbook"]
"""


@pytest.fixture(scope="module")
def section(root: Path) -> str:
    readme = (root / "README.md").read_text(encoding="utf-8")
    [found] = re.findall(r"^## In CI$\n(.*?)^## ", readme, re.MULTILINE | re.DOTALL)
    return found


def blocks(section: str, language: str) -> list[str]:
    return re.findall(rf"^```{language}\n(.*?)^```$", section, re.MULTILINE | re.DOTALL)


@pytest.fixture(scope="module")
def gate(section: str) -> str:
    """The table [gate] that README shows."""
    [block] = blocks(section, "ini")
    return block


@pytest.fixture(scope="module")
def settings(
    root: Path, python: str, environment: Mapping[str, str], tmp_path_factory: pytest.TempPathFactory
) -> Mapping[str, str]:
    """An environment in which the checkout is installed: its commands, and its entry points for pytest.

    Other plugins of the environment are not loaded, which is quicker, so this one has to be named by its entry point.
    """
    folder = tmp_path_factory.mktemp("installed")
    project = tomllib.loads((root / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    for command, module in {"eosmuster": "eosmuster", "pytest": "pytest -p eosmuster"}.items():
        shim = folder / "bin" / command
        shim.parent.mkdir(exist_ok=True)
        shim.write_text(f'#!/bin/sh\nexec {shlex.quote(python)} -m {module} "$@"\n')
        shim.chmod(0o755)
    metadata = folder / "eosmuster-0.dist-info"
    metadata.mkdir()
    (metadata / "METADATA").write_text("Metadata-Version: 2.1\nName: eosmuster\nVersion: 0\n")
    listed = "".join(f"{name} = {value}\n" for name, value in project["entry-points"]["pytest11"].items())
    (metadata / "entry_points.txt").write_text(f"[pytest11]\n{listed}")
    return {
        **{name: value for name, value in environment.items() if name != "PYTEST_ADDOPTS"},
        "PATH": os.pathsep.join([str(folder / "bin"), environment["PATH"]]),
        "PYTHONPATH": os.pathsep.join([environment["PYTHONPATH"], str(folder)]),
        "PYTEST_DISABLE_PLUGIN_AUTOLOAD": "1",
        "STEP_SUMMARY_FILE": "step-summary.md",
    }


def bash(script: str, folder: Path, settings: Mapping[str, str]) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        ["bash", "-c", script], cwd=folder, env=dict(settings), capture_output=True, text=True, check=False
    )


@pytest.fixture(scope="module")
def checkout(section: str, gate: str, settings: Mapping[str, str], tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder with a plan and the baseline that README says to commit."""
    folder = tmp_path_factory.mktemp("checkout")
    (folder / "chiller.eos.toml").write_text(f"{PLAN}\n{gate}", encoding="utf-8")
    [once] = re.findall(r"`(eosmuster sweep \S+\.eos\.toml --out baseline)`", section)
    done = bash(once, folder, settings)
    assert done.returncode == 0, done.stderr
    assert {path.name for path in folder.iterdir()} == {"chiller.eos.toml", "baseline"}
    return folder


def test_the_job_passes_and_leaves_its_reports(section: str, checkout: Path, settings: Mapping[str, str]) -> None:
    job, _ = blocks(section, "bash")
    (checkout / "step-summary.md").write_text("# What came before\n")
    done = bash(job, checkout, settings)
    assert (done.returncode, done.stderr) == (0, ""), done.stdout
    assert "no drift" in done.stdout
    assert re.search(r"^=+ 4 passed in ", done.stdout, re.MULTILINE)  # 2 fluids, and the 2 candidates of the gate
    results = checkout / "eosmuster-results" / "chiller"
    summary = (checkout / "step-summary.md").read_bytes()
    assert summary == b"# What came before\n" + (results / "summary.md").read_bytes()
    cases = list(ElementTree.parse(checkout / "eosmuster.xml").iter("testcase"))
    assert [len(cases), len(list(ElementTree.parse(checkout / "eosmuster.xml").iter("failure")))] == [4, 0]


def test_the_job_fails_in_every_step_and_still_reports(
    section: str, checkout: Path, settings: Mapping[str, str], tmp_path: Path
) -> None:
    """A tighter limit: the gate is not met, the verdicts have moved since the baseline, a test fails."""
    job, _ = blocks(section, "bash")
    plan = (checkout / "chiller.eos.toml").read_text(encoding="utf-8")
    (tmp_path / "chiller.eos.toml").write_text(plan.replace('"3 %"', '"0.3 %"'), encoding="utf-8")
    (tmp_path / "baseline").symlink_to(checkout / "baseline", target_is_directory=True)
    done = bash(job, tmp_path, settings)
    assert done.returncode == 1, done.stdout + done.stderr
    first, *worst = done.stderr.splitlines()
    assert re.fullmatch(r"eosmuster: the gate is not met: \d+ outside", first)
    assert re.match(
        r"  (n-Propane|Ethane), (SRK|PR), saturation pressure against handbook:\S+: \d+ of \d+ ", worst[0]
    )
    assert "no drift" not in done.stdout
    assert re.search(r"^=+ [1-4] failed.* in ", done.stdout, re.MULTILINE)
    assert (tmp_path / "step-summary.md").read_bytes() == (
        tmp_path / "eosmuster-results" / "chiller" / "summary.md"
    ).read_bytes()
    assert list(ElementTree.parse(tmp_path / "eosmuster.xml").iter("failure"))


def test_the_parts_give_the_same_folder(
    section: str, checkout: Path, settings: Mapping[str, str], tmp_path: Path
) -> None:
    _, parts = blocks(section, "bash")
    (tmp_path / "chiller.eos.toml").write_bytes((checkout / "chiller.eos.toml").read_bytes())
    done = bash(f"set -e\n{parts}", tmp_path, settings)
    assert (done.returncode, done.stderr) == (0, ""), done.stdout
    combined = tmp_path / "eosmuster-results" / "chiller"
    for name in ("points.csv", "summary.csv", "windows.csv", "summary.md"):
        assert (combined / name).read_bytes() == (checkout / "baseline" / name).read_bytes(), name


def test_the_workflow_runs_the_script_that_readme_names(section: str) -> None:
    [workflow] = blocks(section, "yaml")
    [name] = re.findall(r"this script, say `(\S+\.sh)`", section.replace("\n", " "))
    assert re.findall(r"^      - run: (bash .*)$", workflow, re.MULTILINE) == [f"bash {name}"]
    job, _ = blocks(section, "bash")
    for variable in re.findall(r"\$([A-Z_]+)", job):
        assert f"{variable}: " in workflow


def test_the_gate_that_is_shown_is_one(gate: str) -> None:
    shown = parse_plan(f"{PLAN}\n{gate}", "chiller", "README.md").gate
    assert (shown.candidates, shown.references) == (("PR", "SRK"), ("first",))
