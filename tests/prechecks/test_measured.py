"""Measured files in a precheck: bad files, contradicting sets, and what several sets say. All data are invented.

They are the reference library's values, changed in the way that is to be found.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.diagnose.findings import Finding
from eosmuster.errors import InputError
from eosmuster.plan.reading import load_plan
from eosmuster.prechecks.checks import precheck
from eosmuster.prechecks.text import MOST_SHOWN, precheck_text
from eosmuster.sources import library

PLAN = """
title = "measured"
components = ["propane", "isobutane", "R1233zd(E)"]
models = ["PR"]
properties = ["saturation_pressure", "liquid_density"]
[states]
reduced_temperature = { points = 3 }
[references]
use = ["coolprop"]
files = ["lab"]
"""
HEAD = "component,temperature [K],saturation_pressure [kPa],u(saturation_pressure) [kPa]"
T = np.array([251.0, 272.0, 291.0, 309.0, 332.0])

Checked = Callable[[dict[str, str]], list[Finding]]


@pytest.fixture
def checked(tmp_path: Path) -> Checked:
    """Run a precheck on files: name -> text."""

    def check(files: dict[str, str]) -> list[Finding]:
        for name, text in files.items():
            path = tmp_path / "lab" / name
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_text(text, encoding="utf-8")
        (tmp_path / "plan.toml").write_text(PLAN, encoding="utf-8")
        return precheck(load_plan(tmp_path / "plan.toml"))

    return check


def table(name: str, factor: float = 1.0, values_of: str = "", shift: float = 0.0) -> str:
    of = find(values_of or name)
    p = factor * library.saturation(of, T + shift, ["saturation_pressure"]).values["saturation_pressure"]
    return "\n".join(
        [HEAD, *(f"{name},{t:.2f},{x / 1e3:.6g},{x / 1e6:.3g}" for t, x in zip(T + shift, p, strict=True))]
    )


def told(findings: list[Finding], check: str) -> list[Finding]:
    return [f for f in findings if f.check == check]


def test_sound_files_are_silent(checked: Checked) -> None:
    findings = checked({"a.csv": table("propane"), "deep/b.csv": table("isobutane")})
    assert told(findings, "measured file") == told(findings, "measured set") == []


def test_bad_files_are_listed_and_the_rest_is_read(checked: Checked) -> None:
    findings = checked({"bad.xml": "<html/>", "empty.csv": "", "good.csv": table("propane", 1.2)})
    bad = told(findings, "measured file")
    assert [(f.subject, f.severity) for f in bad] == [("lab/bad.xml", "doubt"), ("lab/empty.csv", "doubt")]
    assert "it is not ThermoML" in bad[0].sentence
    assert told(findings, "measured set")[0].component == "n-Propane"


def test_causes_are_named_and_values_lost_are_counted(checked: Checked) -> None:
    swapped = (
        table("propane", values_of="isobutane")
        + "\n"
        + "\n".join(table("isobutane", values_of="propane").split("\n")[1:])
    )
    findings = checked({"swap.csv": swapped + "\nunobtainium,300,1,0.1\n", "atm.csv": table("propane", 1.01325)})
    sets = told(findings, "measured set")
    assert {f.severity for f in sets} == {"contradiction"}
    assert any("exchanged" in f.sentence and f.component == "n-Propane" for f in sets)
    assert any("bar stored as atm (1.01325)" in f.sentence for f in sets)
    assert all((f.from_K, f.to_K) == (251.0, 332.0) for f in sets)
    assert any(f.sentence.endswith("(1 value lost)") for f in told(findings, "measured file"))


def test_sets_together_have_one_vote_each(checked: Checked) -> None:
    files = {
        f"{i}.csv": table("propane", factor, shift=0.3 * i) for i, factor in enumerate([1.001, 1.0, 0.999, 1.03])
    }
    [together] = told(checked(files), "measured sets together")
    assert (together.component, together.severity, together.subject) == ("n-Propane", "doubt", "lab/3.csv")
    assert together.value == pytest.approx(0.05, abs=1e-3)  # the median of -0.1, 0, 0.1 and 3 %
    assert "4 measured sets, one vote each (20 points)" in together.sentence


def test_a_set_known_to_be_wrong_has_no_vote(checked: Checked) -> None:
    files = {
        "a.csv": table("propane"),
        "b.csv": table("propane", 1.001, shift=0.5),
        "atm.csv": table("propane", 1.01325),
    }
    [together] = told(checked(files), "measured sets together")
    assert "2 measured sets" in together.sentence
    assert "atm.csv" not in together.sentence


def test_boiling_points_are_states_of_the_vapor_pressure_curve(checked: Checked) -> None:
    p = library.saturation(find("propane"), T, ["saturation_pressure"]).values["saturation_pressure"]
    boiling = "component,pressure [kPa],boiling_temperature [K]\n"
    boiling += "\n".join(f"propane,{x / 1e3:.7g},{t:.4f}" for x, t in zip(p, T, strict=True))
    [together] = told(checked({"t.csv": boiling, "p.csv": table("propane")}), "measured sets together")
    assert together.sentence.startswith("saturation pressure: 2 measured sets")
    assert together.value == pytest.approx(0.0, abs=1e-3)


def test_measured_sets_can_outvote_the_library(checked: Checked) -> None:
    """Two files that agree 4 % off the library, at states of their own: as two papers on one refrigerant did."""
    files = {"a.csv": table("R1233zd(E)", 1.04), "b.csv": table("R1233zd(E)", 1.041, shift=0.4)}
    [conflict] = [f for f in checked(files) if f.component == "R1233zd(E)" and f.check.startswith("references of")]
    assert conflict.subject == "coolprop"
    assert "against measured:lab/a.csv, measured:lab/b.csv" in conflict.sentence
    assert conflict.value == pytest.approx(100.0 * (1.0 / 1.0405 - 1.0), abs=0.1)


def test_many_bad_files_are_counted_and_each_is_reported(tmp_path: Path) -> None:
    (tmp_path / "lab").mkdir()
    for i in range(40):
        (tmp_path / "lab" / f"{i:02}.csv").write_text("", encoding="utf-8")
    (tmp_path / "plan.toml").write_text(PLAN, encoding="utf-8")
    plan, seen = load_plan(tmp_path / "plan.toml"), []
    findings = precheck(plan, lambda what, done, of: seen.append((what, done, of)))
    assert [step for step in seen if step[0] == "measured"] == [("measured", i, 40) for i in range(40)]
    text = precheck_text(plan, findings, 100)
    assert sum(line.startswith("  measured file: lab/") for line in text.splitlines()) == MOST_SHOWN
    assert f"measured file: {40 - MOST_SHOWN} more; --csv FILE writes every one" in text
    assert len(told(findings, "measured file")) == 40


def test_a_pattern_without_files_is_one_sentence(tmp_path: Path) -> None:
    (tmp_path / "plan.toml").write_text(PLAN, encoding="utf-8")
    with pytest.raises(InputError, match=r"references.files: 'lab' names no file"):
        precheck(load_plan(tmp_path / "plan.toml"))
