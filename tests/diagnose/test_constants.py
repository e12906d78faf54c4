"""Constants checks on constructed components with one fault each."""

import numpy as np
import pytest

from eosmuster.components import Component, catalogue, find
from eosmuster.diagnose import constants

NAN = float("nan")


def component(**changes) -> Component:
    known = {"critical_temperature": 400.0, "critical_pressure": 4e6, "acentric_factor": 0.2, "molar_mass": 0.06}
    return Component("invented", **(known | changes))


def test_acentric_factor_that_contradicts_its_definition() -> None:
    """omega = -1 - log10(psat(0.7 Tc)/pc): 0.4 here."""
    psat = 4e6 * 10 ** (-1.4)
    [found] = constants.acentric(component(), 0.2, psat)
    assert (found.severity, found.expected) == ("contradiction", pytest.approx(0.4))
    assert list(constants.acentric(component(), 0.401, psat)) == []
    assert [f.severity for f in constants.acentric(component(), 0.42, psat)] == ["doubt"]


def test_compressibility() -> None:
    assert list(constants.compressibility(component(critical_density=4455.0))) == []  # Z_c = 0.27
    [found] = constants.compressibility(component(critical_density=2000.0))
    assert found.value == pytest.approx(0.601, abs=1e-3)
    assert list(constants.compressibility(component())) == []


def test_catalogued_fluids_stay_in_their_series() -> None:
    """But for two: undecane's stored pc lies 2.02 % above the curve of its neighbours, and perfluoropentane's 3.1 %
    above one that ends in perfluorohexane, whose stored 1.74 MPa stand alone (tables: 1.81 to 1.88)."""
    found = {(f.component, f.subject): f for f in constants.series(list(catalogue().values()))}
    assert set(found) == {("n-Undecane", "pc"), ("n-Perfluoropentane", "pc")}
    assert found["n-Undecane", "pc"].value / found["n-Undecane", "pc"].expected == pytest.approx(1.0202, abs=1e-3)
    assert "its neighbours among the perfluoro-n-alkanes lead to" in found["n-Perfluoropentane", "pc"].sentence


def test_members_of_a_series_are_those_of_its_formula() -> None:
    """Rings, ketones and the light n-alkanes of the same classes are none."""
    members = {s.name: [c.name for c in catalogue().values() if s.holds(c)] for s in constants.SERIES}
    assert len(members["n-alkanes"]) == 9
    assert set(members["linear siloxanes"]) == {"MM", "MDM", "MD2M", "MD3M", "MD4M"}
    fluorinated = {"n-Perfluorobutane", "n-Perfluoropentane", "n-Perfluorohexane"}
    assert set(members["perfluoro-n-alkanes"]) == {"R14", "R116", "R218", *fluorinated}


@pytest.mark.parametrize(("name", "constant"), [("MD2M", "critical_temperature"), ("R218", "critical_pressure")])
def test_a_misprinted_member_of_any_series_stands_out(name: str, constant: str) -> None:
    from dataclasses import replace

    fluids = [
        replace(c, **{constant: 1.05 * getattr(c, constant)}) if c.name == name else c for c in catalogue().values()
    ]
    assert name in {f.component for f in constants.series(fluids)}


def test_a_misprinted_alkane_stands_out() -> None:
    from dataclasses import replace

    wrong = [replace(c, critical_temperature=590.0) if c.name == "n-Octane" else c for c in catalogue().values()]
    assert "n-Octane" in {f.component for f in constants.series(wrong)}


def test_copied_rows() -> None:
    rows = {"a": (1.0, 2.0), "b": (1.0, 2.5), "c": (1.0, 2.0)}
    [found] = constants.duplicates(rows, "file.csv")
    assert (found.component, found.sentence) == ("c", "has the very same parameters as a")


def test_a_critical_table_that_stands_alone() -> None:
    """The row of cyclohexane that holds methylcyclopentane: 532.7 K."""
    values = {"critical_temperature": [("one", 553.4, NAN), ("two", 532.7, NAN), ("three", 553.6, 0.2)]}
    [found] = constants.critical_table(find("cyclohexane"), values, {"critical_temperature": 0.01})
    assert found.subject == "two"
    assert found.value == 532.7
    assert np.isclose(found.expected, 553.5, atol=0.2)


def test_a_constant_of_the_component_s_own_that_stands_alone() -> None:
    """Invented: Tc of 400 K, which three sources know to be 369.9 K; one more source is off as well."""
    rows = [("one", 369.8, NAN), ("two", 369.9, NAN), ("three", 369.85, NAN)]
    tolerance = {"critical_temperature": 0.01}
    [found] = constants.critical_table(component(), {"critical_temperature": rows}, tolerance)
    assert (found.subject, found.severity, found.value, found.expected) == (
        "stored constant",
        "contradiction",
        400.0,
        369.85,
    )
    assert found.sentence == (
        "stored constant: 400 K, +8.15 % from the median 369.85 K of 3 other sources: it stands alone"
    )
    both = constants.critical_table(component(), {"critical_temperature": [*rows, ("four", 350.0, NAN)]}, tolerance)
    assert [f.subject for f in both] == ["stored constant", "four"]
    table = {"critical_temperature": "critical:table"}
    [named] = constants.critical_table(component(), {"critical_temperature": rows}, tolerance, table)
    assert named.sentence.startswith("critical:table gives 400 K")


@pytest.mark.parametrize("cited", [(369.8,), (369.8, 430.0), (398.0, 401.0)], ids=["one", "two that differ", "near"])
def test_no_majority_convicts_no_constant(cited: tuple[float, ...]) -> None:
    values = {"critical_temperature": [(f"source {i}", value, NAN) for i, value in enumerate(cited)]}
    found = constants.critical_table(component(), values, {"critical_temperature": 0.01})
    assert "stored constant" not in {f.subject for f in found}


def test_a_stated_error_excuses() -> None:
    values = {"critical_temperature": [("one", 553.4, NAN), ("two", 545.0, 5.0)]}
    assert list(constants.critical_table(find("cyclohexane"), values, {"critical_temperature": 0.01})) == []
