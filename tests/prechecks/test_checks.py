"""The precheck names the faults that are known to be in the references, and leaves sound fluids alone."""

import csv
import io
import re
from pathlib import Path

import pytest

from eosmuster.cli import main
from eosmuster.components import find
from eosmuster.diagnose.findings import SEVERITIES, Finding
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.plan import builtin
from eosmuster.plan.reading import parse_plan
from eosmuster.prechecks.checks import alpha_findings, precheck
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
    assert "gives 532.7 K, -3.75 % from the median" in found.sentence
    assert found.sentence.endswith("sources: it stands alone; it is not used")
    assert found.severity == "note"
    [pressure] = told(findings, "CycloHexane", "critical pressure")
    assert "gives 37.9 bar, -6.93 % from the median 40.724 bar of 4 sources" in pressure.sentence


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
    assert not any(line.lstrip().startswith("%") for line in text.splitlines())  # a number and its % stay together
    assert not re.search(r"\w-$", text, re.MULTILINE)  # and a source's name stays whole
    assert max(map(len, text.splitlines())) <= 100
    rows = list(csv.DictReader(io.StringIO(csv_text(findings).decode())))
    assert [r["sentence"] for r in rows] == [f.sentence for f in findings]


OTHER = """
components = ["propane", "propylene glycol"]
models = ["SRK"]
properties = ["saturation_pressure", "density"]
[states]
reduced_temperature = { points = 3 }
[states.single_phase]
temperature = [400.0, 450.0]
pressure = [1e5, 2e5]
phase = "stable"
supercritical_alpha = "RULE"
[constants]
source = "SOURCE"
"""


def checked(rule: str, source: str) -> list[Finding]:
    return precheck(parse_plan(OTHER.replace("RULE", rule).replace("SOURCE", source), "other", "other"))


def test_what_a_plan_swaps_in_is_what_is_checked() -> None:
    """Passut and Danner's omega of propane is not its definition's; CRC's pc of the glycol is what others have."""
    usual, passut, crc = (checked("own", s) for s in ("library", "passut-danner-1973", "crc-95"))
    assert told(usual, "n-Propane", "acentric factor") == []
    [omega] = told(passut, "n-Propane", "acentric factor")
    assert omega.subject == "critical:passut-danner-1973"
    assert omega.sentence.startswith("critical:passut-danner-1973 gives 0.1454, but psat(0.7 Tc)/pc")
    [stored] = told(usual, "PropyleneGlycol", "critical pressure")
    assert stored.sentence == (
        "stored constant: 72.9175 bar, +23.59 % from the median 59 bar of 2 other sources: it stands alone"
    )
    [library] = told(crc, "PropyleneGlycol", "critical pressure")  # the library's is one of the others now
    assert library.subject == "stored constant"
    assert library.sentence.endswith("of 3 sources: it stands alone")


@pytest.mark.parametrize(
    ("model", "said"),
    [
        # kappa1 = -0.03136 ends at Tc: kappa1 (2)(-0.3) is what alpha' loses there
        ("PRSV", ["alpha' jumps by -0.0188, from -0.5828 to -0.6016; alpha'' jumps by -0.114, from 0.596 to 0.4817"]),
        ("SW", ["alpha'' jumps by +0.579, from 0.03562 to 0.6148"]),
        ("PR-Twu95", []),  # both sides meet to the digits that are printed
        ("PR", []),
    ],
)
def test_a_joint_at_the_critical_temperature_is_told_as_one(model: str, said: list[str]) -> None:
    """Not as the want of convexity or of a negative third derivative that differences across it would look like."""
    propane = find("propane")
    found = [f for f in alpha_findings(bind(CATALOGUE[model], [propane]), [propane]) if abs(f.value - 1.0) < 0.005]
    assert [f.sentence for f in found] == [f"{what} at 369.9 K (Tr 1.00)" for what in said]


def test_what_a_model_breaks_for_many_fluids_is_one_row() -> None:
    """Whatever their temperatures, one of them or a stretch, and however much an alpha function jumps there."""
    fluids = [find(name) for name in ("propane", "n-octane", "MM", "n-perfluorohexane", "R245ca")]
    plan = parse_plan(PLAN, "faults", "faults")
    for model in ("PRSV", "PR-Twu91"):
        found = list(alpha_findings(bind(CATALOGUE[model], fluids), fluids))
        rows = [line for line in precheck_text(plan, found, 200).split("\n") if line.startswith(model)]
        kinds = [re.split(r"  +", row)[1] for row in rows]
        assert len(set(kinds)) == len(rows) < len(found)
        assert not re.search(r"\d", "".join(kinds))


def test_the_plan_s_rule_above_the_critical_temperature_is_what_is_checked() -> None:
    """Boston and Mathias's function breaks the rule for the third derivative from Tc on, Soave's own does not."""
    own, other = (
        {f.value for f in told(checked(rule, "library"), "n-Propane", "alpha function")}
        for rule in ("own", "Boston-Mathias")
    )
    assert own != other


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
