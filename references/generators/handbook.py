"""Write the tables of references/handbook again: transcribe, measure, flag.

Numbers come through the `chemicals` package (a test dependency), which transcribes the handbooks; IAPWS
water stands here itself. The reference library only measures: a row that contradicts it grossly is marked
excluded, with the evidence and what the other handbook rows say in its note. No number is corrected.

    python references/generators/handbook.py            write the tables
    python references/generators/handbook.py --counts   print what the tables hold
"""

from __future__ import annotations

import csv
import sys
from collections.abc import Iterable, Iterator
from dataclasses import dataclass, replace
from decimal import Decimal
from pathlib import Path
from typing import Any

import numpy as np
from chemicals import miscdata
from handbook_correlations import LEFT_OUT, Cells, correlation_rows
from handbook_evidence import (
    HEAT,
    LIQUID,
    PRESSURE,
    ROW_LIMIT,
    VAPOR,
    deviations,
    fluids,
    library,
    measure,
    within,
)
from handbook_points import boiling_rows, heat_rows

from eosmuster.sources import critical
from eosmuster.sources.handbook import CORRELATION_FILES, counts, coverage

HANDBOOK = Path(__file__).resolve().parents[1] / "handbook"
WRONG_MASS = {"R125"}
"""Where the transcription's molar mass is wrong, the component's own is used."""

WATER_MASS = 18.015268
READ, MEMORY = "read in transcriptions that cite the release", "from memory"
# T/K, source, p/MPa, saturated densities/(kg/m3), saturated enthalpies/(kJ/kg), how p is known
WATER = (
    (275.0, "iapws-r6-95", 0.698451167e-3, (999.887406, 0.00550664919), (7.75972202, 2504.28995), READ),
    (450.0, "iapws-r6-95", 0.932203564, (890.34125, 4.8120036), (749.161585, 2774.41078), READ),
    (625.0, "iapws-r6-95", 16.9082693, (567.090385, 118.29028), (1686.26976, 2550.71625), READ),
    (273.16, "iapws-sr1-86", 611.657e-6, (999.789, 0.00485426), (0.611786e-3, 2500.5), MEMORY),
    (373.1243, "iapws-sr1-86", 0.101325, (958.365, 0.597586), (419.05, 2675.7), MEMORY),
)


# ---------------------------------------------------------------- saturation tables


@dataclass(frozen=True)
class Value:
    """One tabulated value; `printed` in `printed_unit`, times `factor` is SI and molar."""

    cas: str
    gives: str
    T: float
    printed: float
    printed_unit: str
    molar_mass: float | None
    factor: float
    source: str
    note: str = ""
    excluded: bool = False

    @property
    def value(self) -> float:
        """Give it in SI, molar; in decimal, so that a printed number stays recognisable."""
        return float(Decimal(repr(self.printed)) * Decimal(repr(self.factor)))


def vdi_values() -> Iterator[Value]:
    """Give the VDI Heat Atlas values of the library's fluids, without the critical state and empty cells."""
    saturation: dict[str, Any] = miscdata.VDI_saturation_dict
    for cas, table in saturation.items():
        if cas not in fluids():
            continue
        fluid, carried_mass = library(fluids()[cas]), table["MW"]
        M = round(fluid.molar_mass, 6) if fluids()[cas] in WRONG_MASS else carried_mass
        units = {
            (PRESSURE, "P"): (1.0, "Pa", None, 1.0),
            (LIQUID, "Density (l)"): (1.0, "kg/m3", M, 1e3 / M),
            (VAPOR, "Density (g)"): (1.0, "kg/m3", M, 1e3 / M),
            (HEAT, "Hvap"): (carried_mass, "kJ/kg", M, M),
        }
        for i, kelvin in enumerate(table["T"]):
            if kelvin >= min(fluid.critical, table["Tc"]) or not table["Hvap"][i]:
                continue
            for (name, column), (mass, unit, molar_mass, factor) in units.items():
                if carried := table[column][i]:
                    printed = round(carried / mass, 6) if mass != 1.0 else carried
                    yield Value(cas, name, kelvin, printed, unit, molar_mass, factor, "vdi-2010")


def water_values() -> Iterator[Value]:
    """Give the IAPWS values of water."""
    M = WATER_MASS
    for T, source, pressure, densities, (liquid, vapor), known in WATER:
        same = "; the library's water is this formulation too" if source == "iapws-r6-95" else ""
        heat_note = f"h'' - h' = {vapor!r} - {liquid!r}, {MEMORY}{same}"
        printed = (
            (PRESSURE, pressure, "MPa", None, 1e6, known + same),
            (LIQUID, densities[0], "kg/m3", M, 1e3 / M, READ + same),
            (VAPOR, densities[1], "kg/m3", M, 1e3 / M, READ + same),
            (HEAT, round(vapor - liquid, 9), "kJ/kg", M, M, heat_note),
        )
        for name, value, unit, molar_mass, factor, note in printed:
            yield Value("7732-18-5", name, T, value, unit, molar_mass, factor, source, note)


def flagged(values: Iterable[Value]) -> Iterator[Value]:
    """Mark whole tables, then single values, that contradict the library grossly."""
    groups: dict[tuple[str, str, str], list[Value]] = {}
    for v in values:
        groups.setdefault((v.cas, v.gives, v.source), []).append(v)
    for (cas, name, _), group in groups.items():
        T = np.array([v.T for v in group])
        deviation = deviations(fluids()[cas], name, T, np.array([v.value for v in group]))
        found = measure(T, np.where(within(fluids()[cas], name, T), deviation, np.nan))
        whole = LEFT_OUT.get((name, fluids()[cas]), "")
        if not whole and found is not None and found.gross:
            whole = f"whole table: {found}"
        for v, d in zip(group, deviation, strict=True):
            alone = f"this value alone: {d:+.3g} % from CoolProp 8" if abs(d) > ROW_LIMIT else ""
            reason = whole or alone
            yield replace(v, excluded=bool(reason), note="; ".join(n for n in (v.note, reason) if n))


def saturation_rows() -> Iterator[Cells]:
    """Give the rows of the saturation tables, by component, property, source and temperature."""
    order = {PRESSURE: 0, LIQUID: 1, VAPOR: 2, HEAT: 3}
    values = [*flagged([*vdi_values(), *water_values()])]
    values.sort(key=lambda v: (fluids()[v.cas].casefold(), order[v.gives], v.source, v.T))
    for v in values:
        yield {
            "component": fluids()[v.cas],
            "cas": v.cas,
            "property": v.gives,
            "temperature_K": repr(v.T),
            "value": repr(v.value),
            "unit": {PRESSURE: "Pa", HEAT: "J/mol"}.get(v.gives, "mol/m3"),
            "printed_value": repr(v.printed),
            "printed_unit": v.printed_unit,
            "M_g_per_mol": "" if v.molar_mass is None else repr(v.molar_mass),
            "source": v.source,
            "note": v.note,
            "excluded": "yes" if v.excluded else "no",
        }


# ---------------------------------------------------------------- writing


def tables() -> dict[str, list[Cells]]:
    """Give every table, by file name."""
    correlations = {file: list(correlation_rows(name)) for name, file in CORRELATION_FILES.items()}
    return {
        "normal_boiling_points.csv": list(boiling_rows()),
        "saturation_tables.csv": list(saturation_rows()),
        "heats_of_vaporization.csv": list(heat_rows()),
        **correlations,
    }


def write() -> None:
    """Write every table."""
    HANDBOOK.mkdir(exist_ok=True)
    for file, rows in tables().items():
        with (HANDBOOK / file).open("w", encoding="utf-8", newline="") as stream:
            writer = csv.DictWriter(stream, list(rows[0]), lineterminator="\n")
            writer.writeheader()
            writer.writerows(rows)


def print_counts() -> None:
    """Print what the committed tables hold, as two Markdown tables."""
    print("| property | components with a correlation | with a tabulated value | with either |\n|---|---:|---:|---:|")
    for c in coverage():
        print(f"| {c.property} | {c.correlations} | {c.tables} | {c.either} |")
    print("\n| property | source | components | rows | excluded rows |\n|---|---|---:|---:|---:|")
    for n in (*counts(), *critical.counts()):
        print(f"| {n.property} | {n.source} | {n.components} | {n.rows} | {n.excluded} |")


if __name__ == "__main__":
    print_counts() if "--counts" in sys.argv[1:] else write()
