"""Write references/components.csv and references/equations.csv again from the records of CoolProp 8.

Usage: python references/generators/components.py   (in an environment with eosmuster)

Decisions made here, each once:

* Critical constants are the critical state stored in the fluid's record, i.e. the published one, not the
  numerical critical point of the equation.
* The acentric factor is the record's. It is checked against its definition with the equation's own
  psat(0.7 Tc): a difference above 0.005 is noted, one above 0.1 is a contradiction and the equation's own
  value replaces the stored one.
* The triple point is the record's. Where the equation's saturation curve starts less than 0.5 K beside it
  (rounding), the higher of the two is written, so that a state at the triple point can be answered.
* Blends and pseudo-pure fluids are listed with the reason they are left out.
* Ammonia counts as polar, not as associating: its hydrogen bonds are weak, its vapour is monomeric, and the
  acentric factor describes its vapour pressure about as well as that of an ether.
* Chlorinated monomers and solvents (vinyl chloride, dichloroethane) count as refrigerants, because the class
  means partly halogenated hydrocarbons and both bear refrigerant numbers.
"""

from __future__ import annotations

import csv
import json
import re
import unicodedata
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

import CoolProp
from CoolProp.CoolProp import QT_INPUTS, AbstractState, get_fluid_param_string, get_global_param_string

from eosmuster.components import acentric_from_saturation

HERE = Path(__file__).resolve().parents[1]

COLUMNS = [
    "name",
    "cas",
    "inchikey",
    "aliases",
    "family",
    "critical_temperature_K",
    "critical_pressure_Pa",
    "critical_density_mol_m3",
    "acentric_factor",
    "acentric_note",
    "molar_mass_kg_mol",
    "triple_temperature_K",
    "minimum_temperature_K",
    "maximum_temperature_K",
    "source",
    "note",
    "left_out",
]

FAMILIES: Mapping[str, str] = {
    "n-alkane": "Methane Ethane n-Propane n-Butane n-Pentane n-Hexane n-Heptane n-Octane n-Nonane n-Decane "
    "n-Undecane n-Dodecane",
    "branched alkane": "IsoButane Isopentane Isohexane Neopentane",
    "cycloalkane": "CycloPropane Cyclopentane CycloHexane",
    "alkene": "Ethylene Propylene 1-Butene IsoButene cis-2-Butene trans-2-Butene",
    "alkyne": "Propyne",
    "aromatic": "Benzene Toluene EthylBenzene o-Xylene m-Xylene p-Xylene",
    "refrigerant": "R11 R12 R13 R13I1 R21 R22 R23 R32 R40 R41 R113 R114 R115 R123 R124 R125 R134a R141b R142b "
    "R143a R152A R161 R227EA R236EA R236FA R245ca R245fa R365MFC R1123 R1130(E) R1132(E) R1224YDZ R1233zd(E) "
    "R1234yf R1234ze(E) R1234ze(Z) R1243zf R1336mzz(E) R1336mzz(Z) HFE143m Dichloroethane VinylChloride",
    "perfluorocarbon": "R14 R116 R218 RC318 n-Perfluorobutane n-Perfluoropentane n-Perfluorohexane Novec649",
    "siloxane": "MM MDM MD2M MD3M MD4M D4 D5 D6",
    "fatty acid ester": "MethylPalmitate MethylStearate MethylOleate MethylLinoleate MethylLinolenate",
    "polar": "Acetone Ammonia DiethylEther DimethylCarbonate DimethylEther EthyleneOxide Tetrahydrofuran",
    "associating": "Water HeavyWater Methanol Ethanol PropyleneGlycol",
    "quantum gas": "Helium Neon Hydrogen OrthoHydrogen ParaHydrogen Deuterium OrthoDeuterium ParaDeuterium",
    "noble gas": "Argon Krypton Xenon",
    "acid gas": "CarbonDioxide HydrogenSulfide SulfurDioxide CarbonylSulfide HydrogenChloride",
    "inorganic gas": "Nitrogen Oxygen Fluorine Chlorine CarbonMonoxide NitrousOxide SulfurHexafluoride",
}

LEFT_OUT: Mapping[str, str] = {
    "Air": "a mixture of nitrogen, oxygen and argon",
    "R404A": "a blend of R125, R143a and R134a",
    "R407C": "a blend of R32, R125 and R134a",
    "R410A": "a blend of R32 and R125",
    "R507A": "a blend of R125 and R143a",
    "SES36": "a blend of R365mfc and a perfluoropolyether",
}
WHY_LEFT_OUT = "it has no single saturation pressure at a temperature, and only pure components are judged"

# Everyday names the library does not list. Case, spaces and hyphens need no variants.
EXTRA_ALIASES: Mapping[str, str] = {
    "1-Butene": "but-1-ene|alpha-butylene",
    "Acetone": "propanone|2-propanone|dimethyl ketone",
    "Benzene": "C6H6|benzol",
    "CarbonDioxide": "CO2|carbonic anhydride",
    "cis-2-Butene": "cis-but-2-ene|(Z)-2-butene",
    "CycloHexane": "c-C6H12",
    "CycloPropane": "RC270|c-C3H6",
    "Cyclopentane": "c-C5H10",
    "Dichloroethane": "ethylene dichloride|EDC|R150|1,2-dichloroethane",
    "DiethylEther": "ethyl ether|ethoxyethane|R610",
    "DimethylEther": "methoxymethane|methyl ether",
    "Ethane": "C2H6",
    "Ethanol": "ethyl alcohol|C2H5OH",
    "Ethylene": "ethene|C2H4",
    "EthyleneOxide": "oxirane",
    "Fluorine": "F2",
    "HFE143m": "methyl trifluoromethyl ether",
    "HeavyWater": "deuterium oxide",
    "Helium": "helium-4",
    "Hydrogen": "normal hydrogen|n-hydrogen|n-H2",
    "HydrogenSulfide": "hydrogen sulphide|sulfane",
    "IsoButane": "2-methylpropane|methylpropane|i-butane|i-C4H10|iC4",
    "IsoButene": "2-methylpropene|isobutylene|methylpropene",
    "Isohexane": "2-methylpentane|i-hexane|i-C6H14",
    "Isopentane": "2-methylbutane|methylbutane|i-pentane|i-C5H12|iC5",
    "Krypton": "Kr|R784",
    "Methanol": "methyl alcohol|CH3OH|MeOH",
    "Neon": "Ne",
    "Neopentane": "2,2-dimethylpropane|dimethylpropane",
    "NitrousOxide": "R744A|dinitrogen monoxide|laughing gas",
    "Novec649": "dodecafluoro-2-methylpentan-3-one|FK-5-1-12|perfluoro-2-methyl-3-pentanone",
    "OrthoDeuterium": "o-deuterium|o-D2",
    "OrthoHydrogen": "o-hydrogen|o-H2",
    "ParaDeuterium": "p-deuterium|p-D2",
    "ParaHydrogen": "p-hydrogen|p-H2",
    "Propylene": "propene",
    "PropyleneGlycol": "propane-1,2-diol|monopropylene glycol|MPG",
    "Propyne": "methylacetylene",
    "R11": "CFC-11|trichlorofluoromethane|CCl3F",
    "R113": "CFC-113|1,1,2-trichlorotrifluoroethane",
    "R1130(E)": "trans-1,2-dichloroethylene",
    "R1132(E)": "trans-1,2-difluoroethylene",
    "R114": "CFC-114|1,2-dichlorotetrafluoroethane",
    "R115": "CFC-115|chloropentafluoroethane",
    "R116": "perfluoroethane|hexafluoroethane|C2F6",
    "R12": "CFC-12|dichlorodifluoromethane|CCl2F2",
    "R1224YDZ": "R1224yd(Z)|cis-1-chloro-2,3,3,3-tetrafluoropropene",
    "R123": "HCFC-123|2,2-dichloro-1,1,1-trifluoroethane",
    "R1234yf": "HFO-1234yf|2,3,3,3-tetrafluoropropene",
    "R1234ze(E)": "HFO-1234ze(E)|trans-1,3,3,3-tetrafluoropropene",
    "R1234ze(Z)": "HFO-1234ze(Z)|cis-1,3,3,3-tetrafluoropropene",
    "R1233zd(E)": "HCFO-1233zd(E)",
    "R124": "HCFC-124|1-chloro-1,2,2,2-tetrafluoroethane",
    "R1243zf": "3,3,3-trifluoropropene",
    "R125": "HFC-125|pentafluoroethane",
    "R13": "CFC-13|chlorotrifluoromethane|CClF3",
    "R134a": "HFC-134a|1,1,1,2-tetrafluoroethane",
    "R13I1": "trifluoroiodomethane",
    "R14": "carbon tetrafluoride|tetrafluoromethane|CF4|perfluoromethane",
    "R141b": "HCFC-141b|1,1-dichloro-1-fluoroethane",
    "R142b": "HCFC-142b|1-chloro-1,1-difluoroethane",
    "R143a": "HFC-143a|1,1,1-trifluoroethane",
    "R152A": "HFC-152a|1,1-difluoroethane",
    "R161": "ethyl fluoride|HFC-161",
    "R21": "HCFC-21|dichlorofluoromethane|CHCl2F",
    "R218": "octafluoropropane|perfluoropropane|C3F8",
    "R22": "HCFC-22|chlorodifluoromethane|CHClF2",
    "R227EA": "HFC-227ea|1,1,1,2,3,3,3-heptafluoropropane",
    "R23": "HFC-23|trifluoromethane|fluoroform|CHF3",
    "R236EA": "HFC-236ea|1,1,1,2,3,3-hexafluoropropane",
    "R236FA": "HFC-236fa|1,1,1,3,3,3-hexafluoropropane",
    "R245ca": "HFC-245ca|1,1,2,2,3-pentafluoropropane",
    "R245fa": "HFC-245fa|1,1,1,3,3-pentafluoropropane",
    "R32": "HFC-32|difluoromethane|CH2F2",
    "R365MFC": "HFC-365mfc|1,1,1,3,3-pentafluorobutane",
    "R40": "chloromethane|CH3Cl",
    "R41": "fluoromethane|methyl fluoride|HFC-41|CH3F",
    "RC318": "octafluorocyclobutane|perfluorocyclobutane|c-C4F8",
    "SulfurDioxide": "sulphur dioxide|R764",
    "SulfurHexafluoride": "sulphur hexafluoride|R7146",
    "Tetrahydrofuran": "oxolane",
    "Toluene": "methylbenzene|toluol|C7H8",
    "trans-2-Butene": "trans-but-2-ene|(E)-2-butene",
    "VinylChloride": "chloroethylene|vinyl chloride monomer|VCM|R1140",
    "Water": "H2O",
    "m-Xylene": "1,3-dimethylbenzene",
    "n-Butane": "nC4",
    "n-Decane": "nC10",
    "n-Dodecane": "nC12",
    "n-Heptane": "nC7",
    "n-Hexane": "nC6",
    "n-Nonane": "nC9",
    "n-Octane": "nC8",
    "n-Pentane": "nC5",
    "n-Perfluorobutane": "perfluorobutane|decafluorobutane|R3110",
    "n-Perfluorohexane": "perfluorohexane|tetradecafluorohexane",
    "n-Perfluoropentane": "perfluoropentane|dodecafluoropentane",
    "n-Propane": "nC3",
    "n-Undecane": "nC11",
    "o-Xylene": "1,2-dimethylbenzene",
    "p-Xylene": "1,4-dimethylbenzene",
}
# The sum formula of ethanol is that of dimethyl ether too.
DROPPED_ALIASES = {"c2h6o"}

# The record's InChIKey is that of no known substance, or of another isomer; these are the right ones,
# compared with the `chemicals` package by a test.
RIGHT_INCHIKEY: Mapping[str, str] = {
    "n-Perfluorobutane": "KAVGMUDTWQVPDF-UHFFFAOYSA-N",
    "R1123": "MIZLGWKEZAPEFJ-UHFFFAOYSA-N",
    "R1233zd(E)": "LDTMPQQAWUMPKS-OWOJBTEDSA-N",
    "VinylChloride": "BZHJMEDXRYGGRV-UHFFFAOYSA-N",
}

SPIN = "a spin isomer, not what a cylinder at room temperature holds; it has no CAS number of its own"
QUANTUM = "a quantum fluid: models built on corresponding states are not made for it"


def main() -> None:
    """Write both files."""
    records = {name: record(name) for name in sorted(fluid_names(), key=str.casefold)}
    write("components.csv", COLUMNS, (row(name, r) for name, r in records.items()))
    keys = sorted({key for r in records.values() for key in equation_keys(r)}, key=str.casefold)
    entries = bibliography()
    write("equations.csv", ("key", "citation", "doi"), (citation_row(key, entries[key]) for key in keys))


def write(file_name: str, columns: tuple[str, ...] | list[str], rows: Iterator[dict[str, str]]) -> None:
    """Write rows as CSV beside this folder."""
    with (HERE / file_name).open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, columns, restval="", lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)


def fluid_names() -> list[str]:
    """Give the names of all fluids the library knows."""
    return str(get_global_param_string("FluidsList")).split(",")


def record(name: str) -> dict[str, Any]:
    """Give the library's record of a fluid."""
    found: list[dict[str, Any]] = json.loads(get_fluid_param_string(name, "JSON"))
    return found[0]


def row(name: str, r: Mapping[str, Any]) -> dict[str, str]:
    """Give the row of a fluid."""
    common = {"name": name, "aliases": "|".join(aliases(name, r)), "source": "|".join(equation_keys(r))}
    if name in LEFT_OUT:
        return common | {"left_out": f"{LEFT_OUT[name]}: {WHY_LEFT_OUT}"}
    state = AbstractState("HEOS", name)
    equation, critical = r["EOS"][0], r["STATES"]["critical"]
    start = max(state.Tmin(), state.Ttriple())
    triple = max(equation["Ttriple"], start) if abs(equation["Ttriple"] - start) < 0.5 else equation["Ttriple"]
    omega, omega_note = acentric(state, equation["acentric"], critical, triple)
    cas = r["INFO"]["CAS"]
    constants = {
        "critical_temperature_K": critical["T"],
        "critical_pressure_Pa": critical["p"],
        "critical_density_mol_m3": critical["rhomolar"],
        "acentric_factor": omega,
        "molar_mass_kg_mol": equation["molar_mass"],
        "triple_temperature_K": triple,
        "minimum_temperature_K": start,
        "maximum_temperature_K": equation["T_max"],
    }
    return (
        common
        | {key: f"{value:.15g}" for key, value in constants.items()}
        | {
            "cas": cas if re.fullmatch(r"\d+-\d\d-\d", cas) else "",
            "inchikey": RIGHT_INCHIKEY.get(name, r["INFO"].get("INCHI_KEY") or ""),
            "family": next(family for family, names in FAMILIES.items() if name in names.split()),
            "acentric_note": omega_note,
            "note": note(name, triple, start),
        }
    )


def acentric(state: Any, stored: float, critical: Mapping[str, float], triple: float) -> tuple[float, str]:
    """Give the acentric factor that is used, and what there is to say about it."""
    T = 0.7 * critical["T"]
    state.update(QT_INPUTS, 0.0, T)
    own = acentric_from_saturation(state.p(), critical["p"])
    below = "" if triple <= T else f" (extrapolated: 0.7 Tc is below the triple point, {triple:g} K)"
    if abs(own - stored) > 0.1:
        return (
            own,
            f"replaced: the record stores {stored:.5f}, the equation's own psat(0.7 Tc) gives {own:.5f}{below}",
        )
    if abs(own - stored) > 0.005:
        return stored, f"the stored acentric factor is kept; the equation's own psat(0.7 Tc) gives {own:.5f}{below}"
    return stored, ""


def note(name: str, triple: float, start: float) -> str:
    """Give what a reader must know of a fluid."""
    parts = [
        SPIN if name.startswith(("Ortho", "Para")) else "",
        QUANTUM if name in FAMILIES["quantum gas"].split() else "",
        f"the reference equation starts at {start:g} K, above the triple point" if start > triple else "",
    ]
    return "; ".join(filter(None, parts))


def aliases(name: str, r: Mapping[str, Any]) -> list[str]:
    """Give the aliases of a fluid, each once, whatever its case, spaces and hyphens."""
    kept: dict[str, str] = {folded(name): name}
    for alias in [*EXTRA_ALIASES.get(name, "").split("|"), *r["INFO"]["ALIASES"]]:
        if alias and folded(alias) not in DROPPED_ALIASES:
            kept.setdefault(folded(alias), readable(alias))
    return sorted(list(kept.values())[1:], key=str.casefold)


def folded(name: str) -> str:
    """Give a name without case, spaces, hyphens and underscores."""
    return re.sub(r"[ _-]", "", name.casefold())


def readable(alias: str) -> str:
    """Give long words in lower case; formulas and numbers stay as they are."""
    return alias.lower() if re.fullmatch(r"[A-Za-z]{6,}", alias) and not re.search(r"\d", alias) else alias


def equation_keys(r: Mapping[str, Any]) -> list[str]:
    """Give the bibliography keys of a fluid's equation of state."""
    return [key.strip() for key in r["EOS"][0]["BibTeX_EOS"].split(",")]


def bibliography() -> dict[str, dict[str, str]]:
    """Read the library's BibTeX file: key -> field -> text."""
    text = (Path(CoolProp.__file__).parent / "CoolPropBibTeXLibrary.bib").read_text(encoding="utf-8")
    entries = re.finditer(r"^@(\w+)\{([^,\s]+),(.*?)^\}", text, re.MULTILINE | re.DOTALL)
    return {m[2]: {"type": m[1].lower(), **fields(m[3])} for m in entries}


def fields(body: str) -> dict[str, str]:
    """Read the fields of one BibTeX entry, each on a line of its own."""
    found = re.finditer(r"^\s*(\w+)\s*=\s*\{(.*)\},?\s*$", body, re.MULTILINE)
    return {m[1].lower(): plain(m[2]) for m in found}


ACCENTS = {'"': "\u0308", "'": "\u0301", "`": "\u0300", "^": "\u0302"}


def plain(text: str) -> str:
    """Turn the TeX of names into letters."""
    text = re.sub(r"\{?\\ss\}?", "ß", text).replace("\\&", "&")
    text = re.sub(
        r"\{?\\([\"'`^])\{?\\?(\w)\}?\}?",
        lambda m: unicodedata.normalize("NFC", m[2] + ACCENTS[m[1]]),
        text,
    )
    return re.sub(r"[{}]", "", text).strip()


# What the library's file lacks and is known from elsewhere.
COMPLETED: Mapping[str, Mapping[str, str]] = {
    "Gao-JPCRD-2020": {"volume": "52", "year": "2023", "pages": "013102"},
    "Marx-BOOK-1992": {
        "title": "Neue Zustandsgleichungen für R 12, R 22, R 11 und R 113, VDI-Fortschritt-Berichte, series",
    },
}
JOURNALS = {
    "International Journal of Thermophysics": "Int. J. Thermophys.",
    "Int. J. Thermophys": "Int. J. Thermophys.",
    "Int. J. Therrmophys.": "Int. J. Thermophys.",
    "International Journal of Refrigeration": "Int. J. Refrig.",
    "Industrial & Engineering Chemistry Research": "Ind. Eng. Chem. Res.",
    "Energy & Fuels": "Energy Fuels",
    "J. Phys. Chem Ref. Data": "J. Phys. Chem. Ref. Data",
}


def citation_row(key: str, entry: Mapping[str, str]) -> dict[str, str]:
    """Compose one citation: authors, journal volume (year) first page, doi."""
    e = {**entry, **COMPLETED.get(key, {})}
    doi = e.get("doi", "").removeprefix("https://doi.org/")
    year, _, remark = e.get("year", "").partition(",")
    where = e.get("journal") or e.get("booktitle") or e.get("school") or e.get("title", "")
    where = JOURNALS.get(where, where)
    kind = {"phdthesis": "doctoral thesis, ", "unpublished": "unpublished: "}.get(e["type"], "")
    volume = f" {e['volume']}" if "volume" in e else ""
    page = re.split(r"\s*-", e.get("pages", ""))[0]
    parts = [f"{authors(e['author'])}, {kind}{where}{volume} ({year}){' ' + page if page else ''}"]
    parts += [remark.strip().lower()] if remark else []
    parts += [f"doi:{doi}"] if doi else []
    return {"key": key, "citation": ", ".join(parts), "doi": doi}


def authors(text: str) -> str:
    """Write authors as initials and surname."""
    return ", ".join(author(name.strip()) for name in re.split(r"\s+and\s+|\s*&\s*", text))


def author(name: str) -> str:
    """Write one author as initials and surname.

    >>> author("Eric W. Lemmon"), author("Span, Roland"), author("K. M. de Reuck")
    ('E. W. Lemmon', 'R. Span', 'K. M. de Reuck')
    """
    surname, comma, given = name.partition(",")
    if not comma:
        words = name.replace(".", ". ").split()
        first = next((i for i, word in enumerate(words) if word[0].islower()), len(words) - 1)
        given, surname = " ".join(words[:first]), " ".join(words[first:])
    initials = [f"{part[0]}." if "." not in part[1:-1] else part for part in given.replace(".", ". ").split()]
    return " ".join([*initials, surname.strip()])


if __name__ == "__main__":
    main()
