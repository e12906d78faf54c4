"""Heat capacities, speed of sound and Joule-Thomson coefficient with an ideal-gas heat capacity given."""

from __future__ import annotations

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.singlephase import caloric, solver

CP0 = 73.0  # J/(mol K), about propane's at 300 K
MASS = 0.0440956
EACH = pytest.mark.parametrize("model", CATALOGUE)


def parameters(model="PR", component="propane"):
    return bind(CATALOGUE[model], [find(component)]).parameters.take(0)


@EACH
def test_dilute_gas(model):
    """An ideal gas has c_p0, c = sqrt(gamma R T/M), and the Joule-Thomson coefficient -(B - T B')/c_p0."""
    states = solver.at_pressure(parameters(model), [300.0, 900.0], 1e-3, "stable")
    gamma = CP0 / (CP0 - GAS_CONSTANT)
    np.testing.assert_allclose(caloric.isobaric_heat_capacity(states, CP0), CP0, rtol=1e-8)
    np.testing.assert_allclose(caloric.isochoric_heat_capacity(states, CP0), CP0 - GAS_CONSTANT, rtol=1e-8)
    sound = np.sqrt(gamma * GAS_CONSTANT * states.temperature / MASS)
    np.testing.assert_allclose(caloric.speed_of_sound(states, CP0, MASS), sound, rtol=1e-7)
    # B from Z - 1 = B p/(RT) at two temperatures beside each
    T = states.temperature
    up, down = (solver.at_pressure(parameters(model), T * (1 + h), 1e-3, "stable") for h in (1e-5, -1e-5))
    b = [x.compressibility_excess * GAS_CONSTANT * x.temperature / 1e-3 for x in (up, states, down)]
    expected = -(b[1] - (b[0] - b[2]) / 2e-5) / CP0
    np.testing.assert_allclose(caloric.joule_thomson_coefficient(states, CP0), expected, rtol=1e-6)


def test_no_attraction_and_no_volume_is_an_ideal_gas():
    """Far above Boyle's temperature the coefficient is -b/c_p0: van der Waals' B - T B' = b - 2 a/(RT)."""
    p = parameters("vdW")
    b = 0.125 * GAS_CONSTANT * float(p.critical_temperature / p.critical_pressure)
    states = solver.at_pressure(p, 1e9, 1.0, "supercritical")
    assert caloric.joule_thomson_coefficient(states, CP0) == pytest.approx(-b / CP0, rel=1e-5)


def test_inversion_temperature_of_van_der_waals():
    """The Joule-Thomson coefficient of a dilute gas changes sign at 27/4 Tc (any textbook)."""
    p = parameters("vdW")
    tc = float(p.critical_temperature)
    states = solver.at_pressure(p, np.array([6.74, 6.75, 6.76]) * tc, 1e-6, "supercritical")
    found = caloric.joule_thomson_coefficient(states, CP0)
    assert found[0] > 0 > found[2]
    assert abs(found[1]) < 1e-9 * found[0]


def test_boyle_temperature_of_van_der_waals():
    """Z - 1 of a dilute gas changes sign at 27/8 Tc (any textbook)."""
    p = parameters("vdW")
    states = solver.at_pressure(
        p, np.array([3.37, 3.375, 3.38]) * float(p.critical_temperature), 1e-6, "supercritical"
    )
    low, middle, high = states.compressibility_excess
    assert low < 0 < high
    assert abs(middle) < 1e-9 * high


@EACH
def test_speed_of_sound_is_the_isentropic_slope(model):
    """c**2 M = (dp/drho)_S, by stepping along an isentrope with c_p0 constant."""
    p = parameters(model)
    tc, pc = (float(x) for x in (p.critical_temperature, p.critical_pressure))
    for T, pressure in ((0.8 * tc, 2.0 * pc), (1.1 * tc, 1.3 * pc), (1.5 * tc, 0.2 * pc)):
        here = solver.at_pressure(p, T, pressure, "stable")
        cp = float(caloric.isobaric_heat_capacity(here, CP0))
        dp = 1e-5 * pressure
        # (dT/dp)_S = T (dV/dT)_p/c_p = (V - (dH/dp)_T)/c_p; a second-order step with the slope of the middle
        volume = 1 / float(here.density)
        dT = (volume - float(here.enthalpy_by_pressure)) / cp * dp
        ends = [solver.at_pressure(p, T + sign * dT, pressure + sign * dp, "stable").density for sign in (1, -1)]
        slope = 2 * dp / float(ends[0] - ends[1])
        sound = float(caloric.speed_of_sound(here, CP0, MASS))
        assert sound**2 * MASS == pytest.approx(slope, rel=1e-6)


@EACH
def test_joule_thomson_is_the_isenthalpic_slope(model):
    p = parameters(model)
    tc, pc = (float(x) for x in (p.critical_temperature, p.critical_pressure))
    for T, pressure in ((0.8 * tc, 2.0 * pc), (1.1 * tc, 1.3 * pc), (1.5 * tc, 0.2 * pc)):
        here = solver.at_pressure(p, T, pressure, "stable")
        slope = float(caloric.joule_thomson_coefficient(here, CP0))
        dp = 1e-4 * pressure
        ends = [
            CP0 * sign * slope * dp
            + solver.at_pressure(p, T + sign * slope * dp, pressure + sign * dp, "stable").residual_enthalpy
            for sign in (1, -1)
        ]
        # 1e-5 of what the enthalpy would change by if the temperature had stayed
        assert abs(float(ends[0] - ends[1])) < 1e-5 * abs(2 * dp * float(here.enthalpy_by_pressure)) + 1e-9


def test_at_the_critical_point():
    """c_p is infinite, the speed of sound is not, and an isenthalp runs along the isochore."""
    p = parameters()
    here = solver.at_pressure(p, p.critical_temperature, p.critical_pressure, "stable")
    near = solver.at_pressure(p, p.critical_temperature, p.critical_pressure * (1 + 1e-9), "stable")
    assert np.isposinf(caloric.isobaric_heat_capacity(here, CP0))
    sound = float(caloric.speed_of_sound(here, CP0, MASS))
    assert sound == pytest.approx(float(caloric.speed_of_sound(near, CP0, MASS)), rel=1e-2)
    slope = float(caloric.joule_thomson_coefficient(here, CP0))
    assert slope == pytest.approx(1 / float(here.pressure_by_temperature), rel=1e-15)
    # 1e-2: both change with the cube root of the distance in pressure
    assert slope == pytest.approx(float(caloric.joule_thomson_coefficient(near, CP0)), rel=1e-2)


def test_no_number_where_there_is_no_state():
    states = solver.at_pressure(parameters(), [300.0, 400.0, -1.0], 1e6, "liquid")
    for values in (
        caloric.isobaric_heat_capacity(states, CP0),
        caloric.isochoric_heat_capacity(states, CP0),
        caloric.speed_of_sound(states, CP0, MASS),
        caloric.joule_thomson_coefficient(states, CP0),
    ):
        np.testing.assert_array_equal(np.isnan(values), [False, True, True])


def test_no_speed_of_sound_of_an_unstable_state():
    """Between the spinodals the isentropic slope is negative too, if the molecules can take up much heat."""
    p = parameters()
    states = solver.at_density(p, 0.9 * p.critical_temperature, 5000.0)
    assert states.status == solver.SOLVED
    assert states.pressure_by_density < 0
    assert np.isnan(caloric.speed_of_sound(states, 1e4, MASS))
    assert caloric.speed_of_sound(states, CP0, MASS) > 0


def test_ideal_heat_capacities_broadcast():
    states = solver.at_pressure(parameters(), np.array([[280.0], [300.0]]), [1e5, 2e5, 3e5], "stable")
    ideal = np.array([[70.0], [73.0]])
    assert caloric.isobaric_heat_capacity(states, ideal).shape == (2, 3)
    assert caloric.speed_of_sound(states, ideal, MASS).shape == (2, 3)
