"""The single-phase kernel against multi-precision derivatives of the Helmholtz energy, 648 random states.

1e-12 relative (what is promised is 1e-9; the worst measured is 2e-13). Near the critical point too: the table's
temperatures and pressures are doubles taken as exact, and the kernel loses nothing on the way from them. Where a
property passes through zero no relative figure can be kept: what counts there is the size of the terms that cancel,
so each property has a floor of 1e-3 of its own natural size below which a difference is taken absolutely.
"""

from __future__ import annotations

import csv
from dataclasses import replace

import generate_single_phase as truth
import mpmath as mp
import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.custom import record_from_plan
from eosmuster.models.model import bind
from eosmuster.quantities import GAS_CONSTANT, PHASES
from eosmuster.singlephase import solver

WITHIN = 1e-12
EXTRA = {
    "own Mathias-Copeman": record_from_plan(
        {
            "name": "own Mathias-Copeman",
            "form": "Peng-Robinson",
            "alpha": "Mathias-Copeman",
            "parameters": dict(zip(("c1", "c2", "c3"), truth.MATHIAS_COPEMAN, strict=True)),
            "source": "invented",
        },
        "test",
    ),
    "PR+Boston-Mathias": replace(CATALOGUE["PR"], supercritical="Boston-Mathias"),
    "PR-Twu95+Boston-Mathias": replace(CATALOGUE["PR-Twu95"], supercritical="Boston-Mathias"),
}
RECORDS = CATALOGUE | EXTRA
HEAT_CAPACITIES = ("residual_isobaric_heat_capacity", "residual_isochoric_heat_capacity")


def rows():
    with truth.FILE.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(line for line in file if not line.startswith("#")))


ROWS = rows()


def given(table):
    """T, p and phase of rows."""
    T, p = (np.array([float(row[name]) for row in table]) for name in ("temperature_K", "pressure_Pa"))
    return T, p, np.array([PHASES.index(row["phase"]) for row in table])


def exact(table, name):
    return np.array([float(row[name]) for row in table])


def parameters(record, table):
    return bind(record, [find(row["component"]) for row in table]).parameters


def scales(states):
    """The natural size of each property: what the terms that cancel in it are made of."""
    rt, volume = GAS_CONSTANT * states.temperature, 1.0 / states.density
    sizes = {
        "density": states.density,
        "compressibility_excess": np.minimum(1.0, states.density * 1e-4),  # B rho, B about 1e-4 m3/mol
        "pressure_by_temperature": states.pressure_by_temperature,
        "pressure_by_density": states.pressure_by_density,
        "enthalpy_by_pressure": np.maximum(volume, 1e-4),
    }
    small = sizes["compressibility_excess"]
    energies = dict.fromkeys(("residual_enthalpy", "residual_internal_energy"), rt * small)
    entropies = dict.fromkeys(("residual_entropy", *HEAT_CAPACITIES), GAS_CONSTANT * small)
    return sizes | energies | entropies | {"log_fugacity_coefficient": small}


@pytest.mark.parametrize("model", RECORDS)
def test_every_property(model):
    table = [row for row in ROWS if row["model"] == model]
    assert len(table) >= 16
    states = solver.at_pressure(parameters(RECORDS[model], table), *given(table))
    assert (states.status == solver.SOLVED).all()
    sizes = scales(states)
    for name in truth.PROPERTIES:
        expected = exact(table, name)
        allowed = WITHIN * np.maximum(np.abs(expected), 1e-3 * np.abs(sizes[name]))
        assert (np.abs(getattr(states, name) - expected) <= allowed).all(), name


@pytest.mark.parametrize("model", RECORDS)
def test_the_same_at_the_density(model):
    """The density of a cold liquid says little of its pressure, so both are given."""
    table = [row for row in ROWS if row["model"] == model]
    T, p, phases = given(table)
    model_parameters = parameters(RECORDS[model], table)
    states = solver.at_density(model_parameters, T, exact(table, "density"), p)
    expected = solver.at_pressure(model_parameters, T, p, phases)
    # a density is rounded to a double: near the critical point its last bit moves (dp/drho)_T, and what hangs on it
    far = np.array([row["kind"] != "near" for row in table])
    for name in ("residual_enthalpy", "residual_entropy", "residual_isobaric_heat_capacity", "pressure_by_density"):
        found, there = getattr(states, name), getattr(expected, name)
        np.testing.assert_allclose(found[far], there[far], rtol=1e-9, atol=1e-12 * np.abs(there).max())
        np.testing.assert_allclose(found, there, rtol=1e-4)


def test_every_kind_of_state_is_there():
    kinds = {(row["kind"], row["phase"]) for row in ROWS}
    assert kinds == {
        ("below", "liquid"), ("below", "vapor"), ("compressed", "liquid"), ("near", "liquid"), ("near", "vapor"),
        ("near", "supercritical"), ("above", "supercritical"),
    }  # fmt: skip
    assert {row["model"] for row in ROWS} == set(RECORDS) == set(truth.MODELS)
    assert len(ROWS) == 648
    assert max(float(row["temperature_K"]) / find(row["component"]).critical_temperature for row in ROWS) > 4.5


def test_unavailable_pairs_are_the_packages():
    components = [find(name) for name in truth.COMPONENTS]
    found = {
        (model, c.name)
        for model, record in CATALOGUE.items()
        for c, reason in zip(components, bind(record, components).unavailable, strict=True)
        if reason
    }
    assert found == truth.UNAVAILABLE


def test_the_states_are_the_drawn_ones():
    with mp.workdps(truth.DIGITS):
        drawn = truth.states()
        for row, state in zip(ROWS[:20], drawn, strict=False):
            model, component, kind, phase, T, p = state
            assert (row["model"], row["component"], row["kind"], row["phase"]) == (model, component, kind, phase)
            assert (row["temperature_K"], row["pressure_Pa"]) == (repr(T), repr(p))


@pytest.mark.parametrize("number", range(0, 648, 23))
def test_rows_come_out_again(number):
    row = ROWS[number]
    with mp.workdps(truth.DIGITS):
        state = float(row["temperature_K"]), float(row["pressure_Pa"])
        values = truth.row(row["model"], row["component"], row["phase"], *state)
        for name, value in zip(truth.PROPERTIES, values, strict=True):
            assert abs(mp.mpf(row[name]) - value) <= mp.mpf(10) ** (1 - truth.PRINTED) * abs(value), name


@pytest.mark.parametrize("number", range(5, 648, 71))
def test_the_table_is_consistent(number):
    """Cp - Cv, (dH/dp)_T, the residual Gibbs energy and Z, each from other columns."""
    row = {name: mp.mpf(ROWS[number][name]) for name in truth.PROPERTIES}
    T, p = (mp.mpf(float(ROWS[number][name])) for name in ("temperature_K", "pressure_Pa"))
    gas, V = mp.mpf(truth.GAS_CONSTANT), 1 / row["density"]
    thermal, slope = row["pressure_by_temperature"], row["pressure_by_density"]
    difference = row["residual_isobaric_heat_capacity"] - row["residual_isochoric_heat_capacity"] + gas
    assert mp.almosteq(difference, T * thermal**2 * V**2 / slope, rel_eps=mp.mpf(10) ** -15)
    gibbs = row["residual_enthalpy"] - T * row["residual_entropy"]
    assert abs(gibbs / (gas * T) - row["log_fugacity_coefficient"]) < mp.mpf(10) ** -16 * (1 + abs(gibbs / (gas * T)))
    assert abs(p * V / (gas * T) - 1 - row["compressibility_excess"]) < mp.mpf(10) ** -18 * (1 + p * V / (gas * T))
    assert mp.almosteq(row["enthalpy_by_pressure"], V - T * thermal * V**2 / slope, rel_eps=mp.mpf(10) ** -14)


def test_the_package_is_not_used():
    from pathlib import Path

    assert "eosmuster" not in Path(truth.__file__).read_text(encoding="utf-8")
    assert truth.FILE.stat().st_size < 250_000
