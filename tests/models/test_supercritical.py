"""Alpha above the critical temperature: each function's own published rule, and Boston and Mathias's."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.errors import InputError
from eosmuster.models.alpha import ALPHA_FUNCTIONS
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.custom import record_from_plan
from eosmuster.models.model import bind
from eosmuster.models.records import BOSTON_MATHIAS_RULE, OWN_RULE, SUPERCRITICAL_RULES
from eosmuster.models.supercritical import BOSTON_MATHIAS

COMPONENTS = [find(name) for name in ("methane", "propane", "n-decane", "water", "carbon dioxide")]
HOT = np.array([1.0 + 1e-9, 1.2, 2.0, 5.0])
EACH = pytest.mark.parametrize("model", CATALOGUE)


def parameters(record, component="propane"):
    return bind(record, [find(component)]).parameters.take(0)


def alpha(model, tr):
    """alpha and its derivatives for propane."""
    excess, first, second = parameters(model).alpha_jet(1.0 - np.asarray(tr))
    return 1.0 + excess, first, second


def own(name, parameters, **changes):
    table = {"name": "own", "form": "Peng-Robinson", "alpha": name, "parameters": parameters, "source": "invented"}
    return record_from_plan(table | changes, "plan.toml")


# --- each function's own rule --------------------------------------------------------------------------------

SAME_FORMULA = [
    name for name, record in CATALOGUE.items() if not record.supercritical_parameters and record.alpha not in
    ("Stryjek-Vera", "Mathias-Copeman", "Schmidt-Wenzel")
]  # fmt: skip


@pytest.mark.parametrize("model", SAME_FORMULA)
def test_most_go_on_as_they_are(model):
    p = parameters(CATALOGUE[model])
    assert p.supercritical is None
    found = p.alpha_jet(1.0 - HOT)
    for a, b in zip(found, p.alpha.jet(1.0 - HOT, *p.alpha_parameters), strict=True):
        np.testing.assert_array_equal(a, b)


def test_functions_that_go_on_are_the_ones_of_their_papers():
    """Soave 1972, Twu 1991, Gasem 2001, Cismondi and Mollerup 2005: one formula at all temperatures."""
    replaced = {name for name, function in ALPHA_FUNCTIONS.items() if function.above is not None}
    assert replaced == {"Stryjek-Vera", "Mathias-Copeman", "Schmidt-Wenzel"}


def test_stryjek_and_vera_drop_kappa1():
    """kappa1 = 0 above Tc: alpha is Soave's with kappa0 (Stryjek and Vera 1986, from memory)."""
    kappa0, kappa1 = parameters(CATALOGUE["PRSV"]).alpha_parameters
    assert float(kappa1) != 0.0
    np.testing.assert_allclose(alpha(CATALOGUE["PRSV"], HOT)[0], (1 + kappa0 * (1 - np.sqrt(HOT))) ** 2, rtol=1e-14)


def test_mathias_and_copeman_keep_their_first_parameter():
    """c1 alone above Tc (Mathias and Copeman 1983, from memory)."""
    record = own("Mathias-Copeman", {"c1": 0.7, "c2": -0.3, "c3": 0.5})
    np.testing.assert_allclose(alpha(record, HOT)[0], (1 + 0.7 * (1 - np.sqrt(HOT))) ** 2, rtol=1e-14)


def test_schmidt_and_wenzel_keep_m():
    """Ours: m stays at its value at Tc, for propane 0.465 + 1.347 w - 0.528 w**2 + (4 - 3 m0)**2/70."""
    w = find("propane").acentric_factor
    m0 = 0.465 + 1.347 * w - 0.528 * w**2
    m = m0 + (4 - 3 * m0) ** 2 / 70
    np.testing.assert_allclose(alpha(CATALOGUE["SW"], HOT)[0], (1 + m * (1 - np.sqrt(HOT))) ** 2, rtol=1e-14)
    assert "m keeps its value" in CATALOGUE["SW"].note


TWU_1995 = {  # L, M, N of alpha0 and alpha1 for T > Tc; PR read in a transcription, SRK from memory
    "PR-Twu95": ((0.401219, 4.963070, -0.2), (0.024955, 1.248089, -8.0)),
    "SRK-Twu95": ((0.441411, 6.500018, -0.2), (0.032580, 1.289098, -8.0)),
}


@pytest.mark.parametrize("model", TWU_1995)
def test_twu_coon_and_cunningham_have_other_parameters(model):
    w = find("propane").acentric_factor
    first, second = (HOT ** (N * (M - 1)) * np.exp(L * (1 - HOT ** (M * N))) for L, M, N in TWU_1995[model])
    np.testing.assert_allclose(alpha(CATALOGUE[model], HOT)[0], first + w * (second - first), rtol=1e-14)


# --- continuity ----------------------------------------------------------------------------------------------

JUMPS = {"PR-Twu95": 3e-5, "SRK-Twu95": 3e-5}  # six printed digits: the two slopes agree to that


PAIRS = [
    pytest.param(model, component, id=f"{model}-{component.name}")
    for model, record in CATALOGUE.items()
    for component, reason in zip(COMPONENTS, bind(record, COMPONENTS).unavailable, strict=True)
    if not reason
]


@pytest.mark.parametrize(("model", "component"), PAIRS)
def test_value_and_slope_are_continuous_at_the_critical_point(model, component):
    p = bind(CATALOGUE[model], [component]).parameters.take(0)
    below, above = (p.alpha_jet(np.array(side * 1e-12)) for side in (1.0, -1.0))
    assert abs(float(below[0] - above[0])) < 1e-11
    jump = abs(float(above[1] / below[1] - 1.0)) if below[1] else abs(float(above[1]))
    if model == "PRSV":
        # kappa1 counts at Tc, so the published slope jumps by 2 kappa1 (1 + 1)(0.7 - 1)(-1/2) = 0.6 kappa1
        kappa1 = float(p.alpha_parameters[1])
        assert float(below[1] - above[1]) == pytest.approx(0.6 * kappa1, rel=1e-9)
    else:
        assert jump < JUMPS.get(model, 1e-11)


@EACH
def test_the_critical_temperature_belongs_to_the_side_below(model):
    p = parameters(CATALOGUE[model])
    for a, b in zip(p.alpha_jet(np.array(0.0)), p.alpha.jet(np.array(0.0), *p.alpha_parameters), strict=True):
        assert float(a) == float(b)


@EACH
def test_mixed_arrays_are_the_same_as_one_by_one(model):
    p = parameters(CATALOGUE[model])
    tau = np.array([0.4, -0.3, 0.0, -1e-9, 1e-9, -4.0])
    together = p.alpha_jet(tau)
    for i, t in enumerate(tau):
        for a, b in zip(together, p.alpha_jet(np.array(t)), strict=True):
            assert float(a[i]) == float(b)


def test_rows_are_taken():
    whole = bind(CATALOGUE["PRSV"], COMPONENTS).parameters
    part = whole.take(np.array([3, 1]))
    np.testing.assert_array_equal(part.supercritical.parameters[0], part.alpha_parameters[0])
    np.testing.assert_array_equal(part.supercritical.parameters[0], whole.alpha_parameters[0][[3, 1]])


# --- Boston and Mathias --------------------------------------------------------------------------------------


@EACH
def test_boston_and_mathias_keep_value_and_slope(model):
    """alpha(Tc) = 1 and the slope below Tc, whatever the function; c d = m/2."""
    record = replace(CATALOGUE[model], supercritical=BOSTON_MATHIAS_RULE)
    p = parameters(record)
    below, above = (p.alpha_jet(np.array(side * 1e-13)) for side in (1.0, -1.0))
    assert float(above[0]) == pytest.approx(-float(below[0]), rel=1e-9, abs=1e-25)
    assert float(above[1]) == pytest.approx(float(below[1]), rel=1e-11, abs=1e-14)
    assert p.supercritical.alpha is BOSTON_MATHIAS


def test_boston_and_mathias_for_soaves_function():
    """alpha = {exp[c (1 - Tr**d)]}**2, d = 1 + m/2, c = 1 - 1/d, m Soave's (read in a transcription)."""
    record = replace(CATALOGUE["SRK"], supercritical=BOSTON_MATHIAS_RULE)
    (m,) = parameters(record).alpha_parameters
    d = 1 + m / 2
    expected = np.exp((1 - 1 / d) * (1 - HOT**d)) ** 2
    np.testing.assert_allclose(alpha(record, HOT)[0], expected, rtol=1e-14)
    np.testing.assert_array_equal(alpha(record, 0.7), alpha(CATALOGUE["SRK"], 0.7))


def test_boston_and_mathias_fall_for_ever():
    """What they are for: Soave's function comes back up above Tr = (1 + 1/m)**2."""
    tr = np.linspace(1.0, 8.0, 50)
    record = replace(CATALOGUE["SRK"], supercritical=BOSTON_MATHIAS_RULE)
    assert (np.diff(alpha(record, tr)[0]) < 0).all()
    assert (np.diff(alpha(CATALOGUE["SRK"], tr)[0]) > 0).any()


def test_boston_and_mathias_leave_van_der_waals_alone():
    record = replace(CATALOGUE["vdW"], supercritical=BOSTON_MATHIAS_RULE)
    for values, expected in zip(alpha(record, HOT), (1.0, 0.0, 0.0), strict=True):
        np.testing.assert_array_equal(np.abs(values), expected)


# --- in a plan -----------------------------------------------------------------------------------------------


def test_an_own_model_names_its_rule():
    assert own("Soave", {"m": 0.7}).supercritical == OWN_RULE
    hot = own("Soave", {"m": 0.7}, supercritical="Boston-Mathias")
    assert alpha(hot, 3.0)[0] == pytest.approx(np.exp(2 * (1 - 1 / 1.35) * (1 - 3.0**1.35)), rel=1e-14)
    assert SUPERCRITICAL_RULES == ("own", "Boston-Mathias")


@pytest.mark.parametrize("value", ["boston", 3, None, [], True])
def test_an_unknown_rule_is_refused(value):
    with pytest.raises(InputError, match=r"supercritical = .* must be one of own, Boston-Mathias"):
        own("Soave", {"m": 0.7}, supercritical=value)


@EACH
def test_supercritical_parameters_are_the_functions(model):
    record = CATALOGUE[model]
    assert set(record.supercritical_parameters) <= set(record.parameters)
    assert record.supercritical == OWN_RULE
