"""Write references/critical_constants/critical_constants.csv again: transcribe, compare, flag.

Numbers come through the `chemicals` package (a test dependency). A row is excluded if its critical temperature,
pressure or acentric factor is grossly off the reference library and more of the other witnesses side with the
library than with the row. Witnesses are the other rows here, and the critical constants printed beside the Wagner
coefficients of the vapour pressure tables, with the acentric factor these give. Where more witnesses side with the
row, it is the library that stands alone: the row stays, and its note says so.

    python references/generators/critical_constants.py
"""

from __future__ import annotations

import csv
import math
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

from chemicals import critical
from CoolProp import CoolProp
from handbook_correlations import Candidate, Cells, candidates
from handbook_evidence import fluids, library

from eosmuster.components import acentric_from_saturation, catalogue

TABLE = Path(__file__).resolve().parents[1] / "critical_constants" / "critical_constants.csv"
GROSS = {"Tc": 0.75, "pc": 5.0, "omega": 0.05}
"""% for the critical temperature and pressure, absolute for the acentric factor: further off is a contradiction.
Sound rows lie within 0.3 %, 2 % and 0.015."""
WEAK_VOLUME = 5.0
"""%: critical volumes are known to a few percent; one further off gets a note, but is no reason to exclude."""
TOLD = {
    ("iupac", "CycloHexane"): "holds the constants of methylcyclopentane, whose row in the same transcription holds "
    "those of cyclohexane (553.8 K, 4.08 MPa): the two were exchanged",
    ("iupac", "n-Decane"): "611.7 K where the others have 617.6 to 618.5 K: a 7 seems to have been read as a 1",
}
"""What comparing alone cannot say: (table, component) -> what the row seems to hold."""
WRONG_MASS = 0.5
"""%: a molar mass carried beside the row that is further off gets a note: it hints at another substance."""


@dataclass(frozen=True)
class Origin:
    """One table of the transcription: our name of it, where it is, and the note every row of it carries."""

    name: str
    attribute: str
    remark: str = ""

    def rows(self) -> Iterator[tuple[str, Any]]:
        """Give CAS number and row of the library's fluids."""
        for cas, row in getattr(critical, self.attribute).iterrows():
            if cas in fluids():
                yield str(cas), row


ORIGINS = (
    Origin("crc", "critical_data_CRC"),
    Origin("iupac", "critical_data_IUPAC"),
    Origin("mathews", "critical_data_Matthews"),
    Origin("passut-danner", "critical_data_PassutDanner", "converted by the transcription from degF and psia"),
)
CITATIONS = {"crc": "crc-95", "mathews": "mathews-1972", "passut-danner": "passut-danner-1973"}


@dataclass(frozen=True)
class Entry:
    """One transcribed row; values in SI, NaN where there is none."""

    origin: Origin
    cas: str
    row: Any

    @property
    def name(self) -> str:
        """Name the fluid."""
        return fluids()[self.cas]

    @property
    def citation(self) -> str:
        """Give the key of the bibliography; the IUPAC series is cited by its part."""
        if self.origin.name == "iupac":
            return f"iupac-critical-{int(self.row['Reference'])}"
        return CITATIONS[self.origin.name]

    def get(self, column: str) -> float:
        """Give a number of the row, or NaN."""
        return float(self.row[column]) if column in self.row.index else math.nan

    def values(self) -> dict[str, float]:
        """Give what is compared."""
        return {"Tc": self.get("Tc"), "pc": self.get("Pc"), "omega": self.get("omega")}


@cache
def entries() -> tuple[Entry, ...]:
    """Transcribe every row of the library's fluids."""
    return tuple(Entry(origin, cas, row) for origin in ORIGINS for cas, row in origin.rows())


@cache
def of_library(name: str) -> dict[str, float]:
    """Give the critical point of the library's equation, and the catalogue's acentric factor."""
    state = library(name).state
    return {
        "Tc": library(name).critical,
        "pc": float(state.keyed_output(CoolProp.iP_critical)),
        "omega": catalogue()[name].acentric_factor,
        "Vc": 1.0 / float(state.keyed_output(CoolProp.irhomolar_critical)),
    }


def witnesses(entry: Entry, constant: str) -> list[tuple[str, float]]:
    """Give what other sources print for a constant of the same fluid."""
    others = [(e.citation, e.values()[constant]) for e in entries() if e.cas == entry.cas and e is not entry]
    beside = (c for c in candidates() if c.cas == entry.cas and c.origin.form.startswith("wagner"))
    others += [(c.key, printed_beside(c)[constant]) for c in beside]
    return [(key, value) for key, value in others if math.isfinite(value)]


def printed_beside(wagner: Candidate) -> dict[str, float]:
    """Give the critical constants of a Wagner row, its coefficients C, D being followed by Tc and pc."""
    Tc, pc = wagner.coefficients[-2:]
    at_07 = wagner.at(0.7 * Tc)
    omega = acentric_from_saturation(at_07, pc) if math.isfinite(at_07) else math.nan
    return {"Tc": Tc, "pc": pc, "omega": omega}


def gap(constant: str, value: float, other: float) -> float:
    """Give how far a value lies from another: % or, for the acentric factor, absolute."""
    return value - other if constant == "omega" else 100.0 * (value / other - 1.0)


def findings(entry: Entry) -> Iterator[tuple[bool, str]]:
    """Give, for each constant that is grossly off, whether it speaks against the row, and what was found."""
    for constant, value in entry.values().items():
        known = of_library(entry.name)[constant]
        size = gap(constant, value, known)
        if not abs(size) > GROSS[constant]:
            continue
        heard = witnesses(entry, constant)
        library_side = [key for key, other in heard if abs(other - known) < abs(other - value)]
        row_side = [key for key, _ in heard if key not in library_side]
        unit = "" if constant == "omega" else " %"
        words = [f"{constant} {size:+.3g}{unit} from CoolProp 8"]
        words += [f"with it: {', '.join(library_side)}"] if library_side else []
        words += [f"with this row: {', '.join(row_side)}"] if row_side else []
        words += ["no other witness"] if not heard else []
        yield len(library_side) > len(row_side), ", ".join(words)


def remarks(entry: Entry) -> Iterator[str]:
    """Give what a reader must know beside that."""
    if entry.origin.remark:
        yield entry.origin.remark
    off = gap("Vc", entry.get("Vc"), of_library(entry.name)["Vc"])
    if abs(off) > WEAK_VOLUME:
        yield f"Vc {off:+.2g} % from CoolProp 8"
    mass = gap("MW", entry.get("MW"), library(entry.name).molar_mass)
    if abs(mass) > WRONG_MASS:
        yield f"the transcription carries M = {entry.get('MW'):g} g/mol beside it, {mass:+.2g} % off"


def cells(entry: Entry) -> Cells:
    """Write one row of the table."""
    found = list(findings(entry))
    told = TOLD.get((entry.origin.name, entry.name), "")
    notes = [told, *(words for _, words in found), *remarks(entry)]
    columns = {
        "critical_temperature_K": "Tc",
        "critical_temperature_error_K": "Tc_error",
        "critical_pressure_Pa": "Pc",
        "critical_pressure_error_Pa": "Pc_error",
        "critical_volume_m3_mol": "Vc",
        "critical_volume_error_m3_mol": "Vc_error",
        "acentric_factor": "omega",
    }
    numbers = {ours: entry.get(theirs) for ours, theirs in columns.items()}
    return {
        "component": entry.name,
        "cas": entry.cas,
        **{ours: repr(value) if math.isfinite(value) else "" for ours, value in numbers.items()},
        "source": entry.citation,
        "excluded": "yes" if told or any(against for against, _ in found) else "no",
        "note": "; ".join(note for note in notes if note),
    }


def constant_rows() -> list[Cells]:
    """Give every row, by component and in the order of the sources."""
    return [cells(entry) for entry in sorted(entries(), key=lambda e: e.name.casefold())]


def write() -> None:
    """Write the table."""
    rows = constant_rows()
    TABLE.parent.mkdir(exist_ok=True)
    with TABLE.open("w", encoding="utf-8", newline="") as stream:
        writer = csv.DictWriter(stream, list(rows[0]), lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)


if __name__ == "__main__":
    write()
