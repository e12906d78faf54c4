"""Transcribe the handbooks' correlations, measure them, and write their rows with the evidence."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from chemicals import miscdata, phase_change, vapor_pressure, volume
from handbook_evidence import (
    ATMOSPHERE,
    HEAT,
    ROW_LIMIT,
    Measured,
    deviations,
    fluids,
    library,
    measure,
    span_of,
)

from eosmuster.sources.correlations import FORMS
from eosmuster.sources.inversion import invert

Cells = dict[str, str]


@dataclass(frozen=True)
class Transcription:
    """One coefficient table: its form, source, where it is, its columns in the form's order, its range."""

    form: str
    source: str
    module: Any
    attribute: str
    columns: str
    unit: str
    range_basis: str = "printed"
    range_columns: tuple[str, str] = ("Tmin", "Tmax")

    def rows(self) -> Iterator[tuple[str, Any]]:
        """Give CAS and row; the VDI tables get the melting temperature of the VDI vapour pressure table."""
        table = getattr(self.module, self.attribute)
        if self.range_columns[0] == "Tm" and "Tm" not in table:
            table = table.join(vapor_pressure.Psat_data_VDI_PPDS_3[["Tm"]])
        for cas, row in table.iterrows():
            yield str(cas), row


_MCGARRY = ("lower end printed; upper end is the critical temperature beside it", ("Tmin", "Tc"))
_VDI = ("not in the transcription: melting and critical temperature of the same handbook", ("Tm", "Tc"))
_P, _H, _V = vapor_pressure, phase_change, volume
_WAGNER, _EXTENDED, _DENSITY = "A B C D Tc Pc", "A B C n E F to Tc", "A B C D Tc rhoc MW"
TRANSCRIPTIONS = (
    Transcription("wagner_3_6", "mcgarry-1983", _P, "Psat_data_WagnerMcGarry", _WAGNER, "Pa", *_MCGARRY),
    Transcription("wagner_25_5", "poling-2001", _P, "Psat_data_WagnerPoling", _WAGNER, "Pa"),
    Transcription("antoine", "poling-2001", _P, "Psat_data_AntoinePoling", "A B C", "Pa"),
    Transcription("antoine_extended", "poling-2001", _P, "Psat_data_AntoineExtended", _EXTENDED, "Pa"),
    Transcription("dippr_101", "perry-2008", _P, "Psat_data_Perrys2_8", "C1 C2 C3 C4 C5", "Pa"),
    Transcription("wagner_25_5", "vdi-2010", _P, "Psat_data_VDI_PPDS_3", _WAGNER, "Pa", *_VDI),
    Transcription("antoine_e", "landolt-boernstein-20", _P, "Psat_data_Landolt_Antoine", "A B C", "Pa"),
    Transcription("dippr_105", "perry-2008", _V, "rho_data_Perry_8E_105_l", "C1 C2 C3 C4", "mol/m3"),
    Transcription("dippr_116", "vdi-2010", _V, "rho_data_VDI_PPDS_2", _DENSITY, "kg/m3, over M", *_VDI),
    Transcription("dippr_106", "perry-2008", _H, "phase_change_data_Perrys2_150", "C1 C2 C3 C4 Tc", "J/mol"),
    Transcription("ppds_12", "vdi-2010", _H, "phase_change_data_VDI_PPDS_4", "A B C D E Tc", "J/mol", *_VDI),
)

LEFT_OUT = {
    ("antoine", "Hydrogen"): "follows parahydrogen within 1.3 %, not normal hydrogen",
    ("antoine", "SulfurHexafluoride"): "lies wholly below the triple point: a sublimation pressure",
    (
        "antoine_e",
        "n-Perfluorobutane",
    ): "C is -4087 K where other rows have -20 to -120 K: a decimal point seems lost, "
    "since with -40.87 K it would boil at 271.80 K, by the CRC Handbook at 271.05 K",
    ("antoine_e", "HFE143m"): "boils at 303.04 K, just beyond its range, by the CRC Handbook at 247.95 K: another "
    "substance's row, it seems",
    ("crc", "Hydrogen"): "the boiling point of parahydrogen; normal hydrogen boils at 20.369 K",
    (HEAT, "R125"): "the transcription carries M = 182.564 g/mol (R125: 120.021), so its molar enthalpies "
    "are 52 % too high; the printed kJ/kg, recovered by taking that M out again, agree with CoolProp 8, but "
    "stay out until read on the page",
}
"""What measuring alone cannot say: (form or table, component) -> why the row is left out."""

REPEATS = 0.05
"""%: a row that follows another form of the same equation this closely over its whole range repeats it: Poling's
Antoine constants, printed there with fewer digits at most."""


@dataclass(frozen=True)
class Candidate:
    """One transcribed correlation of one component."""

    origin: Transcription
    cas: str
    name: str
    coefficients: tuple[float, ...]
    span: tuple[float, float]

    @property
    def gives(self) -> str:
        """Name its property."""
        return FORMS[self.origin.form].property

    @property
    def key(self) -> str:
        """Name it as other rows' notes do."""
        return f"{FORMS[self.origin.form].label}-{self.origin.source}"

    @cache  # noqa: B019  (a script: nothing outlives it)
    def measured(self, lowest_reduced: float = 0.45) -> Measured | None:
        """Measure it on 41 temperatures of the range it shares with the library."""
        window = span_of(self.name, self.gives, lowest_reduced)
        low, high = max(self.span[0], window[0]), min(self.span[1], window[1])
        if low >= high:
            return None
        T = np.linspace(low, high, 41)
        values = FORMS[self.origin.form].value(T, self.coefficients)
        return measure(T, deviations(self.name, self.gives, T, values))

    def at(self, T: float) -> float:
        """Give its value at a temperature (K), or NaN outside its range."""
        if not self.span[0] <= T <= self.span[1]:
            return float("nan")
        return float(FORMS[self.origin.form].value(np.array(T), self.coefficients))

    def boils_at(self) -> float:
        """Give its own boiling point at one atmosphere, K, or NaN."""
        form = FORMS[self.origin.form]
        if form.log_slope is None:
            return float("nan")
        return float(invert(form, self.coefficients, np.array([ATMOSPHERE]), self.span)[0])

    def beside(self) -> list[Candidate]:
        """Give the other correlations of the same property and component that are evidence of their own."""
        same = (c for c in candidates() if (c.cas, c.gives) == (self.cas, self.gives))
        return [c for c in same if c.key != self.key and not c.repeated()]

    @cache  # noqa: B019
    def repeated(self) -> str:
        """Name the row whose constants this one repeats, or ""."""
        if self.origin.form != "antoine_e":
            return ""
        T = np.linspace(*self.span, 41)
        mine = FORMS["antoine_e"].value(T, self.coefficients)
        for c in (c for c in candidates() if c.cas == self.cas and c.origin.form == "antoine"):
            if float(np.max(np.abs(FORMS["antoine"].value(T, c.coefficients) / mine - 1.0))) <= REPEATS / 100.0:
                return c.key
        return ""

    def left_out(self) -> bool:
        """Tell whether it is excluded by default."""
        found = self.measured()
        told = (self.origin.form, self.name) in LEFT_OUT or self.repeated() != ""
        return told or (found is not None and found.gross)


@cache
def candidates() -> tuple[Candidate, ...]:
    """Transcribe every coefficient row of the library's fluids."""
    return tuple(
        Candidate(
            origin,
            cas,
            fluids()[cas],
            tuple(float(row[column]) for column in origin.columns.split()),
            (float(row[origin.range_columns[0]]), float(row[origin.range_columns[1]])),
        )
        for origin in TRANSCRIPTIONS
        for cas, row in origin.rows()
        # one temperature is no range: Landolt-Boernstein's rows of R236fa and R245ca
        if cas in fluids() and row[origin.range_columns[0]] < row[origin.range_columns[1]]
    )


def note_of(c: Candidate) -> str:
    """Write what a reader must know of a correlation: why it is out, or where it is weak."""
    found, everywhere = c.measured(), c.measured(0.0)
    if c.repeated():
        return f"repeats the constants of {c.repeated()}: no evidence of its own"
    if c.left_out():
        parts = [LEFT_OUT.get((c.origin.form, c.name), ""), *([] if found is None else evidence(c, found))]
        return "; ".join(part for part in parts if part)
    if everywhere is None:
        return f"not measured: lies outside the library's own limits (from {library(c.name).lowest:.2f} K)"
    if everywhere.largest > ROW_LIMIT:
        return f"at its worst {everywhere.largest:.2g} % from CoolProp 8, at {everywhere.at:.1f} K"
    return ""


def evidence(c: Candidate, found: Measured) -> list[str]:
    """Say what contradicts a row, and what the other handbook rows and the boiling points say."""
    others = [f"{o.key} {m.median:.2g}" for o in c.beside() if (m := o.measured()) is not None]
    parts = [str(found), f"medians beside it: {', '.join(others)} %" if others else "no other row beside it"]
    if np.isfinite(own := c.boils_at()):
        fluid, crc = library(c.name), boiling_points().get(c.cas)
        boils = fluid.boiling()
        limits = " (below its own limits)" if boils < fluid.lowest else ""
        printed = f", by the CRC Handbook at {crc[0]:g} K" if crc else ""
        parts.append(f"boils at {own:.2f} K by this row, by CoolProp at {boils:.2f} K{limits}{printed}")
    return parts


def correlation_rows(property_name: str) -> Iterator[Cells]:
    """Give the rows of one table of correlations, by component."""
    forms = [f for f in FORMS.values() if f.property == property_name]
    columns = list(dict.fromkeys(column for f in forms for column in f.columns))
    columns.sort(key=lambda column: (len(column) > 1, column.islower()))
    for c in sorted((c for c in candidates() if c.gives == property_name), key=lambda c: c.name.casefold()):
        given = dict(zip(FORMS[c.origin.form].columns, map(repr, c.coefficients), strict=True))
        yield {
            "component": c.name,
            "cas": c.cas,
            "form": c.origin.form,
            **{column: given.get(column, "") for column in columns},
            "unit": c.origin.unit,
            "from_K": repr(c.span[0]),
            "to_K": repr(c.span[1]),
            "range_basis": c.origin.range_basis,
            "source": c.origin.source,
            "excluded": "yes" if c.left_out() else "no",
            "note": note_of(c),
        }


@cache
def boiling_points() -> dict[str, tuple[float, str]]:
    """Give CAS -> normal boiling point, K, and a remark; sublimation points are blank in both tables."""
    organic, inorganic = miscdata.CRC_organic_data["Tb"].dropna(), miscdata.CRC_inorganic_data["Tb"].dropna()
    found = {str(cas): (float(T), "") for cas, T in inorganic.items()}
    for cas, T in organic.items():
        other = found.get(str(cas), (T, ""))[0]
        remark = "" if other == T else f"the inorganic table of the same edition prints {other:g} K"
        found[str(cas)] = (float(T), remark)
    return {cas: pair for cas, pair in found.items() if cas in fluids()}
