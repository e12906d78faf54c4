"""Binding a record to components: what is available, why not, and where constants and translations come from."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from eosmuster.components import Component, catalogue, find
from eosmuster.errors import InputError
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.custom import record_from_plan
from eosmuster.models.model import bind, check_bound, critical_compressibility, parameter_file
from eosmuster.models.records import Polynomial, polynomial
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.saturation import solver

OWN = Component("own", critical_temperature=500.0, critical_pressure=3e6, acentric_factor=0.3)
LIMIT = "the form has no real delta1 for a critical compressibility factor above 0.28975"


@pytest.mark.parametrize(
    ("model", "component", "reason"),
    [
        ("PR", "water", ""),
        ("PRSV", "R134a", "no parameters"),
        ("PRSV", "propane", ""),
        ("PRSV", "HCl", "no parameters"),
        ("PR-Twu91", "hydrogen chloride", ""),
        ("PR-Twu91", "parahydrogen", "no parameters"),
        ("PR+Jhaveri-Youngren", "water", "no volume translation"),
        ("PR+Jhaveri-Youngren", "cyclopropane", "no volume translation"),
        ("tc-PR-2018", "methane", ""),
        ("RKPR", "hydrogen", LIMIT),
        ("RKPR", "CO", LIMIT),
        ("RKPR", "oxygen", ""),
    ],
)
def test_reason(model, component, reason):
    assert bind(CATALOGUE[model], [find(component)]).unavailable == (reason,)


@pytest.mark.parametrize(
    ("model", "reason"),
    [
        ("SRK", ""),
        ("PRSV", "no parameters"),
        ("PR-Twu91", "no parameters"),
        ("tc-PR-2018", "no volume translation"),
        ("SRK+Peneloux", ""),
        ("RKPR", "no critical density, which the form needs"),
    ],
)
def test_reason_for_an_own_component(model, reason):
    """Tables are keyed by CAS number, which it does not have."""
    assert bind(CATALOGUE[model], [OWN]).unavailable == (reason,)


def test_an_own_component_with_a_cas_number_has_the_tabulated_parameters():
    propane = replace(OWN, cas="74-98-6")
    kappa1 = bind(CATALOGUE["PRSV"], [propane]).parameters.alpha_parameters[1]
    assert kappa1.tolist() == [0.03136]  # Stryjek and Vera (1986), Table 1, read in a transcription


def test_an_own_component_with_a_critical_density_has_the_form_that_needs_it():
    dense = replace(OWN, critical_density=3e6 / (0.27 * GAS_CONSTANT * 500.0))
    assert critical_compressibility(dense) == pytest.approx(0.27, rel=1e-15)
    assert bind(CATALOGUE["RKPR"], [dense]).unavailable == ("",)
    assert np.isnan(critical_compressibility(OWN))


def test_spin_isomers_share_nothing_with_normal_hydrogen():
    for name in ("OrthoHydrogen", "ParaHydrogen", "OrthoDeuterium", "ParaDeuterium"):
        assert not find(name).cas
        assert bind(CATALOGUE["tc-RK-2018"], [find(name)]).unavailable == ("no volume translation",)


def test_unavailable_rows_are_not_a_number():
    bound = bind(CATALOGUE["PRSV"], [find("propane"), find("R134a")])
    np.testing.assert_array_equal(np.isnan(bound.parameters.critical_temperature), [False, True])


def test_check_bound_names_model_component_and_reason():
    water = find("water")
    bound = bind(CATALOGUE["PR+Jhaveri-Youngren"], [water])
    with pytest.raises(InputError, match=r"PR\+Jhaveri-Youngren is unavailable for Water: no volume translation"):
        check_bound(bound, water)
    check_bound(bind(CATALOGUE["PR"], [water]), water)


# --- constants -----------------------------------------------------------------------------------------------


def test_pr_twu91_keeps_its_own_critical_constants():
    """Bell, Satyro and Lemmon, J. Chem. Eng. Data 63 (2018) 2402: acetone's 508.065292903 K and 4704446.78544 Pa."""
    acetone = find("acetone")
    p = bind(CATALOGUE["PR-Twu91"], [acetone]).parameters.take(0)
    assert (float(p.critical_temperature), float(p.critical_pressure)) == (508.065292903, 4704446.78544)
    assert acetone.critical_temperature == 508.1
    states = solver.at_temperature(p, [508.06, 508.08])
    assert [solver.STATUSES[i] for i in states.status] == ["solved", "above_critical"]


@pytest.mark.parametrize("model", [name for name, record in CATALOGUE.items() if not record.constants])
def test_other_models_take_the_components_constants(model):
    components = tuple(catalogue().values())
    bound = bind(CATALOGUE[model], components)
    for i, (component, reason) in enumerate(zip(components, bound.unavailable, strict=True)):
        if not reason:
            assert bound.parameters.critical_temperature[i] == component.critical_temperature
            assert bound.parameters.critical_pressure[i] == component.critical_pressure


def test_parameter_files_are_keyed_by_cas_number():
    rows = parameter_file("prsv_kappa1.csv")
    assert float(rows["74-98-6"]["kappa1"]) == 0.03136


# --- parameters ----------------------------------------------------------------------------------------------


def test_a_two_parameter_form_is_kept_once():
    components = [find(name) for name in ("methane", "water", "propane")]
    two, three = (bind(CATALOGUE[name], components).parameters for name in ("PR", "PT"))
    assert two.s.tolist() == [2.0]
    assert two.m.tolist() == [-1.0]
    assert two.form.tolist() == [0, 0, 0]
    assert three.s.shape == three.m.shape == (3,)
    assert three.form.tolist() == [0, 1, 2]


@pytest.mark.parametrize("model", ["PR", "PT", "SRK+Peneloux", "PR-Twu95"])
@pytest.mark.parametrize("index", [np.array([2, 0, 0]), slice(1, 3), 1], ids=["repeats", "slice", "one"])
def test_take(model, index):
    components = [find(name) for name in ("methane", "water", "propane")]
    whole = bind(CATALOGUE[model], components).parameters
    part = whole.take(index)
    chosen = np.array([c.critical_temperature for c in components])[index]
    np.testing.assert_array_equal(part.critical_temperature, chosen)
    np.testing.assert_array_equal(part.s[part.form], whole.s[whole.form][index])
    T = 0.7 * np.asarray(chosen)
    alone = np.array(
        [float(solver.at_temperature(whole.take(i), 0.7 * whole.critical_temperature[i]).pressure) for i in range(3)]
    )
    np.testing.assert_allclose(solver.at_temperature(part, T).pressure, alone[index], rtol=1e-13)


def test_translation_signs():
    """V = V_EOS - c: octane by SRK is too light, c > 0 (Peneloux); methane by PR too dense, c < 0 (Whitson)."""
    octane, methane = find("n-octane"), find("methane")
    peneloux = bind(CATALOGUE["SRK+Peneloux"], [octane]).parameters.translation
    omega = octane.acentric_factor
    assert float(peneloux[0]) == pytest.approx(0.40768 * (0.29441 - 0.29056 + 0.08775 * omega), rel=1e-14)
    assert peneloux[0] > 0
    jhaveri = bind(CATALOGUE["PR+Jhaveri-Youngren"], [methane]).parameters.translation
    assert float(jhaveri[0]) == pytest.approx(-0.1595 * 0.0777960739038884559718, rel=1e-14)
    pairs = ((octane, "SRK", "SRK+Peneloux", 1), (methane, "PR", "PR+Jhaveri-Youngren", -1))
    for component, base, translated, sign in pairs:
        T = 0.7 * component.critical_temperature
        plain, moved = (
            float(solver.at_temperature(bind(CATALOGUE[name], [component]).parameters.take(0), T).liquid_density)
            for name in (base, translated)
        )
        assert (moved > plain) is (sign > 0)


@pytest.mark.parametrize("model", ["tc-PR-2018", "tc-RK-2018"])
def test_tc_translation_meets_its_defining_density(model):
    """The translation is defined by the reference equation's liquid volume at Tr = 0.8."""
    from eosmuster.sources.library import saturation

    propane = find("propane")
    T = 0.8 * propane.critical_temperature
    states = solver.at_temperature(bind(CATALOGUE[model], [propane]).parameters.take(0), T)
    reference = float(saturation(propane, T, ["liquid_density"]).values["liquid_density"])
    assert float(states.liquid_density) == pytest.approx(reference, rel=1e-6)  # seven digits are tabulated


def test_polynomials():
    assert float(polynomial(1.0, 2.0, 3.0)(np.array(0.5))) == 2.75
    banded = Polynomial(((0.0, (1.0,)), (1.0, (2.0,)), (float("inf"), (3.0,))))
    np.testing.assert_array_equal(banded(np.array([-1.0, 0.0, 0.5, 1.0, 1.1])), [1, 1, 2, 2, 3])


def test_per_component_parameters_are_looked_up_by_name():
    table = {
        "name": "own",
        "form": "Peng-Robinson",
        "alpha": "Soave",
        "parameters": {"m": {"own": 0.8}},
        "translation": {"volume": {"own": "5 cm3/mol"}},
        "source": "test",
    }
    record = record_from_plan(table, "test")
    bound = bind(record, [OWN, replace(OWN, name="other")])
    assert bound.unavailable == ("", "no parameters")
    assert bound.parameters.alpha_parameters[0][0] == 0.8
    assert float(bound.parameters.translation[0]) == pytest.approx(5e-6 * 3e6 / (GAS_CONSTANT * 500.0), rel=1e-15)
