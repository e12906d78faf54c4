"""A user's own models: every way to write one, and one clear sentence for every bad one."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest
from multiprecision import critical, saturated

from eosmuster.api import sweep
from eosmuster.components import Component, find
from eosmuster.errors import InputError
from eosmuster.models.alpha import ALPHA_FUNCTIONS
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.custom import TRANSLATIONS, record_from_plan
from eosmuster.models.forms import FORMS
from eosmuster.models.model import bind
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.saturation import solver

GOOD = {
    "name": "house PR",
    "form": "Peng-Robinson",
    "alpha": "Soave",
    "parameters": {"m": [0.37464, 1.54226, -0.26992]},
    "source": "in-house",
}
WHERE = "plan.toml: model no. 1"
OWN = Component("own", critical_temperature=500.0, critical_pressure=3e6, acentric_factor=0.3)


def read(**changes):
    return record_from_plan(GOOD | changes, WHERE)


def states(record, component=OWN, T=(300.0, 400.0, 495.0)):
    return solver.at_temperature(bind(record, [component]).parameters.take(0), np.array(T))


def same(found, expected, rtol=1e-13):
    np.testing.assert_allclose(found.pressure, expected.pressure, rtol=rtol)
    np.testing.assert_allclose(found.liquid_density, expected.liquid_density, rtol=rtol)
    np.testing.assert_allclose(found.vapor_density, expected.vapor_density, rtol=rtol)


# --- good models ---------------------------------------------------------------------------------------------


def test_the_same_model_gives_the_same_states():
    record = read(note="as PR")
    assert (record.own, record.status, record.source, record.note) == (True, "the user's own", "in-house", "as PR")
    same(states(record), states(CATALOGUE["PR"]), rtol=1e-15)


@pytest.mark.parametrize(
    ("given", "expected"),
    [
        (["saturation_pressure", "liquid_density", "liquid_density"], ("saturation_pressure", "liquid_density")),
        ("saturation_pressure", ("saturation_pressure",)),
        ([], ()),
    ],
)
def test_what_was_fitted_to_the_reference_is_said(given, expected):
    assert read(fitted=given).fitted == expected
    assert read().fitted == ()


@pytest.mark.parametrize(
    ("given", "message"),
    [
        (["vapour_pressure"], "fitted names 'vapour_pressure', which is no property; nearest: saturation_pressure"),
        ([7], "fitted names 7, which is no property"),
        (True, "fitted = True must be a list of properties"),
        ({"saturation_pressure": 1}, "must be a list of properties"),
    ],
)
def test_what_was_fitted_is_a_list_of_properties(given, message):
    with pytest.raises(InputError, match=message):
        read(fitted=given)


def test_an_own_model_fitted_to_the_reference_is_not_independent(tmp_path):
    """Its saturation pressures are the reference's by its own word; its densities owe their constants alone to it."""
    plan = tmp_path / "plan.toml"
    plan.write_text(FITTED, encoding="utf-8")
    points = sweep(plan).summary
    assert dict(zip(points["property"], points["independence"], strict=True)) == {
        "saturation_pressure": "fitted",
        "liquid_density": "constants",
    }


FITTED = """
components = ["propane"]
models = ["house PR"]
properties = ["saturation_pressure", "liquid_density"]
[states]
reduced_temperature = [0.7, 0.8]
[references]
use = ["coolprop"]
[[model]]
name = "house PR"
form = "Peng-Robinson"
alpha = "Soave"
parameters = { m = [0.37464, 1.54226, -0.26992] }
fitted = ["saturation_pressure"]
source = "invented"
"""


def test_one_number_is_for_every_component():
    m = 0.37464 + 1.54226 * 0.3 - 0.26992 * 0.09
    same(states(read(parameters={"m": m})), states(CATALOGUE["PR"]))


def test_a_table_is_by_component():
    record = read(parameters={"m": {"own": 0.8, "n-Propane": 0.6}})
    assert bind(record, [OWN, find("propane"), find("water")]).unavailable == ("", "", "no parameters")


@pytest.mark.parametrize(
    ("form", "deltas"),
    [
        ("van der Waals", (0.0, 0.0)),
        ("Redlich-Kwong", (1.0, 0.0)),
        ("Redlich-Kwong", (0, 1)),
        ("Peng-Robinson", (1.0 + np.sqrt(2.0), 1.0 - np.sqrt(2.0))),
    ],
)
def test_a_form_by_its_deltas_is_the_named_form(form, deltas):
    """1e-12: sqrt(2) is rounded, and its curve may be made on demand."""
    by_deltas = read(form={"delta1": deltas[0], "delta2": deltas[1]})
    same(states(by_deltas), states(read(form=form)), rtol=1e-12)


@pytest.mark.parametrize("deltas", [(-0.9, -0.9), (-0.5, -0.5), (3.0, -0.5), (1.0, 1.0), (10.0, 0.0)])
def test_any_form_by_its_deltas_is_solved(deltas):
    """Against multi-precision arithmetic; 1e-12, what curves made on demand are good for near Tc."""
    record = read(form={"delta1": deltas[0], "delta2": deltas[1]}, alpha="constant", parameters={})
    unity = Component("x", critical_temperature=1.0, critical_pressure=1.0, acentric_factor=0.0)
    reduced = np.array([0.1, 0.3, 0.6, 0.9, 0.99, 0.9999])
    found = states(record, unity, reduced)
    d1, d2 = map(mp.mpf, deltas)
    point = critical(d1 + d2, d1 * d2)
    b = point.omega_b * mp.mpf(GAS_CONSTANT)
    for i, tr in enumerate(reduced.tolist()):
        exact = saturated(point.q / mp.mpf(tr), d1 + d2, d1 * d2)
        assert float(found.pressure[i]) == pytest.approx(float(exact.p * tr / point.omega_b), rel=1e-12)
        assert float(found.liquid_density[i]) == pytest.approx(float(1 / (exact.liquid * b)), rel=1e-12)
        assert float(found.vapor_density[i]) == pytest.approx(float(1 / (exact.vapor * b)), rel=1e-12)


@pytest.mark.parametrize("form", FORMS)
@pytest.mark.parametrize("alpha", ALPHA_FUNCTIONS)
def test_every_form_goes_with_every_alpha_function(form, alpha):
    values = {"kappa1": 0.05, "c2": -0.2, "c3": 0.3, "A": 2.0, "B": 0.836, "C": 0.2, "omega": 0.3, "L1": 0.5} | {
        "L": 0.3, "M": 0.9, "N": 1.5, "L0": 0.13, "M0": 0.91, "N0": 1.95, "M1": 0.78, "N1": 2.81, "k": 1.5,
    }  # fmt: skip
    parameters = {name: values.get(name, 0.7) for name in ALPHA_FUNCTIONS[alpha].parameters}
    record = read(form=form, alpha=alpha, parameters=parameters)
    water = find("water")
    found = states(record, water, np.array([0.6, 0.9, 0.999]) * water.critical_temperature)
    assert (found.status == solver.SOLVED).all()
    assert (np.diff(found.pressure) > 0).all()


@pytest.mark.parametrize(
    ("translation", "volume"),
    [
        ({"volume": {"own": "5 cm3/mol"}}, 5e-6),
        ({"volume": {"own": -3e-6}}, -3e-6),
        ({"fraction_of_covolume": {"own": 0.05}}, 0.05 * 0.0777960739038884559718 * GAS_CONSTANT * 500.0 / 3e6),
        (
            {"rackett": [0.50033, 0.25969]},
            0.50033 * (0.25969 - 0.29056 + 0.08775 * 0.3) * GAS_CONSTANT * 500.0 / 3e6,
        ),
    ],
    ids=["volume with unit", "volume in SI", "fraction of the covolume", "rackett"],
)
def test_translation(translation, volume):
    """V = V_EOS - c."""
    plain, moved = states(read()), states(read(translation=translation))
    np.testing.assert_array_equal(moved.pressure, plain.pressure)
    np.testing.assert_allclose(1 / moved.liquid_density, 1 / plain.liquid_density - volume, rtol=1e-13)
    np.testing.assert_allclose(1 / moved.vapor_density, 1 / plain.vapor_density - volume, rtol=1e-13)


def test_rackett_of_the_catalogue_can_be_written():
    expected = states(CATALOGUE["PR+Peneloux"])
    same(states(read(translation={"rackett": [0.50033, 0.25969]})), expected)


def test_a_model_in_a_plan_is_swept(tmp_path):
    plan = tmp_path / "house.toml"
    plan.write_text(
        """
components = ["propane"]
models = ["PR"]
properties = ["saturation_pressure", "liquid_density"]
[states]
reduced_temperature = [0.6, 0.8]
[tolerance]
saturation_pressure = "2 %"
liquid_density = "6 %"
[references]
use = ["coolprop"]
[[model]]
name = "house PR"
form = "Peng-Robinson"
alpha = "Soave"
parameters = { m = [0.37464, 1.54226, -0.26992] }
source = "in-house"
""",
        encoding="utf-8",
    )
    points = sweep(plan).points.set_index("candidate")
    assert set(points.index) == {"PR", "house PR"}
    np.testing.assert_allclose(points.loc["house PR", "predicted"], points.loc["PR", "predicted"], rtol=1e-15)


# --- bad models ----------------------------------------------------------------------------------------------

BAD = {
    "name missing": ({"name": None}, r"name = None must be a text"),
    "name empty": ({"name": " "}, r"name = ' ' must be a text"),
    "name a number": ({"name": 3}, r"name = 3 must be a text"),
    "name of the catalogue": ({"name": "PR"}, r"name = 'PR' is a catalogued model"),
    "source missing": ({"source": None}, r"source = None must be a text"),
    "source empty": ({"source": ""}, r"source = '' must be a text"),
    "unknown key": ({"colour": "red"}, r"unknown key 'colour'; valid: name, form, alpha"),
    "key misspelt": ({"paramters": {}}, r"unknown key 'paramters'; nearest: parameters"),
    "form missing": ({"form": None}, r"form = None must be one of van der Waals"),
    "form misspelt": ({"form": "Peng-Robison"}, r"unknown form 'Peng-Robison'; nearest: Peng-Robinson"),
    "form a number": ({"form": 3}, r"form = 3 must be one of .* or \{delta1"),
    "form a list": ({"form": ["Peng-Robinson"]}, r"form = a list must be one of"),
    "form half": ({"form": {"delta1": 1.0}}, r"form = a table must be one of"),
    "form no number": ({"form": {"delta1": 1.0, "delta2": "x"}}, r"form.delta2 = 'x' is not a finite number"),
    "form infinite": ({"form": {"delta1": float("inf"), "delta2": 0}}, r"form.delta1 = inf is not a finite"),
    "form singular": ({"form": {"delta1": -1.0, "delta2": 0.0}}, r"must have delta1 and delta2 above -1"),
    "alpha missing": ({"alpha": None}, r"alpha = None must be a text"),
    "alpha misspelt": ({"alpha": "Saove"}, r"unknown alpha function 'Saove'; nearest: Soave"),
    "alpha a list": ({"alpha": ["Soave"]}, r"alpha = a list must be a text"),
    "parameters no table": ({"parameters": 0.8}, r"parameters = 0.8 must be a table of m"),
    "parameters a list": ({"parameters": [0.8]}, r"parameters = a list must be a table of m"),
    "parameter missing": ({"parameters": {}}, r"parameter 'm' is missing; the alpha function needs m"),
    "parameter unknown": ({"parameters": {"m": 0.8, "n": 1.0}}, r"unknown parameter 'n'; valid: m"),
    "parameter a text": ({"parameters": {"m": "0.8"}}, r"parameters.m = '0.8' is not a finite number"),
    "parameter a truth value": ({"parameters": {"m": True}}, r"parameters.m = True is not a finite number"),
    "parameter not a number": ({"parameters": {"m": float("nan")}}, r"parameters.m = nan is not a finite number"),
    "parameter empty": ({"parameters": {"m": []}}, r"parameters.m = \[\] must hold at least one"),
    "coefficient no number": ({"parameters": {"m": [0.4, "x"]}}, r"parameters.m = 'x' is not a finite number"),
    "component's no number": ({"parameters": {"m": {"own": "x"}}}, r"parameters.m.own = 'x' is not a finite"),
    "supercritical unknown": ({"supercritical": "Boston"}, r"supercritical = 'Boston' must be one of own, Boston-"),
    "translation no table": ({"translation": 5e-6}, r"translation = 5e-06 must hold exactly one of volume"),
    "translation empty": ({"translation": {}}, r"translation = a table must hold exactly one of"),
    "translation unknown": ({"translation": {"shift": 0.1}}, r"must hold exactly one of volume, fraction"),
    "translation twice": ({"translation": {"volume": {}, "rackett": [1, 2]}}, r"must hold exactly one of"),
    "rackett short": ({"translation": {"rackett": [0.5]}}, r"rackett = a list must be \[k, z0\]"),
    "rackett no number": ({"translation": {"rackett": [0.5, "x"]}}, r"rackett = 'x' is not a finite number"),
    "volume no table": ({"translation": {"volume": 5e-6}}, r"volume = 5e-06 must be a table of component"),
    "volume unit": ({"translation": {"volume": {"own": "5 bar"}}}, r"volume.own: '5 bar' has an unknown unit"),
    "fraction no number": ({"translation": {"fraction_of_covolume": {"own": "x"}}}, r"own = 'x' is not a finite"),
}


@pytest.mark.parametrize(("changes", "message"), BAD.values(), ids=BAD)
def test_bad_model(changes, message):
    with pytest.raises(InputError, match=message) as caught:
        read(**changes)
    text = str(caught.value)
    assert text.startswith(WHERE)
    assert "\n" not in text


@pytest.mark.parametrize("changes", [{"parameters": {"m": 10**400}}, {"form": {"delta1": 10**400, "delta2": 0}}])
def test_integer_too_large_for_a_double(changes):
    with pytest.raises(InputError, match="finite number"):
        read(**changes)


def test_every_translation_is_tested_above():
    assert set(TRANSLATIONS) == {"volume", "fraction_of_covolume", "rackett"}


def test_the_table_of_the_caller_is_not_kept():
    table = GOOD | {"parameters": {"m": {"own": 0.8}}}
    record = record_from_plan(table, WHERE)
    table["parameters"]["m"]["own"] = 0.1
    assert record.parameters["m"].values["own"] == 0.8
