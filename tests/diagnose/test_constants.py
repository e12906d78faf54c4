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


def test_catalogued_alkanes_stay_in_their_series() -> None:
    """But for undecane, whose stored pc lies 2.02 % above the curve of its neighbours: reported, and just so."""
    found = list(constants.series(list(catalogue().values())))
    assert [(f.component, f.subject) for f in found] == [("n-Undecane", "pc")]
    assert found[0].value / found[0].expected == pytest.approx(1.0202, abs=1e-3)


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


def test_a_stated_error_excuses() -> None:
    values = {"critical_temperature": [("one", 553.4, NAN), ("two", 545.0, 5.0)]}
    assert list(constants.critical_table(find("cyclohexane"), values, {"critical_temperature": 0.01})) == []
