"""Lists and the layout of answers: everything is there, and it fits."""

from __future__ import annotations

import re

import pytest

from eosmuster import components, listing
from eosmuster.commands.listing import TOPICS
from eosmuster.components import Component, find
from eosmuster.errors import InputError
from eosmuster.inquiry import ask
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.plan import builtin
from eosmuster.quantities import PROPERTIES
from eosmuster.report.text import cells_of
from eosmuster.sources import handbook


def first_words(text: str) -> list[str]:
    """First cell of each row of the table at the top."""
    return [line.split("  ")[0] for line in text.partition("\n\n")[0].splitlines()[2:]]


def test_the_command_line_offers_what_there_is() -> None:
    assert set(TOPICS) == set(listing.LISTS)


@pytest.mark.parametrize("width", [60, 80, 100])
@pytest.mark.parametrize("topic", TOPICS)
def test_lists_fit(topic: str, width: int) -> None:
    assert max(map(cells_of, listing.LISTS[topic](width).splitlines())) <= width


def test_all_models_are_listed() -> None:
    assert first_words(listing.models_text(100)) == list(CATALOGUE)
    assert all(record.source in listing.models_text(400) for record in CATALOGUE.values())


def test_all_components_are_listed_and_what_is_left_out_has_its_reason() -> None:
    text = listing.components_text(100)
    assert first_words(text) == list(components.catalogue())
    assert "130 pure components. Left out:" in text
    unwrapped = " ".join(text.split())
    for name, reason in components.left_out().items():
        assert f"{name}: {reason}" in unwrapped


def test_all_references_are_listed() -> None:
    text = listing.references_text(100)
    for count in handbook.counts():
        cells = [count.property, count.source, str(count.components), str(count.rows), str(count.excluded)]
        assert re.search("^" + " +".join(map(re.escape, cells)) + "$", text, re.MULTILINE)
    assert len(re.findall(r"^\w+ +coolprop 8\.\S+ +130$", text, re.MULTILINE)) == len(PROPERTIES)


def test_all_properties_and_plans_are_listed() -> None:
    assert first_words(listing.properties_text(100)) == list(PROPERTIES)
    assert first_words(listing.plans_text(100)) == list(builtin.names())


# ---------------------------------------------------------------- what the command line asks for


def test_no_model_named_means_all() -> None:
    assert listing.chosen_models(None) == listing.chosen_models([]) == tuple(CATALOGUE)


def test_models_keep_the_order_they_were_named_in_each_once() -> None:
    assert listing.chosen_models(["srk", "pr-TWU91", "SRK"]) == ("SRK", "PR-Twu91")


def test_an_unknown_model_is_refused_with_the_nearest() -> None:
    with pytest.raises(InputError, match=r"--model: unknown model 'PR87'; nearest: PR78, PR; valid: vdW, RK, "):
        listing.chosen_models(["PR", "PR87"])


def test_quantities() -> None:
    assert listing.positive(None, "temperature", "-T") is None
    assert listing.positive("25 degC", "temperature", "-T") == pytest.approx(298.15)
    assert listing.positive("1 atm", "pressure", "-p") == 101325.0
    with pytest.raises(InputError, match="-T: '-300 degC' is not above absolute zero"):
        listing.positive("-300 degC", "temperature", "-T")
    with pytest.raises(InputError, match="-p: '0' is not above zero; a positive pressure"):
        listing.positive("0", "pressure", "-p")


# ---------------------------------------------------------------- answers


def test_densities_are_by_mass_and_pressures_in_bar() -> None:
    propane = find("propane")
    answers = ask(propane, ["PR"], temperature=300.0)
    text = listing.saturation_text(propane, answers, 300.0, None, 100)
    assert text.startswith(
        "n-Propane, saturated at T = 300 K (26.85 degC)\nTc 369.89 K, pc 42.512 bar, omega 0.1521\n"
    )
    assert "p_sat, bar  liquid, kg/m3  vapor, kg/m3  h_vap, kJ/mol  fugacity, bar" in text
    [row] = [line.split() for line in text.splitlines() if line.startswith("PR ")]
    pr = answers[0]
    mass = propane.molar_mass or 0.0
    expected = [pr.pressure / 1e5, pr.liquid_density * mass, pr.vapor_density * mass]
    expected += [pr.enthalpy_of_vaporization / 1e3, pr.fugacity / 1e5]
    assert [float(cell) for cell in row[1:]] == pytest.approx(expected, rel=5e-6)  # six digits are shown


def test_a_boiling_temperature_takes_the_place_of_the_pressure() -> None:
    water = find("water")
    text = listing.saturation_text(water, ask(water, ["PR"], pressure=101325.0), None, 101325.0, 100)
    assert text.startswith("Water, saturated at p = 101325 Pa (1.01325 bar)\n")
    assert "T_b, K" in text
    high = listing.saturation_text(water, [], None, 2e6, 100)
    assert high.startswith("Water, saturated at p = 2000000 Pa (20 bar)\n")
    assert re.search(r"^coolprop \S+ +373\.124 +958\.36\d ", text, re.MULTILINE)


def test_without_a_molar_mass_densities_stay_molar() -> None:
    own = Component("plant cut", critical_temperature=540.2, critical_pressure=27.4e5, acentric_factor=0.35)
    answers = ask(own, ["PR"], temperature=400.0)
    text = listing.saturation_text(own, answers, 400.0, None, 100)
    assert "liquid, mol/m3" in text
    [row] = [line.split() for line in text.splitlines() if line.startswith("PR ")]
    assert float(row[2]) == pytest.approx(answers[0].liquid_density, rel=5e-6)
    assert "not a pure fluid of the library" in text


def test_reasons_are_footnotes() -> None:
    helium = find("helium")
    text = listing.saturation_text(helium, ask(helium, ["PRSV", "PR"], temperature=4.0), 4.0, None, 100)
    assert re.search(r"^PRSV +- +- +- +- +- +\[1\]$", text, re.MULTILINE)
    assert "[1] unavailable: no parameters" in text


@pytest.mark.parametrize("name", components.catalogue())
def test_what_must_be_known_of_a_fluid_is_said_and_fits(name: str) -> None:
    fluid = components.catalogue()[name]
    text = listing.saturation_text(fluid, [], 300.0, None, 80)
    head = text.partition("\n\n")[0]
    assert max(map(cells_of, head.splitlines())) <= 80
    for note in fluid.notes:
        assert note in " ".join(head.split())


def test_the_contradiction_of_propylene_glycol_is_said() -> None:
    glycol = find("propylene glycol")
    text = listing.saturation_text(glycol, ask(glycol, ["PR"], temperature=450.0), 450.0, None, 100)
    assert "omega 0.7196" in text
    assert "omega replaced: the record stores 0.32684" in text
