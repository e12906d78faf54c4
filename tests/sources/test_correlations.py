"""The correlation formulas against an independent implementation, and their inverse.

The independent route is the `chemicals` package, whose own functions of the same published equations are
scalar, written by somebody else, and share no code with ours. Both are double precision: 1e-12 allows for
the different order of operations in exponents of up to about 30.
"""

from __future__ import annotations

import importlib
import math
from collections.abc import Callable

import numpy as np
import pytest

from eosmuster.errors import InputError
from eosmuster.sources import handbook
from eosmuster.sources.cited import Correlation
from eosmuster.sources.correlations import FORMS
from eosmuster.sources.inversion import invert

dippr, phase_change, vapor_pressure, volume = (
    importlib.import_module(f"chemicals.{module}") for module in ("dippr", "phase_change", "vapor_pressure", "volume")
)
ROUNDING = 1e-12
Scalar = Callable[..., float]

# form -> the other implementation, called with T and our coefficients in our order
ELSEWHERE: dict[str, Scalar] = {
    "wagner_3_6": lambda T, A, B, C, D, Tc, pc: vapor_pressure.Wagner_original(T, Tc, pc, A, B, C, D),
    "wagner_25_5": lambda T, A, B, C, D, Tc, pc: vapor_pressure.Wagner(T, Tc, pc, A, B, C, D),
    "antoine": vapor_pressure.Antoine,
    "antoine_e": lambda T, A, B, C: vapor_pressure.Antoine(T, A, B, C, base=math.e),
    "antoine_extended": lambda T, A, B, C, n, E, F, to, Tc: vapor_pressure.TRC_Antoine_extended(
        T, Tc, to, A, B, C, n, E, F
    ),
    "dippr_101": dippr.EQ101,
    "dippr_105": dippr.EQ105,
    "dippr_116": lambda T, A, B, C, D, Tc, rhoc, MW: 1.0 / volume.volume_VDI_PPDS(T, Tc, rhoc, A, B, C, D, MW),
    "dippr_106": lambda T, A, B, C, D, Tc: dippr.EQ106(T, Tc, A, B, C, D),
    "ppds_12": lambda T, A, B, C, D, E, Tc: phase_change.PPDS12(T, Tc, A, B, C, D, E),
}
SLOPES_ELSEWHERE: dict[str, Scalar] = {
    "wagner_3_6": lambda T, A, B, C, D, Tc, pc: vapor_pressure.dWagner_original_dT(T, Tc, pc, A, B, C, D),
    "wagner_25_5": lambda T, A, B, C, D, Tc, pc: vapor_pressure.dWagner_dT(T, Tc, pc, A, B, C, D),
    "antoine": vapor_pressure.dAntoine_dT,
    "antoine_e": lambda T, A, B, C: vapor_pressure.dAntoine_dT(T, A, B, C, base=math.e),
    "antoine_extended": lambda T, A, B, C, n, E, F, to, Tc: vapor_pressure.dTRC_Antoine_extended_dT(
        T, Tc, to, A, B, C, n, E, F
    ),
    "dippr_101": lambda T, *c: dippr.EQ101(T, *c, 1),
}

# value printed in the documentation of the other implementation, each naming its table there
PRINTED = [
    # methane 100 K; McGarry 1983
    ("wagner_3_6", 100.0, (-6.00435, 1.1885, -0.834082, -1.22833, 190.53, 4596420.0), 34520.44601450499),
    # methane 100 K; Poling et al. 2001, appendix A
    ("wagner_25_5", 100.0, (-6.02242, 1.26652, -0.5707, -1.366, 190.551, 4599200.0), 34415.004762637),
    ("antoine", 100.0, (8.7687, 395.744, -6.469), 34478.367349639906),
    # the same constants in natural logarithms; Landolt-Boernstein IV/20
    ("antoine_e", 100.0, (20.19067790493689, 911.2342350418357, -6.469), 34478.367349639906),
    # tetrafluoromethane 180 K; Poling et al. 2001, appendix A
    (
        "antoine_extended",
        180.0,
        (8.95894, 510.595, -15.95, 2.41377, -93.74, 7425.9, -120.0, 227.51),
        706317.0898414153,
    ),
    # water 300 K; DIPPR 101
    ("dippr_101", 300.0, (73.649, -7258.2, -7.3037, 4.1653e-6, 2.0), 3537.44834545549),
    # hexane 300 K, A in mol/m3; DIPPR 105
    ("dippr_105", 300.0, (708.24, 0.26411, 507.6, 0.27537), 7593.170096339237),
    # toluene 300 K; VDI Heat Atlas 2010. R of 2018 there and here
    (
        "ppds_12",
        300.0,
        (4.60584, 13.97224, -10.592315, 2.120205, 4.277128, 591.75),
        37948.76862035925,
    ),
]

ALL = [
    c
    for name in handbook.CORRELATION_FILES
    for cas in sorted(handbook._correlations(name))
    for c in handbook.correlations(cas, name, include_excluded=True)
]
PRESSURES = [c for c in ALL if c.property == "saturation_pressure"]
# Landolt-Boernstein's excluded row of perfluorobutane lies beyond the pole at T = -C, where the other implementation
# gives 0 and ours what the formula gives
BEYOND_THE_POLE = {("355-25-9", "antoine_e")}


@pytest.mark.parametrize(("form", "T", "coefficients", "expected"), PRINTED, ids=[p[0] for p in PRINTED])
def test_printed_worked_value(form: str, T: float, coefficients: tuple[float, ...], expected: float) -> None:
    assert float(FORMS[form].value(np.array(T), coefficients)) == pytest.approx(expected, rel=1e-10)


def test_every_form_has_an_independent_implementation() -> None:
    assert set(ELSEWHERE) == set(FORMS)
    assert set(SLOPES_ELSEWHERE) == {name for name, form in FORMS.items() if form.log_slope is not None}


@pytest.mark.parametrize("form", FORMS)
def test_every_row_agrees_with_the_independent_implementation(form: str) -> None:
    rows = [c for c in ALL if c.form == form and (c.cas, form) not in BEYOND_THE_POLE]
    assert rows
    for c in rows:
        T = np.linspace(c.from_K, c.to_K, 7)
        expected = [ELSEWHERE[form](float(t), *c.coefficients) for t in T]
        # the enthalpy of vaporization vanishes at T_c, where only an absolute tolerance means something
        absolute = 1e-9 if c.property == "enthalpy_of_vaporization" else 0.0
        np.testing.assert_allclose(c(T), expected, rtol=ROUNDING, atol=absolute, err_msg=str(c))


@pytest.mark.parametrize("form", SLOPES_ELSEWHERE)
def test_slopes_agree_with_the_independent_implementation(form: str) -> None:
    rows = [c for c in PRESSURES if c.form == form and (c.cas, form) not in BEYOND_THE_POLE]
    assert rows
    for c in rows:
        T = np.linspace(c.from_K, c.to_K, 7)[:-1]  # at T_c itself the other implementation divides by zero
        expected = [SLOPES_ELSEWHERE[form](float(t), *c.coefficients) for t in T]
        # 1e-10: near T_c both subtract nearly equal terms
        np.testing.assert_allclose(c.slope(T), expected, rtol=1e-10, err_msg=str(c))


@pytest.mark.parametrize("c", PRESSURES[::7], ids=lambda c: f"{c.component}-{c.source}")
def test_inverse_is_within_rounding_over_the_whole_range(c: Correlation) -> None:
    T = np.linspace(c.from_K, c.to_K, 50)
    # p is exact to about 1e-14, and d ln p/d ln T is at least 5: no more than 1e-13 in T
    np.testing.assert_allclose(c.temperatures_at(c(T)), T, rtol=1e-13)


def test_inverse_keeps_the_shape_and_refuses_what_is_not_taken() -> None:
    c = handbook.correlations("74-82-8", "saturation_pressure")[0]
    p = np.array([[1e5, -1.0, 0.0], [np.nan, 1e9, 2e5]])
    found = c.temperatures_at(p)
    assert found.shape == p.shape
    np.testing.assert_array_equal(np.isnan(found), [[False, True, True], [True, True, False]])


def test_a_form_without_slope_has_no_inverse() -> None:
    with pytest.raises(InputError, match=r"dippr_105.*no inverse"):
        invert(FORMS["dippr_105"], (708.24, 0.26411, 507.6, 0.27537), np.array([7600.0]), (500.0, 250.0))
