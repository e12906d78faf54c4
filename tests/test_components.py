"""Components: validation, lookup, selection, and every catalogued constant against the library's own records."""

from __future__ import annotations

import json
import math
import pickle
import re
import runpy
import subprocess
import sys
from collections import Counter
from functools import cache

import pytest

from eosmuster.components import (
    FAMILIES,
    Component,
    acentric_from_saturation,
    catalogue,
    equation_citations,
    family,
    find,
    left_out,
    resolve,
)
from eosmuster.errors import InputError
from eosmuster.paths import references_folder

NAMES = list(catalogue())


@cache
def library_record(name):
    from CoolProp.CoolProp import get_fluid_param_string

    return json.loads(get_fluid_param_string(name, "JSON"))[0]


def own(**changes):
    given = {"name": "cut 7", "critical_temperature": 540.2, "critical_pressure": 27.4e5, "acentric_factor": 0.35}
    return Component(**(given | changes))


# --- validation ---------------------------------------------------------------------------------------------


def test_an_own_component_needs_three_constants_only():
    component = own()
    assert (component.family, component.library_name, component.cas) == ("other", "", "")
    assert component.molar_mass is component.critical_density is component.triple_temperature is None


@pytest.mark.parametrize(
    ("key", "value"),
    [
        ("critical_temperature", 0.0),
        ("critical_temperature", math.nan),
        ("critical_temperature", "540.2 K"),
        ("critical_temperature", None),
        ("critical_pressure", -1.0),
        ("critical_pressure", math.inf),
        ("critical_pressure", True),
        ("acentric_factor", -1.0),
        ("acentric_factor", 3.0),
        ("acentric_factor", math.nan),
        ("molar_mass", 0.0),
        ("critical_density", -5.0),
        ("triple_temperature", 540.2),
    ],
)
def test_a_bad_constant_is_named_with_its_component_and_value(key, value):
    with pytest.raises(InputError) as caught:
        own(**{key: value})
    message = str(caught.value)
    assert "'cut 7'" in message
    assert key in message
    assert repr(value) in message
    assert "valid is a finite number above" in message


@pytest.mark.parametrize("name", ["", "  ", 7])
def test_a_component_needs_a_name(name):
    with pytest.raises(InputError, match="name is"):
        own(name=name)


def test_a_component_travels_to_another_process_and_into_a_set():
    component = find("water")
    assert pickle.loads(pickle.dumps(component)) == component
    assert len({component, find("H2O"), find("methane")}) == 2


# --- the catalogue ------------------------------------------------------------------------------------------


def test_all_fluids_of_the_library_are_catalogued_or_left_out():
    from CoolProp.CoolProp import get_global_param_string

    listed = set(get_global_param_string("FluidsList").split(","))
    assert len(NAMES) == 130
    assert set(NAMES) | set(left_out()) == listed
    assert not set(NAMES) & set(left_out())
    assert sorted(NAMES, key=str.casefold) == NAMES


def test_the_generator_writes_the_committed_tables(tmp_path):
    folder = references_folder()
    generator = runpy.run_path(str(folder / "generators" / "components.py"))
    generator["main"].__globals__["HERE"] = tmp_path
    generator["main"]()
    for name in ("components.csv", "equations.csv"):
        assert (tmp_path / name).read_bytes() == (folder / name).read_bytes(), name


def test_exactly_the_pseudo_pure_fluids_are_left_out():
    for name in left_out():
        assert library_record(name)["EOS"][0]["pseudo_pure"], name
    assert set(left_out()) == {"Air", "R404A", "R407C", "R410A", "R507A", "SES36"}


@pytest.mark.parametrize("name", NAMES)
def test_constants_are_those_of_the_librarys_record(name):
    record, component = library_record(name), catalogue()[name]
    critical, equation = record["STATES"]["critical"], record["EOS"][0]
    # 1e-14: the file holds 15 significant digits
    assert component.critical_temperature == pytest.approx(critical["T"], rel=1e-14)
    assert component.critical_pressure == pytest.approx(critical["p"], rel=1e-14)
    assert component.critical_density == pytest.approx(critical["rhomolar"], rel=1e-14)
    assert component.molar_mass == pytest.approx(equation["molar_mass"], rel=1e-14)
    # half a kelvin: a triple point rounded to the other side of the equation's start is moved onto it
    assert equation["Ttriple"] - 1e-9 <= component.triple_temperature < equation["Ttriple"] + 0.5
    assert not equation["pseudo_pure"]
    assert component.library_name == name
    assert component.sources["equation"] == ", ".join(equation["BibTeX_EOS"].replace(" ", "").split(","))


@pytest.mark.parametrize("name", NAMES)
def test_acentric_factor_is_stored_or_replaced_and_said(name):
    from CoolProp.CoolProp import PropsSI

    component, stored = catalogue()[name], library_record(name)["EOS"][0]["acentric"]
    T = 0.7 * component.critical_temperature
    consistent = acentric_from_saturation(PropsSI("P", "T", T, "Q", 0, name), component.critical_pressure)
    difference = abs(stored - consistent)
    said = " ".join(component.notes)
    expected = consistent if difference > 0.1 else stored
    assert component.acentric_factor == pytest.approx(expected, abs=1e-12)
    assert ("replaced:" in said) == (difference > 0.1)
    assert (f"gives {consistent:.5f}" in said) == (difference > 0.005)


def test_propylene_glycol_is_the_only_replaced_acentric_factor():
    replaced = [c.name for c in catalogue().values() if any(n.startswith("omega replaced") for n in c.notes)]
    assert replaced == ["PropyleneGlycol"]
    component = find("propylene glycol")
    # 0.327 stored, 0.720 by the equation itself: our own calculation, repeated here to its three digits
    assert component.acentric_factor == pytest.approx(0.720, abs=5e-4)
    assert "psat(0.7 Tc)" in component.sources["acentric_factor"]


def test_every_constant_has_a_source_and_every_equation_a_citation():
    constants = ("critical_temperature", "critical_pressure", "critical_density", "acentric_factor", "molar_mass")
    for component in catalogue().values():
        assert all(component.sources[key] for key in (*constants, "triple_temperature")), component.name
        for key in component.sources["equation"].split(", "):
            assert re.search(r"\(\d{4}\)", equation_citations()[key]), key


def test_triple_points_of_the_temperature_scale():
    # ITS-90 defining fixed points (H. Preston-Thomas, Metrologia 27 (1990) 3), K. 0.004 K: the equation of
    # neon starts at 24.56 K, argon's at 83.806 K
    fixed = {"ParaHydrogen": 13.8033, "Neon": 24.5561, "Oxygen": 54.3584, "Argon": 83.8058, "Water": 273.16}
    for name, T in fixed.items():
        assert catalogue()[name].triple_temperature == pytest.approx(T, abs=0.004), name


# --- identity -----------------------------------------------------------------------------------------------

NO_CAS = {"OrthoHydrogen", "ParaHydrogen", "OrthoDeuterium", "ParaDeuterium"}


def test_spin_isomers_have_no_cas_number_and_a_note():
    assert {c.name for c in catalogue().values() if not c.cas} == NO_CAS
    for name in NO_CAS:
        assert any("spin isomer" in note for note in catalogue()[name].notes)


@pytest.mark.parametrize("component", [c for c in catalogue().values() if c.cas], ids=lambda c: c.name)
def test_cas_numbers_carry_their_check_digit(component):
    # the last digit is the sum of the others, weighted 1, 2, ... from the right, modulo 10
    digits = [int(d) for d in component.cas.replace("-", "")]
    assert sum(i * d for i, d in enumerate(reversed(digits[:-1]), 1)) % 10 == digits[-1]


# not carried by the chemicals package, or carried there without its stereochemistry
NOT_IN_CHEMICALS = {"R1336mzz(E)"}
NO_STEREOCHEMISTRY = {"R1132(E)"}


@pytest.mark.parametrize(
    "component", [c for c in catalogue().values() if c.cas and c.name not in NOT_IN_CHEMICALS], ids=lambda c: c.name
)
def test_cas_inchikey_and_molar_mass_belong_together(component):
    chemicals = pytest.importorskip("chemicals")
    known = chemicals.search_chemical(component.cas)
    block = slice(14) if component.name in NO_STEREOCHEMISTRY else slice(None)
    assert component.inchikey[block] == known.InChI_key[block]
    # 1e-3: atomic masses of different years
    assert component.molar_mass == pytest.approx(known.MW / 1000.0, rel=1e-3)


def test_names_and_aliases_find_one_component_each():
    owners = Counter()
    for component in catalogue().values():
        for name in {n.casefold() for n in (component.name, component.cas, *component.aliases) if n}:
            owners[name] += 1
            assert find(name) is component, name
            assert find(name.upper()) is component, name
    assert max(owners.values()) == 1


@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("propane", "n-Propane"),
        ("R290", "n-Propane"),
        ("R-290", "n-Propane"),
        ("n-butane", "n-Butane"),
        ("water", "Water"),
        ("CO2", "CarbonDioxide"),
        ("carbon dioxide", "CarbonDioxide"),
        ("propene", "Propylene"),
        ("ethylene", "Ethylene"),
        ("7664-41-7", "Ammonia"),
        (" nh3 ", "Ammonia"),
        ("para-hydrogen", "ParaHydrogen"),
        ("r1234ze(E)", "R1234ze(E)"),
        ("isobutylene", "IsoButene"),
        ("hydrogen sulphide", "HydrogenSulfide"),
    ],
)
def test_everyday_names(name, expected):
    assert find(name).name == expected


def test_an_unknown_name_offers_the_nearest():
    with pytest.raises(InputError, match=r"'Propan' is unknown; nearest: propane"):
        find("Propan")
    with pytest.raises(InputError, match="valid: a name, an alias or a CAS number"):
        find("50-00-0")
    with pytest.raises(InputError, match="7 is not a text"):
        find(7)


@pytest.mark.parametrize("name", ["R410A", "r-404a", "air", "SES36"])
def test_a_blend_is_refused_with_its_reason(name):
    with pytest.raises(InputError, match=r"is left out: a (blend|mixture) of .*no single saturation pressure"):
        find(name)


# --- families and selections --------------------------------------------------------------------------------


def test_every_component_is_in_one_documented_family():
    assert len(FAMILIES) <= 16
    assert {c.family for c in catalogue().values()} == set(FAMILIES)
    assert sum(len(family(name)) for name in FAMILIES) == 130


def test_n_alkanes_are_one_to_twelve_carbons_long():
    # CnH2n+2 from the molar mass: 14.027 n + 2.016 g/mol
    carbons = sorted(round((1000.0 * c.molar_mass - 2.016) / 14.027) for c in family("n-alkanes"))
    assert carbons == list(range(1, 13))


@pytest.mark.parametrize(
    "name", ["n-alkane", "n-alkanes", "N-Alkanes", "n alkanes", "quantum gases", "polar", "fatty acid esters"]
)
def test_families_have_a_singular_and_a_plural(name):
    assert family(name)


def test_an_unknown_family_lists_the_families():
    with pytest.raises(InputError, match=r"'alkans' is unknown; nearest: .*alkane.*inorganic gas"):
        family("alkans")


def test_a_selection_keeps_its_order():
    chosen = resolve(["water", "Family: noble gases", "74-98-6"])
    assert [c.name for c in chosen] == ["Water", "Argon", "Krypton", "Xenon", "n-Propane"]
    assert resolve(["ALL"]) == tuple(catalogue().values())
    assert resolve([]) == ()


def test_a_component_named_twice_is_said():
    with pytest.raises(InputError, match=r"named twice: n-Propane \(R290, family:n-alkanes\)"):
        resolve(["R290", "family:n-alkanes"])


def test_a_selection_is_a_list():
    with pytest.raises(InputError, match="'propane' is a text"):
        resolve("propane")


def test_the_catalogue_does_not_import_the_library():
    code = (
        "import sys; from eosmuster.components import catalogue; catalogue();"
        "print(*{'CoolProp', 'pandas', 'scipy'} & set(sys.modules))"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert run.stdout.strip() == ""
