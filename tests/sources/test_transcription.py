"""Every number transcribed through the `chemicals` package equals what that package holds.

The mapping below is written a second time on purpose: the generator has its own, and a slip in one of the
two shows here. Comparison is exact where a number is carried over, to rounding where it is converted.
"""

from __future__ import annotations

import csv
import importlib
import math
from typing import Any

import pytest
from chemicals import miscdata, phase_change, vapor_pressure, volume

from eosmuster.paths import references_folder

Rows = list[dict[str, str]]

# (file, form, source) -> table and column pairs: ours, theirs
WAGNER = [("A", "A"), ("B", "B"), ("C", "C"), ("D", "D"), ("T_c_K", "Tc"), ("p_c_Pa", "Pc")]
C_NUMBERS = [("A", "C1"), ("B", "C2"), ("C", "C3"), ("D", "C4")]
PRINTED_RANGE = [("from_K", "Tmin"), ("to_K", "Tmax")]
EXTENDED = [("A", "A"), ("B", "B"), ("C", "C"), ("n", "n"), ("E", "E"), ("F", "F")]
COLUMNS: dict[tuple[str, str, str], tuple[Any, str, list[tuple[str, str]]]] = {
    ("vapor_pressure", "wagner_3_6", "mcgarry-1983"): (
        vapor_pressure,
        "Psat_data_WagnerMcGarry",
        [*WAGNER, ("from_K", "Tmin"), ("to_K", "Tc")],
    ),
    ("vapor_pressure", "wagner_25_5", "poling-2001"): (
        vapor_pressure,
        "Psat_data_WagnerPoling",
        [*WAGNER, *PRINTED_RANGE],
    ),
    ("vapor_pressure", "antoine", "poling-2001"): (
        vapor_pressure,
        "Psat_data_AntoinePoling",
        [("A", "A"), ("B", "B"), ("C", "C"), *PRINTED_RANGE],
    ),
    ("vapor_pressure", "antoine_extended", "poling-2001"): (
        vapor_pressure,
        "Psat_data_AntoineExtended",
        [*EXTENDED, ("t_0_degC", "to"), ("T_c_K", "Tc"), *PRINTED_RANGE],
    ),
    ("vapor_pressure", "dippr_101", "perry-2008"): (
        vapor_pressure,
        "Psat_data_Perrys2_8",
        [*C_NUMBERS, ("E", "C5"), *PRINTED_RANGE],
    ),
    ("vapor_pressure", "antoine_e", "landolt-boernstein-20"): (
        vapor_pressure,
        "Psat_data_Landolt_Antoine",
        [("A", "A"), ("B", "B"), ("C", "C"), *PRINTED_RANGE],
    ),
    ("vapor_pressure", "wagner_25_5", "vdi-2010"): (
        vapor_pressure,
        "Psat_data_VDI_PPDS_3",
        [*WAGNER, ("from_K", "Tm"), ("to_K", "Tc")],
    ),
    ("liquid_density", "dippr_105", "perry-2008"): (
        volume,
        "rho_data_Perry_8E_105_l",
        [*C_NUMBERS, *PRINTED_RANGE],
    ),
    ("liquid_density", "dippr_116", "vdi-2010"): (
        volume,
        "rho_data_VDI_PPDS_2",
        [*WAGNER[:5], ("rho_c_kg_per_m3", "rhoc"), ("M_g_per_mol", "MW"), ("to_K", "Tc")],
    ),
    ("enthalpy_of_vaporization", "dippr_106", "perry-2008"): (
        phase_change,
        "phase_change_data_Perrys2_150",
        [*C_NUMBERS, ("T_c_K", "Tc"), *PRINTED_RANGE],
    ),
    ("enthalpy_of_vaporization", "ppds_12", "vdi-2010"): (
        phase_change,
        "phase_change_data_VDI_PPDS_4",
        [*WAGNER[:4], ("E", "E"), ("T_c_K", "Tc"), ("to_K", "Tc")],
    ),
}
COEFFICIENT_COLUMNS = {"A", "B", "C", "D", "E", "F", "n", "T_c_K", "p_c_Pa", "t_0_degC"}
FILES = ("vapor_pressure", "liquid_density", "enthalpy_of_vaporization")
SATURATION = {
    "saturation_pressure": "P",
    "liquid_density": "Density (l)",
    "vapor_density": "Density (g)",
    "enthalpy_of_vaporization": "Hvap",
}


def rows(file: str) -> Rows:
    with (references_folder() / "handbook" / f"{file}.csv").open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


def test_every_row_belongs_to_a_known_transcription() -> None:
    found = {(file, r["form"], r["source"]) for file in FILES for r in rows(file)}
    assert found == set(COLUMNS)


@pytest.mark.parametrize("key", COLUMNS, ids="-".join)
def test_coefficients_and_ranges(key: tuple[str, str, str]) -> None:
    file, form, source = key
    module, attribute, pairs = COLUMNS[key]
    table = getattr(module, attribute)
    mine = [r for r in rows(file) if (r["form"], r["source"]) == (form, source)]
    for r in mine:
        theirs = table.loc[r["cas"]]
        assert {ours: float(r[ours]) for ours, _ in pairs} == {o: float(theirs[t]) for o, t in pairs}, r
        # nothing may stand in a column that no formula reads
        assert all(not r[c] for c in COEFFICIENT_COLUMNS & set(r) - {ours for ours, _ in pairs}), r
    assert len(mine) == len({r["cas"] for r in mine})


@pytest.mark.parametrize("form", ["dippr_116", "ppds_12"])
def test_vdi_ranges_start_at_the_melting_temperature(form: str) -> None:
    melting = vapor_pressure.Psat_data_VDI_PPDS_3["Tm"]
    mine = [r for file in FILES for r in rows(file) if r["form"] == form]
    assert mine
    assert {r["cas"]: float(r["from_K"]) for r in mine} == {r["cas"]: melting[r["cas"]] for r in mine}


def test_normal_boiling_points() -> None:
    organic, inorganic = miscdata.CRC_organic_data["Tb"].dropna(), miscdata.CRC_inorganic_data["Tb"].dropna()
    for r in rows("normal_boiling_points"):
        printed = organic if r["cas"] in organic.index else inorganic
        assert float(r["temperature_K"]) == printed[r["cas"]], r
        assert r["pressure_Pa"] == "101325"
        # printed in degC; 1e-6 K: the conversion is exact to the digits of either
        assert r["printed_unit"] == "degC"
        assert float(r["printed_value"]) + 273.15 == pytest.approx(printed[r["cas"]], abs=1e-6)


def test_single_heats_of_vaporization() -> None:
    table = phase_change.Hvap_data_CRC
    mine = rows("heats_of_vaporization")
    assert len(mine) > 100
    for r in mine:
        theirs = table.loc[r["cas"]]
        at_boiling = "boiling" in r["note"]
        assert float(r["value"]) == theirs["HvapTb" if at_boiling else "Hvap298"], r
        assert float(r["temperature_K"]) == (theirs["Tb"] if at_boiling else 298.15), r
        assert float(r["printed_value"]) * 1e3 == pytest.approx(float(r["value"]), rel=1e-14)
        assert r["printed_unit"] == "kJ/mol"


def test_a_single_temperature_is_no_range() -> None:
    # Landolt-Boernstein gives R236fa and R245ca constants for one temperature each
    table = vapor_pressure.Psat_data_Landolt_Antoine
    left_out = {cas for cas in ("690-39-1", "679-86-7") if table.loc[cas]["Tmin"] == table.loc[cas]["Tmax"]}
    assert left_out == {"690-39-1", "679-86-7"}
    assert not [r for r in rows("vapor_pressure") if r["cas"] in left_out]


def test_repeated_constants_are_recognised() -> None:
    # independent of how the generator finds them: the constants themselves, to the digits Poling prints
    poling = vapor_pressure.Psat_data_AntoinePoling
    checked = 0
    for r in rows("vapor_pressure"):
        if r["form"] == "antoine_e" and r["cas"] in poling.index:
            theirs = poling.loc[r["cas"]]
            decimal = (float(r["A"]) / math.log(10.0), float(r["B"]) / math.log(10.0), float(r["C"]))
            near = (decimal[0], decimal[1], decimal[2]) == (
                pytest.approx(theirs["A"], abs=6e-4),
                pytest.approx(theirs["B"], abs=0.15),
                pytest.approx(theirs["C"], abs=6e-3),
            )
            assert ("repeats" in r["note"]) == near, r
            assert r["excluded"] == "yes" if near else True
            checked += near
    assert checked > 50


def test_sublimation_points_have_no_row() -> None:
    # the CRC tables print a sublimation point for these two; the transcription leaves the cell blank
    assert not {"124-38-9", "2551-62-4"} & {r["cas"] for r in rows("normal_boiling_points")}


def test_saturation_tables() -> None:
    vdi: dict[str, Any] = miscdata.VDI_saturation_dict
    mine = [r for r in rows("saturation_tables") if r["source"] == "vdi-2010"]
    assert len(mine) > 1000
    for r in mine:
        table = vdi[r["cas"]]
        carried = table[SATURATION[r["property"]]][table["T"].index(float(r["temperature_K"]))]
        printed = float(r["printed_value"])
        # molar enthalpies are carried over from the printed kJ/kg with the molar mass carried beside them
        expected = carried / table["MW"] if r["property"] == "enthalpy_of_vaporization" else carried
        assert printed == pytest.approx(expected, rel=1e-9), r


def test_saturation_values_are_the_printed_ones_converted() -> None:
    for r in rows("saturation_tables"):
        printed, M = float(r["printed_value"]), float(r["M_g_per_mol"] or "nan")
        factor = {"Pa": 1.0, "MPa": 1e6, "kg/m3": 1e3 / M, "kJ/kg": M}[r["printed_unit"]]
        assert float(r["value"]) == pytest.approx(printed * factor, rel=1e-14), r


def test_molar_masses_are_those_carried_beside_the_tables() -> None:
    vdi: dict[str, Any] = miscdata.VDI_saturation_dict
    wrong = set()
    for r in rows("saturation_tables"):
        if r["source"] == "vdi-2010" and r["M_g_per_mol"] and float(r["M_g_per_mol"]) != vdi[r["cas"]]["MW"]:
            wrong.add(r["component"])
    assert wrong == {"R125"}  # 182.564 g/mol there, against C2HF5 = 120.02


def test_the_generator_writes_the_committed_tables(monkeypatch: pytest.MonkeyPatch) -> None:
    import CoolProp

    monkeypatch.syspath_prepend(str(references_folder() / "generators"))
    generated = importlib.import_module("handbook").tables()
    # the notes hold measured percentages, and what is excluded follows from them: another version of the
    # library may measure otherwise, and the last digit of a note is the platform's
    measured = {"note"} if CoolProp.__version__ == "8.0.0" else {"note", "excluded"}
    for file, cells in generated.items():
        committed = rows(file.removesuffix(".csv"))
        assert len(cells) == len(committed), file
        for new, old in zip(cells, committed, strict=True):
            assert {k: v for k, v in new.items() if k not in measured} == {
                k: v for k, v in old.items() if k not in measured
            }
