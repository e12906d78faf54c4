"""Uncertainties of the reference library: what is stated, what is assumed, and where each comes from."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.components import Component, catalogue
from eosmuster.quantities import SINGLE_PHASE
from eosmuster.sources import stated
from eosmuster.sources.backend import evaluate
from eosmuster.sources.library_gate import ANSWERED, limits, range_reason
from eosmuster.sources.library_states import phase_boundary

Floats = NDArray[np.float64]

CRITICAL_REGION = (0.95, 1.1, 0.5)
"""Between these two reduced temperatures and above this share of the critical pressure nothing that is stated of a
single-phase property counts. Sources except the critical region, each in words of its own; this one is ours."""


def uncertainty_pct(
    component: Component,
    name: str,
    temperature: ArrayLike,
    coverage_factor: float = 2.0,
    *,
    pressure: ArrayLike | None = None,
    remembered: bool = True,
    assumed: bool = False,
) -> Floats:
    """Give the stated expanded uncertainty of the reference equation, in % of the value.

    Parameters
    ----------
    name : a property
    temperature : K, any shape
    coverage_factor : of the result; stated values are taken as k = 2, also where their source names none
    pressure : Pa, broadcast against `temperature`: the other coordinate of a single-phase property, without which
        nothing is known of it. Saturated states need none.
    remembered : whether statements noted down from memory count as well as those that were read
    assumed : whether the default of the component's class stands in where none is stated; then
        `library_uncertainty` tells which is which

    Returns
    -------
    shape of `temperature`, or of both; NaN where no uncertainty is stated in ``references/uncertainty/coolprop.csv``,
    nor assumed: so always for residuals, the Joule-Thomson coefficient and the fugacity coefficient. Some properties
    follow another:

    - the boiling temperature the vapour pressure, U(T) = U(p) / (dln p/dln T);
    - the entropy of vaporization the enthalpy of vaporization, being that over T;
    - the heat capacities of saturated phases the isobaric heat capacity there;
    - the compressibility factor, at given T and p, the density

    Examples
    --------
    >>> from eosmuster.components import find
    >>> uncertainty_pct(find("propane"), "saturation_pressure", [170.0, 300.0])
    array([ nan, 0.02])
    >>> uncertainty_pct(find("propane"), "saturation_pressure", [170.0, 300.0], assumed=True)
    array([5.  , 0.02])
    >>> uncertainty_pct(find("propane"), "density", 300.0, pressure=[2e6, 2e8])
    array([0.03,  nan])
    """
    T = np.asarray(temperature, np.float64)
    if name == "boiling_temperature":
        given = _stated(component, "saturation_pressure", T, remembered, assumed)
        return np.asarray(given / _steepness(component, T) * coverage_factor / stated.COVERAGE_FACTOR)
    if stated.STAND_INS.get(name, name) in SINGLE_PHASE:
        values = _single_phase(component, name, T, pressure, remembered, assumed)
    else:
        values = _stated(component, stated.STAND_INS.get(name, name), T, remembered, assumed)
    return np.asarray(values * coverage_factor / stated.COVERAGE_FACTOR)


def uncertainty_borders(
    component: Component, name: str, *, remembered: bool = True, assumed: bool = False
) -> tuple[float, ...]:
    """Give the temperatures (K) at which the uncertainty begins, ends or changes; parameters as above.

    A single-phase property's may do so at its `pressure_borders` as well, and on the saturation line.

    Examples
    --------
    >>> from eosmuster.components import find
    >>> uncertainty_borders(find("argon"), "liquid_density")
    (83.806, 143.15)
    """
    asked = "saturation_pressure" if name == "boiling_temperature" else stated.STAND_INS.get(name, name)
    found = _statements(component, asked, remembered)
    ends = {end for s in found for end in (s.from_K, s.to_K)}
    if asked in SINGLE_PHASE and found:
        ends.update(
            reduced * catalogue()[component.library_name].critical_temperature for reduced in CRITICAL_REGION[:2]
        )
    if assumed and component.library_name in catalogue():
        # a statement on a box of temperature and pressure hides a default's border at some pressures only
        ends.update(stated.assumed_borders(component, asked, () if asked in SINGLE_PHASE else found))
    return tuple(sorted(ends))


def coverage_factor_unstated(
    component: Component, name: str, temperature: ArrayLike, *, remembered: bool = True
) -> NDArray[np.bool_]:
    """Tell where the uncertainty of a saturated property comes from a source that states no coverage factor.

    It is taken as k = 2 then. Never of what is assumed, nor of the heat capacities.

    Examples
    --------
    >>> from eosmuster.components import find
    >>> coverage_factor_unstated(find("propane"), "saturation_pressure", [170.0, 300.0]).tolist()
    [False, True]
    """
    T = np.asarray(temperature, np.float64)
    found = counted(component, name, remembered=remembered)
    known = stated.largest((s for s in found if s.coverage_factor != stated.UNSTATED), T)
    return np.asarray(stated.largest(found, T) > np.nan_to_num(known))


def counted(component: Component, name: str, *, remembered: bool = True) -> tuple[stated.Statement, ...]:
    """Give what is stated of a saturated property, by the statements on the property that it follows."""
    asked = "saturation_pressure" if name == "boiling_temperature" else stated.STAND_INS.get(name, name)
    return () if asked in SINGLE_PHASE else _statements(component, asked, remembered)


def pressure_borders(component: Component, name: str, *, remembered: bool = True) -> tuple[float, ...]:
    """Give the pressures (Pa) at which the uncertainty of a single-phase property begins, ends or changes.

    Examples
    --------
    >>> from eosmuster.components import find
    >>> pressure_borders(find("methane"), "density")
    (2299600.0, 12000000.0, 50000000.0)
    """
    asked = stated.STAND_INS.get(name, name)
    if name not in SINGLE_PHASE:
        return ()
    found = _statements(component, asked, remembered)
    ends = {end for s in found for end in (s.from_Pa, s.to_Pa) if 0.0 < end < np.inf}
    if found:
        ends.add(CRITICAL_REGION[2] * catalogue()[component.library_name].critical_pressure)
    return tuple(sorted(ends))


def library_uncertainty(
    component: Component,
    property: str,  # noqa: A002
    temperature: ArrayLike,
    coverage_factor: float = 2.0,
    *,
    pressure: ArrayLike | None = None,
) -> tuple[Floats, stated.Codes]:
    """Give the expanded uncertainty of the reference equation, % of the value, and where it comes from.

    Parameters
    ----------
    property : a key of `eosmuster.quantities.PROPERTIES`; where it follows another one, as `uncertainty_pct` tells,
        so does its origin
    temperature : K, any shape
    coverage_factor : of the result
    pressure : Pa, for single-phase properties

    Returns
    -------
    values : shape of `temperature`, or of both; NaN for a component the library does not know, for saturated states
        at and above the critical temperature, and where nothing is stated nor assumed
    codes : same shape, indices into `eosmuster.sources.stated.ORIGINS`: stated, assumed or unknown

    Examples
    --------
    >>> from eosmuster.components import find
    >>> from eosmuster.sources.stated import ORIGINS
    >>> values, codes = library_uncertainty(find("propane"), "liquid_density", [300.0, 355.0, 400.0])
    >>> values.tolist(), [ORIGINS[code] for code in codes]
    ([0.03, 1.0, nan], ['stated', 'assumed', 'unknown'])
    """
    alone, both = (
        uncertainty_pct(component, property, temperature, coverage_factor, pressure=pressure, assumed=assumed)
        for assumed in (False, True)
    )
    return stated.filled(alone, both)


def _stated(component: Component, name: str, T: Floats, remembered: bool, assumed: bool) -> Floats:
    """Give the uncertainty of saturated states, with k = 2."""
    return _filled(component, name, T, stated.largest(_statements(component, name, remembered), T), assumed)


def _single_phase(
    component: Component, name: str, T: Floats, pressure: ArrayLike | None, remembered: bool, assumed: bool
) -> Floats:
    """Give the uncertainty of single-phase states, or of the heat capacity of a saturated phase, with k = 2."""
    asked = stated.STAND_INS.get(name, name)
    found = _statements(component, asked, remembered)
    if name in SINGLE_PHASE:
        T, p = np.broadcast_arrays(T, np.asarray(np.nan if pressure is None else pressure, np.float64))
        phase = _phase(component, T, p) if any(s.phase for s in found) else np.full(T.shape, "")
    else:
        p, phase = phase_boundary(component, T), np.full(T.shape, name.partition("_")[0])
    values = stated.largest_at(found, T, p, phase)
    values = np.where(_in_critical_region(component, T, p), np.nan, values)
    values = _filled(component, asked, T, values, assumed)
    return np.where(p > 0.0, values, np.nan)


def _statements(component: Component, name: str, remembered: bool) -> tuple[stated.Statement, ...]:
    found = stated.statements(component.library_name, name)
    return tuple(s for s in found if remembered or not stated.remembered(s))


def _filled(component: Component, name: str, T: Floats, values: Floats, assumed: bool) -> Floats:
    if not assumed or component.library_name not in catalogue():
        return values
    return stated.filled(values, stated.assumed_pct(component, name, T))[0]


def _phase(component: Component, T: Floats, p: Floats) -> NDArray[np.str_]:
    within = limits(component)
    subcritical = np.where(p >= phase_boundary(component, T), "liquid", "vapor")
    return np.where((np.inf if within is None else within.to_K) > T, subcritical, "supercritical")


def _in_critical_region(component: Component, T: Floats, p: Floats) -> NDArray[np.bool_]:
    known = catalogue().get(component.library_name, component)
    low, high, share = CRITICAL_REGION
    reduced = T / known.critical_temperature
    return np.asarray((low < reduced) & (reduced < high) & (share * known.critical_pressure < p))


def _steepness(component: Component, T: Floats) -> Floats:
    """Give dln p/dln T of the saturation curve by a central difference; NaN at its very ends."""
    step = 1e-4
    asked = np.multiply.outer([1.0 - step, 1.0 + step], T)
    within, name = limits(component), component.library_name
    if within is None:
        return np.full(T.shape, np.nan)
    # the pressure alone: all that `library.saturation` checks besides costs five times as much
    p = evaluate(name, "T", asked.ravel(), ["saturation_pressure"])[0].reshape(asked.shape)
    down, up = np.where(range_reason(asked, within) == ANSWERED, p, np.nan)
    return np.asarray(np.log(up / down) / np.log((1.0 + step) / (1.0 - step)))
