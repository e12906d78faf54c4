"""The uncertainty of a state becomes one of the value, by GUM equation 10. All data here are invented."""

from __future__ import annotations

import numpy as np
import pytest

from eosmuster.components import Component, find
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.sources import library, library_states
from eosmuster.sources.measured.propagating import (
    NO_SLOPE,
    OF_BOTH,
    OF_PRESSURE,
    OF_TEMPERATURE,
    TOGETHER,
    VALUE_ALONE,
    combined,
)
from eosmuster.sources.measured.table import AUTHOR, COMBINED, MeasuredSet, Source

NAN = float("nan")
CUT = Component("cut", 420.0, 37e5, 0.2, molar_mass=0.06)


def measured(
    name: str,
    points: list[tuple[float, float, float, float, float, float]],
    *,
    component: Component | None = None,
    state: str = "single_phase",
    origin: int = AUTHOR,
    phase: str = "fluid",
) -> MeasuredSet:
    """Points are T, p, value, u(value), u(T) and u(p)."""
    T, p, values, u, u_T, u_p = np.array(points).T
    n, none = len(points), np.zeros(len(points), bool)
    component = component or find("argon")
    return MeasuredSet(
        *(Source("lab.csv"), 1, 1, component, component.name, name, phase, state, "", np.arange(1, n + 1)),
        *(T, p, values, u, np.full(n, NAN), u_T, u_p, np.full(n, 4), np.full(n, origin, np.int8), none, none),
    )


def test_the_parts_of_a_thin_gas_are_those_of_the_ideal_gas() -> None:
    """rho = p/RT, so u(T) and u(p) come in relative, with no other factor; argon at 1 kPa is ideal to 1e-5."""
    rho = 1e3 / (GAS_CONSTANT * 300.0)
    points = [
        (300.0, 1e3, rho, 1e-3 * rho, 0.6, NAN),
        (300.0, 1e3, rho, 1e-3 * rho, NAN, 3.0),
        (300.0, 1e3, rho, 1e-3 * rho, 0.6, 3.0),
        (300.0, 1e3, rho, 1e-3 * rho, NAN, NAN),
    ]
    found = combined(measured("density", points))
    expected = [np.hypot(1e-3, 2e-3), np.hypot(1e-3, 3e-3), np.sqrt(1e-6 + 4e-6 + 9e-6), 1e-3]
    assert found.standard / rho == pytest.approx(expected, rel=1e-4)
    assert found.parts.tolist() == [OF_TEMPERATURE, OF_PRESSURE, OF_BOTH, VALUE_ALONE]


@pytest.mark.parametrize("phase", ["liquid", "vapor", "fluid"])
def test_slopes_are_those_of_the_root_of_the_stated_phase(phase: str) -> None:
    """Against differences of the densities themselves; they lose five digits of eleven, the rest is curvature."""
    one, T, p = find("propane"), 320.0, 12e5 if phase == "vapor" else 30e5
    by_temperature, by_pressure = library_states.density_slopes(one, [T], [p], phase)

    def rho(t: float, x: float) -> float:
        return float(library_states.density(one, [t], [x], phase)[0])

    assert by_temperature[0] == pytest.approx((rho(T + 0.01, p) - rho(T - 0.01, p)) / 0.02, rel=1e-5)
    assert by_pressure[0] == pytest.approx((rho(T, p + 100.0) - rho(T, p - 100.0)) / 200.0, rel=1e-5)


def test_what_is_stated_for_value_and_state_together_is_not_added_to() -> None:
    found = combined(measured("density", [(300.0, 1e5, 40.0, 0.1, 1.0, 1e3)], origin=COMBINED))
    assert (found.standard.tolist(), found.parts.tolist()) == ([0.1], [TOGETHER])


def test_a_value_without_an_uncertainty_gets_none_from_its_state() -> None:
    found = combined(measured("density", [(300.0, 1e5, 40.0, NAN, 1.0, 1e3), (300.0, 1e5, 40.0, 0.1, 1.0, NAN)]))
    assert np.isnan(found.standard).tolist() == [True, False]
    assert found.parts.tolist() == [VALUE_ALONE, OF_TEMPERATURE]
    assert combined(measured("density", [(300.0, 1e5, 40.0, NAN, NAN, NAN)], origin=COMBINED)).parts.tolist() == [0]


def test_where_no_slope_is_known_the_value_keeps_its_own_and_it_is_said() -> None:
    points = [(300.0, 1e5, 40.0, 0.1, 1.0, NAN), (300.0, 1e5, 40.0, 0.1, NAN, NAN)]
    found = combined(measured("density", points, component=CUT))
    assert (found.standard.tolist(), found.parts.tolist()) == ([0.1, 0.1], [NO_SLOPE, VALUE_ALONE])
    below = combined(measured("density", [(60.0, 1e5, 40.0, 0.1, 1.0, NAN)]))  # argon melts at 83.8 K
    assert below.parts.tolist() == [NO_SLOPE]


def test_along_the_saturation_line_only_the_given_coordinate_counts() -> None:
    """Water boils at 373.124 K; dp/dT = h_fg/(T dv) there is 3.619 kPa/K (IAPWS-95, as the library has it)."""
    water, slope = find("water"), 3619.0
    pressures = [(373.15, NAN, 101418.0, 100.0, 0.1, NAN), (373.15, 101418.0, 101418.0, 100.0, NAN, 50.0)]
    found = combined(measured("saturation_pressure", pressures, component=water, state="saturated"))
    assert found.standard == pytest.approx([np.hypot(100.0, 0.1 * slope), 100.0], rel=1e-3)
    assert found.parts.tolist() == [OF_TEMPERATURE, VALUE_ALONE]
    boiling = [(NAN, 101418.0, 373.15, 0.01, NAN, 50.0)]
    found = combined(measured("boiling_temperature", boiling, component=water, state="saturated"))
    assert found.standard == pytest.approx([np.hypot(0.01, 50.0 / slope)], rel=1e-3)
    assert found.parts.tolist() == [OF_PRESSURE]
    liquid = [(350.0, 41682.0, 54000.0, 1.0, NAN, 100.0), (350.0, 41682.0, 54000.0, 1.0, 0.5, 100.0)]
    found = combined(measured("liquid_density", liquid, component=water, state="saturated", phase="liquid"))
    assert found.parts.tolist() == [VALUE_ALONE, OF_TEMPERATURE]


def test_a_slope_at_the_end_of_the_range_is_one_sided() -> None:
    water = find("water")
    within = library.limits(water)
    assert within is not None
    ends = np.array([within.from_K - 1.0, within.from_K, within.to_K - 0.01, within.to_K + 1.0])
    found = library.slope(water, ends, "saturation_pressure")
    assert np.isfinite(found).tolist() == [False, True, True, False]
    assert found[1] == pytest.approx(library.slope(water, within.from_K + 0.05, "saturation_pressure"), rel=0.01)
