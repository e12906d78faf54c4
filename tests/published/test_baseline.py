"""A regression baseline, NOT published: AAD in % of saturation pressure and liquid density of 12 fluids.

Calculated apart from this package with an independent root finder against CoolProp 8.0.0, at 16 equally spaced
temperatures from max(0.5 Tc, triple point + 0.5 K) to 0.95 Tc. Unlike the catalogue of components it used the
numerical critical point of the library's equations, which matters for benzene and decane. All digits printed
there must come out.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from eosmuster.api import saturate
from eosmuster.components import find
from eosmuster.sources.backend import state
from eosmuster.sources.library import saturation

FLUIDS = (
    "methane",
    "ethane",
    "propane",
    "n-butane",
    "n-hexane",
    "n-octane",
    "n-decane",
    "nitrogen",
    "CO2",
    "benzene",
    "R134a",
    "water",
)

# model -> AAD % of saturation pressure / liquid density, in the order of FLUIDS
BASELINE = {
    "SRK": "1.91/4.0 1.44/6.7 1.26/8.0 1.58/9.2 1.47/12.0 1.46/15.4 1.63/17.6 1.18/3.3 0.54/11.1 0.93/10.7 "
    "1.39/14.7 4.85/28.3",
    "SRK-PM19": "2.00/4.0 1.61/6.6 1.45/8.0 1.73/9.2 1.48/12.0 1.33/15.4 1.39/17.6 1.32/3.3 0.45/11.1 0.86/10.7 "
    "1.36/14.7 4.81/28.3",
    "PR": "0.74/8.9 0.73/6.4 0.77/5.3 0.66/4.3 0.99/2.3 1.47/4.4 2.43/6.9 1.05/9.8 0.54/3.1 1.86/3.2 1.04/3.5 "
    "2.77/19.0",
    "PR-PM19": "2.11/9.2 1.57/6.6 1.34/5.4 1.34/4.4 0.93/2.4 0.97/4.3 1.23/6.9 1.56/10.0 1.17/3.1 1.46/3.2 "
    "0.90/3.4 3.51/18.9",
    "PR-Twu95": "0.36/9.0 0.51/6.4 0.46/5.3 0.59/4.3 0.75/2.4 0.87/4.4 1.01/6.9 0.79/9.8 0.17/3.0 1.32/3.2 "
    "0.73/3.6 4.17/19.0",
    "PT": "1.29/3.3 1.05/2.9 0.85/2.7 0.53/2.7 0.81/2.3 1.25/1.9 1.75/1.9 1.41/3.4 0.37/2.7 1.61/2.3 0.90/2.9 "
    "3.24/18.0",
    "SW": "0.34/3.4 0.29/2.9 0.32/2.5 0.32/2.4 0.22/2.1 0.77/2.3 1.15/2.0 0.72/2.8 0.75/3.0 1.21/3.2 0.27/3.7 "
    "3.38/18.6",
    "RK": "14.2/3.9 7.0/7.5 20.9/9.8 37.9/11.9 87/16 163/21 278/24 9.4/3.6 23/15 44/14 104/19 106/32",
}
CASES = [
    pytest.param(model, fluid, *cell.split("/"), id=f"{model}-{fluid}")
    for model, row in BASELINE.items()
    for fluid, cell in zip(FLUIDS, row.split(), strict=True)
]


def aad_pct(model, fluid):
    found = find(fluid)
    equation = state(found.library_name)
    component = replace(found, critical_temperature=equation.T_critical(), critical_pressure=equation.p_critical())
    tc = component.critical_temperature
    T = np.linspace(max(0.5 * tc, found.triple_temperature + 0.5), 0.95 * tc, 16)
    reference = saturation(found, T, ["saturation_pressure", "liquid_density"]).values
    states = saturate(component, model, temperature=T)
    pairs = (
        (states.pressure, reference["saturation_pressure"]),
        (states.liquid_density, reference["liquid_density"]),
    )
    return [100.0 * float(np.mean(np.abs(a / b - 1.0))) for a, b in pairs]


@pytest.mark.parametrize(("model", "fluid", "pressure", "density"), CASES)
def test_aad_has_the_printed_digits(model, fluid, pressure, density):
    for found, printed in zip(aad_pct(model, fluid), (pressure, density), strict=True):
        digits = len(printed.partition(".")[2])
        # half a unit of the last digit; a tenth of it more for numbers rounded twice (RK, benzene: 13.45, 13.5, 14)
        assert found == pytest.approx(float(printed), abs=0.55 * 10.0**-digits)


def test_translated_liquid_densities():
    """The same baseline for SRK+Peneloux: 3.5 to 4.1 %, carbon dioxide 4.6, water 19.0."""
    found = {fluid: aad_pct("SRK+Peneloux", fluid)[1] for fluid in FLUIDS}
    assert round(found.pop("CO2"), 1) == 4.6
    assert round(found.pop("water"), 1) == 19.0
    assert {round(value, 1) for value in found.values()} <= {3.5, 3.6, 3.7, 3.8, 3.9, 4.0, 4.1}
