"""References in a precheck: who stands alone and why, what is left out and why, and what goes the wrong way."""

from __future__ import annotations

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.diagnose.conflicts import Source
from eosmuster.diagnose.findings import Finding
from eosmuster.plan.schema import Decision
from eosmuster.prechecks.references import reference_findings, sources_of, used_sources
from eosmuster.quantities import CONTESTED_ABOVE
from eosmuster.sources import library
from eosmuster.sources.uncertainty import uncertainty_pct

T = np.array([250.0, 270.0, 290.0, 310.0, 330.0])


def found(name: str, check: str = "", measured: list[tuple[str, Source]] | None = None) -> list[Finding]:
    return [f for f in reference_findings(find(name), measured or ()) if f.check.startswith(check)]


def test_a_boiling_point_tells_which_of_two_formulas_is_wrong() -> None:
    """Perfluorobutane has the library and one row, whose C lost its decimal point; CRC Handbook, 95th edition."""
    [conflict] = found("n-Perfluorobutane", "references of saturation pressure")
    assert conflict.severity == "note"  # it is left out already
    assert conflict.subject == "handbook:antoine-landolt-boernstein-20"
    assert "stands alone against coolprop, the boiling point of handbook:crc-95" in conflict.sentence


@pytest.mark.parametrize("name", ["R22", "isobutane"])
def test_a_row_that_repeats_another_has_no_vote(name: str) -> None:
    """Poling's Antoine row is off at its low end; Landolt-Boernstein repeats it, and is no second witness."""
    [conflict] = found(name, "references of saturation pressure")
    assert conflict.subject == "handbook:antoine-poling-2001"
    assert "landolt" not in conflict.sentence
    repeated = [f for f in found(name, "excluded reference") if "landolt" in f.subject]
    assert [f.severity for f in repeated] == ["note"]


def test_what_is_left_out_as_a_whole_is_a_doubt_and_names_what_is_in_use() -> None:
    """R125: the transcription of the VDI table carries another molar mass, so nothing but its note tells."""
    heats = [f for f in found("R125", "excluded reference") if "enthalpy" in f.sentence]
    [table] = [f for f in heats if f.subject == "handbook:vdi-2010"]
    assert table.severity == "doubt"
    assert "182.564 g/mol (R125: 120.021)" in table.sentence
    assert table.sentence.endswith("it stands against what is in use: coolprop")
    assert found("R125", "references of enthalpy") == []  # the recovered values agree


def test_single_values_and_rows_already_accused_are_notes() -> None:
    propane = found("propane", "excluded reference")
    assert any("this value alone: -99.9 %" in f.sentence for f in propane)
    assert {f.severity for f in propane} == {"note"}
    accused = [f for f in found("cyclopropane", "excluded reference") if "wagner" in f.subject]
    assert {f.severity for f in accused} == {"note"}


def test_critical_constants_that_are_out_come_with_their_evidence() -> None:
    """The IUPAC series' row of cyclohexane holds methylcyclopentane's constants, and the other way round."""
    rows = [f for f in found("cyclohexane", "excluded reference") if "critical constants" in f.sentence]
    assert [f.subject for f in rows] == ["critical:iupac-critical-5"]
    assert "methylcyclopentane" in rows[0].sentence


def test_a_table_that_goes_the_wrong_way() -> None:
    """Ethylbenzene, VDI Heat Atlas: the vapor at 513 K is printed thinner than at 493 K, and is not in use."""
    [turn] = found("ethylbenzene", "order along temperature")
    assert (turn.severity, turn.subject) == ("note", "handbook:vdi-2010")
    assert (turn.from_K, turn.to_K) == (493.0, 513.0)
    assert turn.sentence.startswith("vapor density by handbook:vdi-2010 falls with temperature, by 7.24 %")


@pytest.mark.parametrize("name", ["water", "helium", "hydrogen", "heavy water", "propane"])
def test_what_nature_does_is_not_reported(name: str) -> None:
    assert found(name, "order along temperature") == []


def test_measured_sets_are_held_against_the_others() -> None:
    """Invented: 5 % above the library, then with two neighbours exchanged."""
    propane = find("propane")
    p = library.saturation(propane, T, ["saturation_pressure"]).values["saturation_pressure"]
    unknown = np.full(T.size, np.nan)
    high = [("saturation_pressure", Source("measured:lab.csv", T, 1.05 * p, unknown))]
    [conflict] = found("propane", "references of saturation pressure", high)
    assert (conflict.severity, conflict.subject) == ("contradiction", "measured:lab.csv")
    assert conflict.value == pytest.approx(5.0, abs=0.2)
    swapped = [("saturation_pressure", Source("measured:lab.csv", T, p[[0, 2, 1, 3, 4]], unknown))]
    [turn] = found("propane", "order along temperature", swapped)
    assert (turn.from_K, turn.to_K) == (270.0, 290.0)
    assert found("propane", "references of", [("liquid_density", high[0][1])])[0].check.endswith("liquid density")


def test_what_is_left_out_already_contradicts_nobody_who_is_in_use() -> None:
    """Isobutane's Antoine row is out; propylene glycol stands with the library alone, which is in use."""
    [settled] = found("isobutane", "references of saturation pressure")
    assert (settled.severity, settled.subject) == ("note", "handbook:antoine-poling-2001")
    assert settled.sentence.endswith("; it is not used")
    [open_one] = found("propylene glycol", "references of saturation pressure")
    assert (open_one.severity, open_one.subject) == ("contradiction", "coolprop")


@pytest.mark.parametrize(("name", "quantity"), [("propane", "saturation_pressure"), ("water", "liquid_density")])
@pytest.mark.parametrize("counts", ["read", "remembered", "assumed"])
def test_uncertainties_count_as_in_a_sweep(name: str, quantity: str, counts: str) -> None:
    """Whatever a plan says of them: for the library and for the handbook, with the plan's coverage factor."""
    fluid, decision = find(name), Decision(coverage_factor=3.0, uncertainty=counts)
    library_source, *others = sources_of(fluid, quantity, decision)
    levels = {"remembered": counts != "read", "assumed": counts == "assumed"}
    expected = uncertainty_pct(fluid, quantity, library_source.temperature, 3.0, **levels)
    assert np.array_equal(library_source.uncertainty_pct, expected, equal_nan=True)
    assert np.isfinite(expected).all() == (counts == "assumed")
    formulas = [one for one in others if one.evaluate is not None]
    assert formulas
    assert any(np.isfinite(one.uncertainty_pct).any() for one in formulas) == (counts == "assumed")


def test_printed_digits_excuse_a_table_as_in_a_sweep() -> None:
    """Helium's heat of vaporization, CRC Handbook: printed as 0.08 kJ/mol, which is 3.5 % off and rounded by 6 %."""
    assert found("helium", "references of enthalpy of vaporization") == []


def test_a_plan_says_what_is_contested() -> None:
    """Cyclopropane's liquid density is 2.7 % off both handbooks."""
    about = "references of liquid density"
    for above, expected in ((2.0, ["coolprop"]), (4.0, [])):
        thresholds = {**CONTESTED_ABOVE, "liquid_density": above}
        findings = reference_findings(find("cyclopropane"), contested_above=thresholds)
        assert [f.subject for f in findings if f.check == about] == expected


def test_what_is_in_use() -> None:
    glycol = find("propylene glycol")
    assert used_sources(glycol, "saturation_pressure") == ["coolprop"]
    assert {s.name for s in sources_of(glycol, "saturation_pressure", include_excluded=False)} == {"coolprop"}
    assert len(list(sources_of(glycol, "saturation_pressure"))) == 3
    assert used_sources(find("orthohydrogen"), "liquid_density") == ["coolprop"]  # no CAS number, no rows
