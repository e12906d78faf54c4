"""The precheck names the faults that are known to be in the references, and leaves sound fluids alone."""

import csv
import io
from pathlib import Path

import pytest

from eosmuster.cli import main
from eosmuster.diagnose.findings import SEVERITIES, Finding
from eosmuster.plan import builtin
from eosmuster.plan.reading import parse_plan
from eosmuster.prechecks.checks import precheck
from eosmuster.prechecks.text import csv_text, precheck_text

PLAN = """
title = "Known faults"
components = ["propylene glycol", "cyclohexane", "cyclopropane", "R125", "n-Perfluorobutane",
              "propane", "argon", "R134a", "water", "helium"]
models = ["PR", "SRK", "tc-PR-2018"]
properties = ["saturation_pressure", "liquid_density", "enthalpy_of_vaporization"]
[states]
reduced_temperature = { points = 11 }
"""


@pytest.fixture(scope="module")
def findings() -> list[Finding]:
    return precheck(parse_plan(PLAN, "faults", "faults"))


def told(findings: list[Finding], component: str, check: str) -> list[Finding]:
    return [f for f in findings if f.component == component and f.check == check]


def test_propylene_glycol_contradicts_its_own_equation(findings) -> None:
    [found] = told(findings, "PropyleneGlycol", "acentric factor")
    assert found.severity == "contradiction"
    assert "0.32684" in found.sentence
    assert "0.71956" in found.sentence


def test_the_cyclohexane_row_that_holds_another_substance(findings) -> None:
    [found] = told(findings, "CycloHexane", "critical temperature")
    assert found.subject.startswith("critical:iupac")
    assert "stands alone" in found.sentence


def test_cyclopropane_tables_share_an_error(findings) -> None:
    [found] = told(findings, "CycloPropane", "references of saturation pressure")
    assert "wagner-mcgarry-1983" in found.subject
    assert "wagner-vdi-2010" in found.subject
    assert "coolprop" not in found.subject


def test_a_wrong_molar_mass_is_told_with_its_evidence(findings) -> None:
    found = [f for f in told(findings, "R125", "excluded reference") if "enthalpy" in f.sentence]
    assert any("182.564" in f.sentence for f in found)


def test_a_lost_decimal_point(findings) -> None:
    [found] = told(findings, "n-Perfluorobutane", "references of saturation pressure")
    assert abs(found.value) > 99.0
    assert any("decimal point" in f.sentence for f in told(findings, "n-Perfluorobutane", "excluded reference"))


@pytest.mark.parametrize("component", ["n-Propane", "Argon", "R134a"])
def test_sound_fluids_have_no_contested_reference(findings, component) -> None:
    for name in ("saturation pressure", "liquid density"):
        assert told(findings, component, f"references of {name}") == []


def test_plain_peng_robinson_cannot_reach_water(findings) -> None:
    """M/b of water is 950 kg/m3 by this form (common practice: plain PR never reaches 1000)."""
    [found] = [f for f in told(findings, "Water", "reach of the form") if f.subject == "PR"]
    assert found.expected * 0.018015268 == pytest.approx(950, abs=1)


def test_helium_breaks_the_rules_below_its_critical_temperature(findings) -> None:
    """m of Soave's form is negative for helium, so alpha rises."""
    found = [f for f in told(findings, "Helium", "alpha function") if f.subject == "PR" and "fall" in f.sentence]
    assert found[0].severity == "doubt"


def test_worst_comes_first(findings) -> None:
    order = [SEVERITIES.index(f.severity) for f in findings]
    assert order == sorted(order)


def test_text_fits_and_csv_holds_every_finding(findings) -> None:
    text = precheck_text(parse_plan(PLAN, "faults", "faults"), findings, 100)
    assert max(map(len, text.splitlines())) <= 100
    rows = list(csv.DictReader(io.StringIO(csv_text(findings).decode())))
    assert [r["sentence"] for r in rows] == [f.sentence for f in findings]


def test_command(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["precheck", "ammonia-refrigeration", "--csv", str(tmp_path / "f.csv")]) == 0
    assert builtin.load("ammonia-refrigeration").title in capsys.readouterr().out
    assert (tmp_path / "f.csv").exists()


def test_unwritable_csv_is_one_sentence(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    blocked = tmp_path / "file"
    blocked.write_text("in the way")
    assert main(["precheck", "ammonia-refrigeration", "--csv", str(blocked / "f.csv")]) == 2
    told = capsys.readouterr()
    assert told.out == ""  # said before the work begins
    assert told.err.count("\n") == 1
    assert "--csv" in told.err
