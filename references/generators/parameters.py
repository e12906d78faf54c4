"""Write the tables of references/parameters again.

Usage: python references/generators/parameters.py   (in an environment with eosmuster and chemicals)
"""

from __future__ import annotations

import csv
from collections.abc import Iterable, Mapping
from pathlib import Path

from eosmuster.components import Component, catalogue, family, find

FOLDER = Path(__file__).resolve().parents[1] / "parameters"

TRANSCRIPTION = "read in a transcription that cites the paper"
NAME_MATCHED = TRANSCRIPTION + ", as an ordered list without names; matched to names by refitting"
MEMORY = "from memory"

STRYJEK_VERA = "stryjek-vera-1986"
# kappa1 of substances that are catalogued; HCl is left out on purpose, see README.md beside the table
KAPPA1_NAMED = {"Nitrogen": 0.01996, "n-Hexane": 0.05104, "n-Dodecane": 0.05426}
KAPPA1_MATCHED = {
    "Oxygen": 0.01512,
    "CarbonDioxide": 0.04285,
    "Ammonia": 0.00100,
    "Water": -0.06635,
    "Methane": -0.00159,
    "Ethane": 0.02669,
    "n-Propane": 0.03136,
    "n-Butane": 0.03443,
    "n-Pentane": 0.03946,
    "n-Heptane": 0.04648,
    "n-Octane": 0.04464,
    "n-Nonane": 0.04104,
    "n-Decane": 0.04510,
    "n-Undecane": 0.02919,
    "Ethylene": 0.04191,
    "Neopentane": 0.04303,
    "CycloHexane": 0.07023,
    "Benzene": 0.07019,
    "Toluene": 0.03849,
    "EthylBenzene": 0.03994,
}
KAPPA1_REMEMBERED = {"Methanol": -0.16816, "Ethanol": -0.03374, "Acetone": -0.00888}

JHAVERI_YOUNGREN = "jhaveri-youngren-1988"
WHITSON_BRULE = "whitson-brule-2000"
SHIFTS = {
    "Nitrogen": -0.1927,
    "CarbonDioxide": -0.0817,
    "Methane": -0.1595,
    "Ethane": -0.1134,
    "n-Propane": -0.0863,
    "n-Butane": -0.0675,
    "n-Pentane": -0.0390,
    "n-Hexane": -0.0080,
    "n-Octane": 0.0314,
    "n-Decane": 0.0655,
}
# family -> (d, e) of s = 1 - d/M^e, M in g/mol
SHIFT_FORMULA = {
    "n-alkane": (2.258, 0.1823),
    "branched alkane": (2.258, 0.1823),
    "cycloalkane": (3.004, 0.2324),
    "aromatic": (2.516, 0.2008),
}
SHIFT_LEFT_OUT = {"CycloPropane"}

BELL = "bell-2018"
# shares its InChIKey with normal hydrogen, whose row is used
BELL_SKIPPED = {"para-hydrogen"}


def main() -> None:
    """Write the three tables."""
    write("prsv_kappa1.csv", "name cas kappa1 source status", kappa1_rows())
    write("jhaveri_youngren.csv", "name cas shift how source status", shift_rows())
    columns = "name cas inchikey critical_temperature_K critical_pressure_Pa L M N source status"
    write("twu91_bell2018.csv", columns, twu_rows())


def write(file_name: str, columns: str, rows: Iterable[Mapping[str, str]]) -> None:
    """Write rows in the order of the catalogue."""
    order = list(catalogue())
    with (FOLDER / file_name).open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, columns.split(), lineterminator="\n")
        writer.writeheader()
        writer.writerows(sorted(rows, key=lambda row: order.index(row["name"])))


def named(component: Component) -> dict[str, str]:
    """Give the columns that say which substance a row is about."""
    return {"name": component.name, "cas": component.cas}


def kappa1_rows() -> list[dict[str, str]]:
    """Give the rows of the Stryjek-Vera table."""
    parts = ((KAPPA1_NAMED, TRANSCRIPTION), (KAPPA1_MATCHED, NAME_MATCHED), (KAPPA1_REMEMBERED, MEMORY))
    return [
        named(find(name)) | {"kappa1": f"{value:.5f}", "source": STRYJEK_VERA, "status": status}
        for values, status in parts
        for name, value in values.items()
    ]


def shift_rows() -> list[dict[str, str]]:
    """Give the rows of the Jhaveri-Youngren table: listed shifts, then those of the family formulas."""
    listed = [
        named(find(name)) | {"shift": f"{value:.4f}", "how": "listed", "source": WHITSON_BRULE, "status": MEMORY}
        for name, value in SHIFTS.items()
    ]
    return listed + [
        named(c) | {"shift": f"{shift(c):.4f}", "how": formula(c), "source": JHAVERI_YOUNGREN, "status": MEMORY}
        for name in SHIFT_FORMULA
        for c in family(name)
        if c.name not in SHIFTS and c.name not in SHIFT_LEFT_OUT
    ]


def shift(component: Component) -> float:
    """Give s = c/b by the formula of the component's family."""
    if component.molar_mass is None:
        raise ValueError(component.name)
    d, e = SHIFT_FORMULA[component.family]
    return float(1.0 - d / (1000.0 * component.molar_mass) ** e)


def formula(component: Component) -> str:
    """Say how a shift was obtained."""
    d, e = SHIFT_FORMULA[component.family]
    return f"1 - {d}/M^{e} with M = {1000.0 * (component.molar_mass or 0.0):.6g} g/mol"


def twu_rows() -> list[dict[str, str]]:
    """Give the rows of the consistent Twu parameters, joined by InChIKey; numbers are kept as printed."""
    by_key = {c.inchikey: c for c in catalogue().values() if c.inchikey and c.cas}
    return [
        named(c)
        | {
            "inchikey": c.inchikey,
            "critical_temperature_K": row["Tc"],
            "critical_pressure_Pa": row["Pc"],
            "L": row["c0"],
            "M": row["c1"],
            "N": row["c2"],
            "source": BELL,
            "status": "transcribed through the chemicals package",
        }
        for row in bell_2018()
        if (c := by_key.get(row["inchikey"])) and row["name"] not in BELL_SKIPPED
    ]


def bell_2018() -> list[dict[str, str]]:
    """Read the table the chemicals package carries."""
    import chemicals

    path = Path(chemicals.__file__).parent / "Phase Change" / "Bell 2018 je7b00967_si_001.tsv"
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file, delimiter="\t"))


if __name__ == "__main__":
    main()
