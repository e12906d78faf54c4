"""Transcribe single points of the CRC Handbook: normal boiling points, and enthalpies of vaporization."""

from __future__ import annotations

from collections.abc import Iterator
from statistics import median

import numpy as np
from chemicals import phase_change
from handbook_correlations import LEFT_OUT, Cells, boiling_points, candidates
from handbook_evidence import ATMOSPHERE, HEAT, PRESSURE, ROW_LIMIT, deviations, fluids, library

CONTESTED = 2.0
"""%: a boiling point further off is left out only if the cited correlations side with the library."""
CELSIUS_ZERO = 273.15
ROOM_TEMPERATURE = 298.15


def boiling_rows() -> Iterator[Cells]:
    """Give the rows of normal boiling points, by component."""
    for cas, (T, remark) in sorted(boiling_points().items(), key=lambda item: fluids()[item[0]].casefold()):
        excluded, reason = boiling_verdict(cas, T)
        yield {
            "component": fluids()[cas],
            "cas": cas,
            "temperature_K": repr(T),
            "pressure_Pa": "101325",
            "printed_value": repr(round(T - CELSIUS_ZERO, 6)),
            "printed_unit": "degC",
            "source": "crc-95",
            "note": "; ".join(part for part in (remark, reason) if part),
            "excluded": "yes" if excluded else "no",
        }


def boiling_verdict(cas: str, T: float) -> tuple[bool, str]:
    """Decide whether a boiling point is out, by the pressure the library and cited rows have there."""
    name = fluids()[cas]
    if ("crc", name) in LEFT_OUT:
        return True, LEFT_OUT["crc", name]
    size = off_atmosphere(float(library(name)(PRESSURE, np.array([T]))[0]))
    if not np.isfinite(size):
        return False, f"not measured: outside the library's own limits (from {library(name).lowest:.2f} K)"
    if abs(size) <= CONTESTED:
        return False, ""
    rows = [c for c in candidates() if c.cas == cas and c.gives == PRESSURE and not c.left_out()]
    cited = [p for p in (off_atmosphere(c.at(T)) for c in rows) if np.isfinite(p)]
    sides = bool(cited) and abs(middle := median(cited)) > CONTESTED and middle * size > 0.0
    said = f", the cited correlations {', '.join(f'{p:+.1f}' for p in cited)} %" if cited else ""
    reason = f"the pressure there is off 101325 Pa: CoolProp 8 has {size:+.1f} %{said}"
    return abs(size) > ROW_LIMIT or sides, reason


def off_atmosphere(pressure: float) -> float:
    """Give how far a pressure lies from one atmosphere, %."""
    return 100.0 * (pressure / ATMOSPHERE - 1.0)


def heat_points() -> Iterator[tuple[str, float, float, str]]:
    """Give CAS, temperature (K), enthalpy of vaporization (kJ/mol as printed) and a remark."""
    table = phase_change.Hvap_data_CRC
    for cas in sorted(set(fluids()) & set(table.index), key=lambda cas: fluids()[cas].casefold()):
        row = table.loc[cas]
        at_boiling = (float(row["Tb"]), float(row["HvapTb"]), "at the boiling point of the same row")
        for T, joules, remark in (at_boiling, (ROOM_TEMPERATURE, float(row["Hvap298"]), "")):
            if np.isfinite(T) and np.isfinite(joules):
                yield cas, T, round(joules / 1e3, 6), remark


def heat_rows() -> Iterator[Cells]:
    """Give the rows of single enthalpies of vaporization, by component."""
    for cas, T, printed, remark in heat_points():
        value = round(printed * 1e3, 6)
        size = float(deviations(fluids()[cas], HEAT, np.array([T]), np.array([value]))[0])
        excluded = abs(size) > ROW_LIMIT
        reason = f"{size:+.3g} % from CoolProp 8" if excluded else ""
        yield {
            "component": fluids()[cas],
            "cas": cas,
            "property": HEAT,
            "temperature_K": repr(T),
            "value": repr(value),
            "unit": "J/mol",
            "printed_value": repr(printed),
            "printed_unit": "kJ/mol",
            "source": "crc-95",
            "note": "; ".join(part for part in (remark, reason) if part),
            "excluded": "yes" if excluded else "no",
        }
