"""What is not needed is not loaded: help and lists come at once, the reference library only where it is asked."""

from __future__ import annotations

import json
import subprocess
from collections.abc import Mapping

import pytest

HEAVY = ("CoolProp", "pandas", "scipy", "jinja2", "xlsxwriter")

_COMMAND = """
import json, sys
from eosmuster.cli import main
try:
    status = main(sys.argv[1:])
except SystemExit as stop:
    status = stop.code
print(json.dumps([status, sorted(sys.modules)]), file=sys.stderr)
"""


@pytest.mark.parametrize(
    "arguments",
    [
        ("--help",),
        ("sweep", "--help"),
        ("list", "models"),
        ("list", "components"),
        ("list", "references"),
        ("list", "properties"),
        ("list", "plans"),
    ],
    ids=" ".join,
)
def test_help_and_lists_load_nothing_heavy(
    arguments: tuple[str, ...], python: str, environment: Mapping[str, str]
) -> None:
    done = subprocess.run(
        [python, "-c", _COMMAND, *arguments], capture_output=True, text=True, env=environment, check=True
    )
    status, loaded = json.loads(done.stderr)
    assert status == 0
    assert done.stdout.strip()
    assert [name for name in HEAVY if name in loaded] == []


def test_help_loads_no_numpy(python: str, environment: Mapping[str, str]) -> None:
    done = subprocess.run(
        [python, "-c", _COMMAND, "--help"], capture_output=True, text=True, env=environment, check=True
    )
    assert "numpy" not in json.loads(done.stderr)[1]


def test_importing_the_package_loads_no_numpy(python: str, environment: Mapping[str, str]) -> None:
    text = (
        "import sys, eosmuster; dir(eosmuster); eosmuster.Component, eosmuster.InputError; print(sorted(sys.modules))"
    )
    done = subprocess.run([python, "-c", text], capture_output=True, text=True, env=environment, check=True)
    assert "'eosmuster.components'" in done.stdout
    assert [name for name in ("numpy", *HEAVY) if f"'{name}'" in done.stdout] == []


def test_saturating_by_own_constants_loads_no_reference_library(python: str, environment: Mapping[str, str]) -> None:
    text = (
        "import sys, eosmuster as em;"
        "c = em.Component(name='x', critical_temperature=369.89, critical_pressure=4251200.0,"
        "                 acentric_factor=0.1521);"
        "r = em.saturate(c, 'PR', temperature=300.0);"
        "assert str(r.status) == 'solved', r;"
        "print(sorted(sys.modules))"
    )
    done = subprocess.run([python, "-c", text], capture_output=True, text=True, env=environment, check=True)
    assert [name for name in HEAVY if f"'{name}'" in done.stdout] == []
