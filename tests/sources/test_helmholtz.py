"""Properties from a reduced Helmholtz energy: published derivatives of water, and van der Waals in closed form."""

from __future__ import annotations

import numpy as np
import pytest

from eosmuster.sources import helmholtz
from eosmuster.sources.helmholtz import Helmholtz

R = 8.31446261815324


# IAPWS R6-95(2018), Table 6, from memory: 500 K, 838.025 kg/m3, so tau = 647.096/500 and delta = 838.025/322;
# phi0_tautau, phir, and phir's derivatives by delta, by delta twice, by tau, by tau twice, by both
IDEAL_TT, A, A_D, A_DD, A_T, A_TT, A_DT = (
    *(-0.193249185e1, -0.342693206e1, -0.364366650, 0.856063701),
    *(-0.581403435e1, -0.223440737e1, -0.112176915e1),
)
# Table 7, from memory, the same state: p/MPa, cv/(kJ/(kg K)), w/(m/s)
PRESSURE, COLD, SOUND = 0.100003858e2, 0.322106219e1, 0.127128441e4


def iapws() -> Helmholtz:
    """The state of Table 6 in mass units: R in J/(kg K), so a molar mass of 1."""
    tau, delta = 647.096 / 500.0, 838.025 / 322.0
    values = (500.0, PRESSURE * 1e6, 838.025), (A, delta * A_D, tau * A_T, delta**2 * A_DD, tau**2 * A_TT)
    T, p, rho, a, a_d, a_t, a_dd, a_tt = (np.array(x) for group in values for x in group)
    mixed, ideal = np.array(delta * tau * A_DT), np.array(tau**2 * IDEAL_TT)
    return Helmholtz(T, p, rho, 461.51805, 1.0, a, a_d, a_t, a_dd, a_tt, mixed, ideal)


def test_published_derivatives_give_the_published_pressure_and_speed_of_sound() -> None:
    # nine digits are printed; 1 + a_d = 0.0517 is what is left of -0.948, so pressure keeps seven of them
    state = iapws()
    assert helmholtz.compressibility_factor(state) == pytest.approx(1.0 + state.a_d, rel=1e-7)
    assert abs(state.open_step) < 1e-9
    assert helmholtz.speed_of_sound(state) == pytest.approx(SOUND, rel=1e-8)


def test_published_heat_capacity_and_derivatives_give_the_isobaric_one() -> None:
    # cp = cv + T (dp/dT)_rho^2/(rho^2 (dp/drho)_T), of the printed cv; 1e-8: nine digits are printed
    state = iapws()
    slope_T = 838.025 * 461.51805 * (1.0 + state.a_d - state.a_dt)
    slope_rho = 461.51805 * 500.0 * state.stiffness
    expected = COLD * 1e3 + 500.0 * slope_T**2 / (838.025**2 * slope_rho)
    assert helmholtz.isobaric_heat_capacity(state) == pytest.approx(expected, rel=1e-8)


# van der Waals: p = R T rho/(1 - b rho) - a rho^2, alphar = -ln(1 - b rho) - a rho/(R T), and c = cv of the ideal gas
VDW_A, VDW_B, CV = 0.55, 4.3e-5, 2.5 * R
T_VDW = np.array([200.0, 300.0, 500.0, 300.0])
RHO_VDW = np.array([100.0, 1000.0, 8000.0, 20000.0])


def van_der_waals() -> Helmholtz:
    T, rho = T_VDW, RHO_VDW
    x, y = VDW_B * rho, VDW_A * rho / (R * T)
    p = R * T * rho / (1.0 - x) - VDW_A * rho**2
    zero = np.zeros(T.shape)
    a, a_d, a_dd = -np.log1p(-x) - y, x / (1.0 - x) - y, (x / (1.0 - x)) ** 2
    # tau appears in y alone, and there to the first power; cv of a van der Waals gas is the ideal one
    return Helmholtz(T, p, rho, R, 0.03, a, a_d, -y, a_dd, zero, -y, np.full(T.shape, -CV / R))


def closed_forms() -> dict[str, np.ndarray]:
    """What textbooks print for a van der Waals fluid, e.g. Callen, Thermodynamics, 2nd ed., sections 3.5 and 6.3."""
    T, rho, p = T_VDW, RHO_VDW, van_der_waals().p
    v = 1.0 / rho
    share = 1.0 - 2.0 * VDW_A * (v - VDW_B) ** 2 / (R * T * v**3)
    gap = R / share  # cp - cv
    slope = -R * T / (v - VDW_B) ** 2 + 2.0 * VDW_A / v**3  # (dp/dv)_T
    inversion = 2.0 * VDW_A / (R * T) * ((v - VDW_B) / v) ** 2 - VDW_B
    return {
        "density": rho,
        "compressibility_factor": v / (v - VDW_B) - VDW_A / (R * T * v),
        "residual_internal_energy": -VDW_A / v,
        "residual_enthalpy": -2.0 * VDW_A / v + R * T * VDW_B / (v - VDW_B),
        "residual_entropy": R * np.log(p * (v - VDW_B) / (R * T)),
        "isobaric_heat_capacity": CV + gap,
        "speed_of_sound": np.sqrt(-(v**2) * slope * (CV + gap) / CV / 0.03),
        "joule_thomson_coefficient": inversion / ((CV + gap) * share),
        "fugacity_coefficient": np.exp(VDW_B / (v - VDW_B) - 2.0 * VDW_A / (R * T * v)) * R * T / (p * (v - VDW_B)),
    }


@pytest.mark.parametrize("name", list(closed_forms()))
def test_a_van_der_waals_fluid_in_closed_form(name: str) -> None:
    np.testing.assert_allclose(getattr(helmholtz, name)(van_der_waals()), closed_forms()[name], rtol=1e-12)


def test_an_open_step_is_newtons() -> None:
    # a density 1e-5 too high has to be lowered by that, but for the curvature of p(rho): second order
    state = van_der_waals()
    x, y = VDW_B * RHO_VDW * (1 + 1e-5), VDW_A * RHO_VDW * (1 + 1e-5) / (R * T_VDW)
    zero = np.zeros(T_VDW.shape)
    off = Helmholtz(
        *(T_VDW, state.p, RHO_VDW * (1 + 1e-5), R, 0.03),
        *(zero, x / (1 - x) - y, zero, (x / (1 - x)) ** 2, zero, zero, zero),
    )
    np.testing.assert_allclose(state.open_step, 0.0, atol=1e-14)
    np.testing.assert_allclose(off.open_step, -1e-5, rtol=1e-3)


def test_an_unstable_state_has_no_speed_of_sound() -> None:
    # between the spinodals of a van der Waals fluid at half its critical temperature of 456 K
    rho, T = np.array([7000.0]), np.array([228.0])
    x, y = VDW_B * rho, VDW_A * rho / (R * T)
    zero = np.zeros(1)
    a_d, a_dd = x / (1 - x) - y, (x / (1 - x)) ** 2
    state = Helmholtz(T, np.array([1e5]), rho, R, 0.03, zero, a_d, -y, a_dd, zero, -y, np.array([-2.5]))
    assert state.stiffness < 0.0
    with np.errstate(invalid="ignore"):
        assert np.isnan(helmholtz.speed_of_sound(state)).all()
