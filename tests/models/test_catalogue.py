"""One list drives every check: whatever stands in the catalogue is tested by standing there.

A record needs a check value: a printed one in ``tests/published/worked_examples.csv``, or its equation written out
apart in ``tests/truth/equations.py``, which is a recomputation and no published value.
"""

from __future__ import annotations

import csv
from pathlib import Path

import mpmath as mp
import numpy as np
import pytest
from equations import RECOMPUTED

from eosmuster.api import saturate
from eosmuster.components import catalogue, find
from eosmuster.models.alpha import ALPHA_FUNCTIONS
from eosmuster.models.catalogue import CATALOGUE, model_names
from eosmuster.models.critical import critical_point
from eosmuster.models.forms import FORMS
from eosmuster.models.model import bind, parameter_file
from eosmuster.models.records import (
    CovolumeTranslation,
    CriticalTranslation,
    PerComponent,
    Polynomial,
    Tabulated,
    VolumeTranslation,
)
from eosmuster.quantities import GAS_CONSTANT, PROPERTIES
from eosmuster.saturation import solver

COMPONENTS = tuple(catalogue().values())
EACH = pytest.mark.parametrize("name", CATALOGUE)
REQUIRED = {
    "vdW", "RK", "SRK", "SRK-GD", "SRK-Twu95", "SRK-PM19", "PR", "PR78", "PRSV", "PR-Twu91", "PR-Twu95", "PR-Gasem",
    "PR-PM19", "tc-PR-2018", "tc-RK-2018", "PT", "SW", "RKPR", "SRK+Peneloux", "PR+Jhaveri-Youngren",
}  # fmt: skip


def published():
    """Models with a printed value of a textbook."""
    path = Path(__file__).parents[1] / "published" / "worked_examples.csv"
    with path.open(encoding="utf-8", newline="") as file:
        rows = csv.DictReader(line for line in file if not line.startswith("#"))
        return {row["model"] for row in rows if row["printed"]}


PUBLISHED = published()


# --- the records ---------------------------------------------------------------------------------------------


def test_the_twenty_models_are_there():
    assert set(CATALOGUE) >= REQUIRED
    assert len(REQUIRED) == 20


def test_names_are_unique_and_in_order():
    assert model_names() == tuple(CATALOGUE)
    assert len({name.casefold() for name in CATALOGUE}) == len(CATALOGUE)
    assert all(record.name == name for name, record in CATALOGUE.items())


@EACH
def test_record_is_cited_and_says_how_it_was_read(name):
    record = CATALOGUE[name]
    assert any(character.isdigit() for character in record.source)  # at least a year
    said = ("transcription", "from memory", "library", "exact", "transcribed")
    assert any(word in record.status for word in said)
    assert not record.own


@EACH
def test_record_is_data_of_known_kinds(name):
    record = CATALOGUE[name]
    assert record.form in FORMS.values()
    assert set(record.parameters) == set(ALPHA_FUNCTIONS[record.alpha].parameters)
    assert not any(isinstance(p, PerComponent) for p in record.parameters.values())
    assert record.translation is None or isinstance(
        record.translation, (CriticalTranslation, CovolumeTranslation, VolumeTranslation)
    )
    assert set(record.fitted) <= set(PROPERTIES)
    with pytest.raises(TypeError):
        record.parameters["m"] = None


@EACH
def test_tabulated_parameters_have_their_column(name):
    record = CATALOGUE[name]
    tabulated = [p for p in record.parameters.values() if isinstance(p, Tabulated)]
    tabulated += [t for t in vars(record.translation or object).values() if isinstance(t, Tabulated)]
    for entry in tabulated:
        rows = parameter_file(entry.file)
        assert rows
        assert all(np.isfinite(float(row[entry.column])) for row in rows.values() if row[entry.column])
    if record.constants:
        assert {p.file for p in tabulated} == {record.constants}


@EACH
def test_variant_is_named_after_what_was_done(name):
    base, plus, _ = name.partition("+")
    record = CATALOGUE[name]
    if plus:
        assert record.translation is not None
        assert (CATALOGUE[base].form, CATALOGUE[base].alpha) == (record.form, record.alpha)
        assert dict(CATALOGUE[base].parameters) == dict(record.parameters)


def test_doubtful_models_stay_out():
    """Valderrama's F and the fallback translation of tc-RK contradict what could be calculated."""
    assert not [name for name in CATALOGUE if "alderrama" in name]
    for name in ("tc-PR-2018", "tc-RK-2018"):
        assert isinstance(CATALOGUE[name].translation, VolumeTranslation)


def test_bands_of_pr78():
    """RR-28's cubic has 0.016666, not 0.16666 as in several codes: the step at omega = 0.491 is +0.0043 in m."""
    m = CATALOGUE["PR78"].parameters["m"]
    assert isinstance(m, Polynomial)
    below, above = (float(m(np.array(0.491 + step))) for step in (0.0, 1e-12))
    assert above - below == pytest.approx(0.0043, abs=5e-5)
    assert below == pytest.approx(float(CATALOGUE["PR"].parameters["m"](np.array(0.491))), rel=1e-15)


# --- a check value for every record --------------------------------------------------------------------------


@EACH
def test_every_record_has_a_check_value(name):
    assert name in PUBLISHED or name in RECOMPUTED


def test_no_check_value_is_left_over():
    assert set(CATALOGUE) >= PUBLISHED | set(RECOMPUTED)


def three(name):
    """The first, middle and last component that a model is available for."""
    reasons = bind(CATALOGUE[name], COMPONENTS).unavailable
    have = [c for c, reason in zip(COMPONENTS, reasons, strict=True) if not reason]
    return have[0], have[len(have) // 2], have[-1]


RECOMPUTATIONS = [
    pytest.param(name, component, id=f"{name}-{component.name}-recomputed, not published")
    for name in RECOMPUTED
    if name in CATALOGUE
    for component in three(name)
]


@pytest.mark.parametrize(("name", "component"), RECOMPUTATIONS)
def test_recomputation(name, component):
    """Parameters and states against the equation written out apart; more components in ``tests/truth``."""
    with mp.workdps(60):
        equation = RECOMPUTED[name](component)
        tc = float(equation.critical_temperature)
        T = 0.65 * tc
        exact = [float(x) for x in equation.state(T)]
        alpha = float(equation.alpha(mp.mpf(0.65)))
    states = saturate(component, name, temperature=T)
    np.testing.assert_allclose((states.pressure, states.liquid_density, states.vapor_density), exact, rtol=5e-13)
    parameters = bind(CATALOGUE[name], [component]).parameters.take(0)
    assert float(parameters.critical_temperature) == tc
    found = 1.0 + float(parameters.alpha.excess(np.array(0.35), *parameters.alpha_parameters))
    assert found == pytest.approx(alpha, rel=1e-14)


# --- every model for every component --------------------------------------------------------------------------


@EACH
@pytest.mark.parametrize("reduced", [0.5, 0.7, 0.9])
def test_solved_for_every_component(name, reduced):
    bound = bind(CATALOGUE[name], COMPONENTS)
    rows = np.array([i for i, reason in enumerate(bound.unavailable) if not reason])
    assert rows.size >= 26
    parameters = bound.parameters.take(rows)
    states = solver.at_temperature(parameters, reduced * parameters.critical_temperature)
    assert (states.status == solver.SOLVED).all()
    assert ((states.pressure > 0) & (states.pressure < parameters.critical_pressure)).all()
    assert ((states.liquid_density > states.vapor_density) & (states.vapor_density > 0)).all()
    assert np.isfinite(states.log_slope).all()
    assert (solver.enthalpy_of_vaporization(states) > 0).all()


@EACH
def test_unavailable_components_have_no_numbers(name):
    bound = bind(CATALOGUE[name], COMPONENTS)
    states = solver.at_temperature(bound.parameters, np.array([0.7 * c.critical_temperature for c in COMPONENTS]))
    for status, pressure, reason in zip(states.status, states.pressure, bound.unavailable, strict=True):
        assert (status == solver.UNAVAILABLE) == bool(reason)
        assert np.isnan(pressure) == bool(reason)


@EACH
def test_identities_at_the_critical_point(name):
    """alpha = 1, p = pc and both densities at the form's critical density, whatever the component."""
    bound = bind(CATALOGUE[name], COMPONENTS)
    rows = np.array([i for i, reason in enumerate(bound.unavailable) if not reason])
    p = bound.parameters.take(rows)
    states = solver.at_temperature(p, p.critical_temperature)
    # 5e-13 and 2e-12: what the nodes of forms made on demand are good for at the critical point
    np.testing.assert_allclose(states.pressure, p.critical_pressure, rtol=5e-13)
    molar = GAS_CONSTANT * p.critical_temperature / p.critical_pressure
    shift = 0.0 if p.translation is None else p.translation
    density = 1.0 / (molar * (critical_point(p.s, p.m).z[p.form] - shift))
    np.testing.assert_allclose(states.liquid_density, density, rtol=2e-12)
    np.testing.assert_allclose(states.vapor_density, density, rtol=2e-12)


def test_pr_is_pr78_up_to_its_band():
    states = {name: saturate("propane", name, temperature=[200.0, 300.0]) for name in ("PR", "PR78")}
    np.testing.assert_array_equal(states["PR"].pressure, states["PR78"].pressure)
    heavy = find("n-Dodecane")  # omega = 0.574
    assert saturate(heavy, "PR", temperature=400.0).pressure != saturate(heavy, "PR78", temperature=400.0).pressure


@pytest.mark.parametrize(
    ("translated", "base"), [("SRK+Peneloux", "SRK"), ("PR+Peneloux", "PR"), ("PR+Jhaveri-Youngren", "PR")]
)
def test_translation_leaves_pressure_and_enthalpy(translated, base):
    T = [250.0, 300.0, 350.0]
    a, b = (saturate("propane", name, temperature=T) for name in (translated, base))
    np.testing.assert_array_equal(a.pressure, b.pressure)
    # 1e-13: volumes are formed back from densities
    np.testing.assert_allclose(a.enthalpy_of_vaporization, b.enthalpy_of_vaporization, rtol=1e-13)
    change = 1.0 / a.liquid_density - 1.0 / b.liquid_density
    np.testing.assert_allclose(change, 1.0 / a.vapor_density - 1.0 / b.vapor_density, rtol=1e-9)
    assert (np.abs(change * b.liquid_density) > 1e-3).all()
