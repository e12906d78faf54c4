"""The handbook tables: every row cited, ranges held, plausible against each other and the library."""

from __future__ import annotations

import csv
import json
import math
import re
import subprocess
import sys
from collections.abc import Callable, Iterator
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from eosmuster import reference_rows as reading
from eosmuster.errors import InputError
from eosmuster.paths import references_folder
from eosmuster.quantities import PROPERTIES
from eosmuster.sources import handbook
from eosmuster.sources.bibliography import bibliography
from eosmuster.sources.cited import Correlation

Floats = NDArray[np.float64]
FILES = sorted([*handbook.CORRELATION_FILES.values(), *handbook.TABLE_FILES])


def rows(file: str) -> list[dict[str, str]]:
    with (references_folder() / "handbook" / file).open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


def every_correlation() -> Iterator[Correlation]:
    for name in handbook.CORRELATION_FILES:
        for cas in sorted({r["cas"] for r in rows(handbook.CORRELATION_FILES[name])}):
            yield from handbook.correlations(cas, name, include_excluded=True)


ALL = list(every_correlation())
PRESSURES = [c for c in ALL if c.property == "saturation_pressure"]


# ---------------------------------------------------------------- sources


def test_no_table_is_overlooked() -> None:
    expected = sorted([*FILES, "shared_equations.csv"])
    assert sorted(p.name for p in (references_folder() / "handbook").glob("*.csv")) == expected


@pytest.mark.parametrize("file", FILES)
def test_every_row_cites_a_source_of_the_bibliography(file: str) -> None:
    uncited = [r for r in rows(file) if r["source"] not in bibliography()]
    assert not uncited


@pytest.mark.parametrize("file", FILES)
def test_every_excluded_row_says_why(file: str) -> None:
    assert not [r for r in rows(file) if r["excluded"] == "yes" and len(r["note"]) < 20]


def test_bibliography_is_complete_and_says_where() -> None:
    text = (references_folder() / "bibliography.bib").read_text(encoding="utf-8")
    keys = [line.split("{")[1].rstrip(",") for line in text.splitlines() if line.startswith("@")]
    assert len(keys) == len(set(keys)) > 5
    assert list(bibliography()) == keys
    for key, reference in bibliography().items():
        assert any(str(year) in reference for year in range(1970, 2030)), key
        assert not set("{}\\\n") & set(reference), key


def test_bibliography_line() -> None:
    assert bibliography()["mcgarry-1983"] == (
        "J. McGarry: Correlation and prediction of the vapor pressures of pure liquids over large pressure "
        "ranges. Industrial & Engineering Chemistry Process Design and Development 22 (1983) 313–322. "
        "doi:10.1021/i200021a023"
    )


@pytest.mark.parametrize("file", FILES)
def test_names_and_numbers_are_the_librarys(file: str) -> None:
    assert {(r["component"], r["cas"]) for r in rows(file)} <= {(n, c) for c, n in library_names().items()}


# ---------------------------------------------------------------- coverage


# property -> components that must have a usable correlation, and a usable value of any kind
ASKED_FOR = {
    "saturation_pressure": (95, 95),
    "liquid_density": (75, 75),
    "enthalpy_of_vaporization": (70, 70),
    "vapor_density": (0, 35),
    "boiling_temperature": (0, 100),
}


@pytest.mark.parametrize("name", ASKED_FOR)
def test_there_is_as_much_as_asked_for(name: str) -> None:
    [covered] = [c for c in handbook.coverage() if c.property == name]
    assert covered.correlations >= ASKED_FOR[name][0]
    assert covered.either >= ASKED_FOR[name][1]
    assert covered.either + len(covered.missing) == len(
        [c for c in library_names() if re.fullmatch(r"\d+-\d\d-\d", c)]
    )


def test_coverage_is_what_is_handed_out() -> None:
    by_hand = {c.cas for c in PRESSURES if not c.excluded}
    [covered] = [c for c in handbook.coverage() if c.property == "saturation_pressure"]
    assert covered.correlations == len(by_hand)
    assert not {library_names()[cas] for cas in by_hand} & set(covered.missing)


def test_saturation_tables_are_as_many_as_asked_for_and_include_water() -> None:
    saturated = {r["cas"] for r in rows("saturation_tables.csv")}
    for name in ("saturation_pressure", "liquid_density", "vapor_density", "enthalpy_of_vaporization"):
        at_five = [cas for cas in saturated if sum(t.values.size for t in handbook.tables(cas, name)) >= 5]
        assert len(at_five) >= 35, name
        assert "7732-18-5" in at_five, name


def test_counts_add_up_and_stand_in_the_readme() -> None:
    counted = handbook.counts()
    assert sum(c.rows + c.excluded for c in counted) == sum(len(rows(file)) for file in FILES)
    readme = (references_folder() / "README.md").read_text(encoding="utf-8")
    for c in counted:
        assert f"| {c.property} | {c.source} | {c.components} | {c.rows} | {c.excluded} |" in readme
    for c in handbook.coverage():
        assert f"| {c.property} | {c.correlations} | {c.tables} | {c.either} |" in readme


def test_the_counts_are_printed_by_a_command() -> None:
    script = references_folder() / "generators" / "handbook.py"
    done = subprocess.run([sys.executable, str(script), "--counts"], capture_output=True, text=True, check=True)
    readme = (references_folder() / "README.md").read_text(encoding="utf-8")
    printed = [line for line in done.stdout.splitlines() if line.startswith("| ")]
    assert len(printed) > 30
    assert [line for line in printed if line not in readme] == []


def test_properties_are_known() -> None:
    assert {c.property for c in handbook.counts()} <= set(PROPERTIES)


def test_nothing_is_found_for_a_stranger() -> None:
    assert handbook.correlations("0-00-0", "saturation_pressure") == ()
    assert handbook.correlations("7732-18-5", "boiling_temperature") == ()
    assert handbook.tables("0-00-0", "saturation_pressure") == ()


def test_known_bad_rows_are_kept_but_not_handed_out() -> None:
    for cas, name, source in [
        ("7782-39-0", "saturation_pressure", "handbook:antoine-poling-2001"),  # deuterium
        ("75-19-4", "saturation_pressure", "handbook:wagner-mcgarry-1983"),  # cyclopropane
        ("75-19-4", "saturation_pressure", "handbook:wagner-vdi-2010"),
        ("75-01-4", "saturation_pressure", "handbook:wagner-mcgarry-1983"),  # vinyl chloride
        ("156-60-5", "saturation_pressure", "handbook:wagner-mcgarry-1983"),  # R1130(E)
        ("57-55-6", "saturation_pressure", "handbook:dippr101-perry-2008"),  # propylene glycol
        ("355-25-9", "saturation_pressure", "handbook:antoine-landolt-boernstein-20"),  # perfluorobutane
        ("421-14-7", "saturation_pressure", "handbook:antoine-landolt-boernstein-20"),  # HFE-143m
        ("301-00-8", "saturation_pressure", "handbook:antoine-landolt-boernstein-20"),  # methyl linolenate
        ("74-82-8", "saturation_pressure", "handbook:antoine-landolt-boernstein-20"),  # methane: Poling's constants
    ]:
        assert source not in {c.source for c in handbook.correlations(cas, name)}
        assert source in {c.source for c in handbook.correlations(cas, name, include_excluded=True)}
    for cas, name in [("354-33-6", "enthalpy_of_vaporization"), ("287-92-3", "vapor_density")]:
        assert not handbook.tables(cas, name)  # R125, cyclopentane
        assert handbook.tables(cas, name, include_excluded=True)


def test_spin_isomers_do_not_mix() -> None:
    # 20.271 K is the boiling point of parahydrogen; normal hydrogen boils at 20.369 K (NIST WebBook)
    assert not handbook.tables("1333-74-0", "boiling_temperature")
    for c in handbook.correlations("1333-74-0", "saturation_pressure"):
        assert c.temperature_at(101325.0) == pytest.approx(20.369, abs=0.06), c.source


# ---------------------------------------------------------------- ranges


@pytest.mark.parametrize("c", ALL, ids=lambda c: f"{c.component}-{c.source}")
def test_both_ends_count_and_nothing_beyond(c: Correlation) -> None:
    below, above = math.nextafter(c.from_K, 0.0), math.nextafter(c.to_K, math.inf)
    values = c([below, c.from_K, 0.5 * (c.from_K + c.to_K), c.to_K, above])
    assert np.isnan(values).tolist() == [True, False, False, False, True]
    # vapour pressure rises, liquid density and enthalpy of vaporization fall, all stay positive below T_c
    inner = c(np.linspace(c.from_K, c.to_K, 200))
    steps = np.diff(inner)
    assert (steps > 0).all() if c.property == "saturation_pressure" else (steps < 0).all()
    assert (inner[:-1] > 0.0).all()


def test_shapes_are_kept() -> None:
    c = handbook.correlations("74-82-8", "saturation_pressure")[0]
    assert c(100.0).shape == ()
    assert c(np.full((2, 3), 100.0)).shape == (2, 3)
    assert c.slope(np.full((2, 3), 100.0)).shape == (2, 3)
    assert np.isnan(c(np.nan))
    assert math.isnan(c.temperature_at(1e9))


def test_slope_is_refused_where_there_is_none() -> None:
    c = handbook.correlations("74-82-8", "liquid_density")[0]
    with pytest.raises(InputError, match="only vapour pressures"):
        c.slope(100.0)


def test_tables_are_in_order_and_cannot_be_changed() -> None:
    table = handbook.tables("74-82-8", "liquid_density")[0]
    assert (np.diff(table.temperature) > 0.0).all()
    assert np.isnan(table.pressure).all()
    with pytest.raises(ValueError, match="read-only"):
        table.values[0] = 1.0


def test_boiling_points_are_states_given_by_pressure() -> None:
    (table,) = handbook.tables("74-82-8", "boiling_temperature")
    assert table.source == "handbook:crc-95"
    assert table.pressure.tolist() == [101325.0]
    assert table.values.tolist() == table.temperature.tolist() == [111.65]


# ---------------------------------------------------------------- plausibility


@pytest.mark.parametrize(
    "cas",
    [
        *("74-82-8", "74-84-0", "74-98-6", "106-97-8", "110-54-3", "124-18-5"),  # n-alkanes, 1 to 10
        *("71-43-2", "108-88-3", "67-64-1", "64-17-5", "67-56-1"),  # benzene, toluene, acetone, alcohols
        *("7727-37-9", "7440-37-1", "7732-18-5", "7664-41-7"),  # nitrogen, argon, water, ammonia
        *("811-97-2", "75-45-6"),  # R134a, R22
    ],
)
def test_correlations_give_one_atmosphere_at_the_normal_boiling_point(cas: str) -> None:
    # 1.1 %: the CRC Handbook prints some boiling points to 0.1 K only, up to 0.5 % in pressure, and the
    # Antoine row of R22 lies 1.0 % off
    (boiling,) = handbook.tables(cas, "boiling_temperature")
    found = [c(boiling.values)[0] for c in handbook.correlations(cas, "saturation_pressure")]
    found = [p for p in found if not math.isnan(p)]
    assert found
    np.testing.assert_allclose(found, 101325.0, rtol=0.011)


@cache
def library_names() -> dict[str, str]:
    from CoolProp import CoolProp

    names = CoolProp.get_global_param_string("FluidsList").split(",")
    return {json.loads(CoolProp.get_fluid_param_string(n, "JSON"))[0]["INFO"]["CAS"]: n for n in names}


def library(cas: str, name: str, temperature: Floats) -> Floats:
    from CoolProp import CoolProp

    state = CoolProp.AbstractState("HEOS", library_names()[cas])
    lowest = max(state.Tmin(), state.Ttriple())

    def one(T: float) -> float:
        if not lowest <= T < state.T_critical():
            return math.nan
        state.update(CoolProp.QT_INPUTS, 1.0, T)
        vapor, enthalpy = state.rhomolar(), state.hmolar()
        state.update(CoolProp.QT_INPUTS, 0.0, T)
        given: dict[str, Any] = {
            "saturation_pressure": state.p(),
            "liquid_density": state.rhomolar(),
            "vapor_density": vapor,
            "enthalpy_of_vaporization": enthalpy - state.hmolar(),
        }
        return float(given[name])

    return np.array([one(float(T)) for T in temperature])


# (property, source) -> median and p90 of |deviation| from the library, %, measured with CoolProp 8.0.0 over
# each table's whole ranges when it was taken over, and rounded up. Ours are the rows not excluded, from
# 0.45 T_c, so they must not lie above.
BANDS = {
    ("saturation_pressure", "handbook:wagner-mcgarry-1983"): (0.17, 1.4),
    ("saturation_pressure", "handbook:wagner-poling-2001"): (0.115, 1.2),
    ("saturation_pressure", "handbook:antoine-poling-2001"): (0.22, 1.4),
    ("saturation_pressure", "handbook:extended-antoine-poling-2001"): (0.16, 0.55),
    ("saturation_pressure", "handbook:dippr101-perry-2008"): (0.35, 2.9),
    ("saturation_pressure", "handbook:wagner-vdi-2010"): (0.07, 1.5),
    ("saturation_pressure", "handbook:antoine-landolt-boernstein-20"): (0.26, 3.3),
    # single values, printed to 0.01 kJ/mol at best; measured when they were taken over: 0.17 and 1.3 %
    ("enthalpy_of_vaporization", "handbook:crc-95"): (0.2, 1.5),
    ("liquid_density", "handbook:dippr105-perry-2008"): (0.21, 1.4),
    ("liquid_density", "handbook:dippr116-vdi-2010"): (0.08, 0.8),
    ("enthalpy_of_vaporization", "handbook:dippr106-perry-2008"): (0.84, 5.0),
    ("enthalpy_of_vaporization", "handbook:ppds12-vdi-2010"): (0.11, 2.6),
    ("saturation_pressure", "handbook:vdi-2010"): (0.04, 2.0),
    ("liquid_density", "handbook:vdi-2010"): (0.02, 2.0),
    ("vapor_density", "handbook:vdi-2010"): (0.07, 2.0),
    ("enthalpy_of_vaporization", "handbook:vdi-2010"): (0.06, 2.0),
    # read to all printed digits, and the library is the same formulation: it checks the reading, not the truth
    ("saturation_pressure", "handbook:iapws-r6-95"): (2e-7, 2e-7),
    ("liquid_density", "handbook:iapws-r6-95"): (2e-7, 2e-7),
    ("vapor_density", "handbook:iapws-r6-95"): (4e-7, 4e-7),
    ("enthalpy_of_vaporization", "handbook:iapws-r6-95"): (5e-7, 5e-7),
    # an older equation, rounded to six digits; its heat is a difference of values printed to 0.1 kJ/kg
    ("saturation_pressure", "handbook:iapws-sr1-86"): (5e-4, 5e-4),
    ("liquid_density", "handbook:iapws-sr1-86"): (5e-4, 5e-4),
    ("vapor_density", "handbook:iapws-sr1-86"): (0.013, 0.013),
    ("enthalpy_of_vaporization", "handbook:iapws-sr1-86"): (0.02, 0.02),
}


def sampled(c: Correlation) -> Floats:
    state_window = {"enthalpy_of_vaporization": 0.95}.get(c.property, 0.99)
    critical = critical_temperature(c.cas)
    return np.linspace(max(c.from_K, 0.45 * critical), min(c.to_K, state_window * critical), 9)


@cache
def critical_temperature(cas: str) -> float:
    from CoolProp import CoolProp

    return float(CoolProp.PropsSI("Tcrit", library_names()[cas]))


def deviations(property_name: str, source: str) -> Floats:
    found = [
        100.0 * (c(T) / library(c.cas, c.property, T) - 1.0)
        for c in ALL
        if (c.property, c.source) == (property_name, source) and not c.excluded
        for T in [sampled(c)]
    ]
    found += [
        100.0 * (t.values / library(cas, t.property, t.temperature) - 1.0)
        for cas in {r["cas"] for file in ("saturation_tables.csv", "heats_of_vaporization.csv") for r in rows(file)}
        for t in handbook.tables(cas, property_name)
        if t.source == source
    ]
    joined = np.abs(np.concatenate(found))
    return joined[np.isfinite(joined)]


def test_every_source_has_its_band() -> None:
    kept = {(c.property, c.source) for c in handbook.counts() if c.property != "boiling_temperature"}
    assert kept == set(BANDS)


@pytest.mark.parametrize(("key", "band"), BANDS.items(), ids=lambda k: "-".join(map(str, k)))
def test_tables_lie_as_near_the_library_as_when_taken_over(key: tuple[str, str], band: tuple[float, float]) -> None:
    found = deviations(*key)
    assert found.size
    assert np.median(found) <= band[0]
    assert np.percentile(found, 90) <= band[1]


# ---------------------------------------------------------------- bad tables, start-up


@pytest.fixture
def damaged(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Callable[[str, str, str], None]]:
    """Copy the tables, replace one piece of text in one, and read the copies."""
    (tmp_path / "handbook").mkdir()
    for file in FILES:
        text = (references_folder() / "handbook" / file).read_text(encoding="utf-8")
        (tmp_path / "handbook" / file).write_text(text, encoding="utf-8")

    def damage(file: str, old: str, new: str) -> None:
        path = tmp_path / "handbook" / file
        text = path.read_text(encoding="utf-8")
        assert old in text
        path.write_text(text.replace(old, new, 1), encoding="utf-8")

    def forget() -> None:
        handbook._correlations.cache_clear()
        handbook._tables.cache_clear()

    monkeypatch.setattr(reading, "references_folder", lambda: tmp_path)
    forget()
    yield damage
    forget()


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        (",mcgarry-1983,", ",,", r"vapor_pressure.csv, line 2: no source"),
        ("wagner_3_6", "wagner_36", r"line 2: form 'wagner_36' is unknown; nearest: wagner_3_6"),
        (",170.0,", ",cold,", r"line 2: from_K is 'cold'; write a finite number"),
        (",170.0,", ",inf,", r"line 2: from_K is 'inf'"),
        (",mcgarry-1983,no,", ",mcgarry-1983,maybe,", r"line 2: excluded is 'maybe'; write yes or no"),
        (",mcgarry-1983,no,", ",mcgarry-1983,no", r"line 2: 19 cells, but the header names 20"),
    ],
)
def test_a_damaged_row_is_named(damaged: Callable[[str, str, str], None], old: str, new: str, message: str) -> None:
    damaged("vapor_pressure.csv", old, new)
    with pytest.raises(InputError, match=message):
        handbook.correlations("74-82-8", "saturation_pressure")


def test_reading_needs_no_heavy_library() -> None:
    code = (
        "import sys; from eosmuster.sources import bibliography, handbook; "
        "handbook.counts(); bibliography.bibliography(); "
        "print(sorted({'CoolProp', 'pandas', 'scipy', 'chemicals'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
