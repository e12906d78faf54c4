"""Write references/formulas.csv again: formulas of the catalogued fluids, and names that data archives use.

Usage: python references/generators/formulas.py   (in an environment with eosmuster)

The formula is the formula layer of the InChI in CoolProp's record (Hill order), with D for deuterium where
the record's own formula says so. Each is checked here: its molar mass, from the IUPAC standard atomic
weights, has to be the record's within 0.03 % (the records use weights of different decades).

The names are index names and IUPAC names that measured data come under and that `references/components.csv`
has no alias for. Inverted index names ("ethane, 1,1,1,2-tetrafluoro-") need no entry. A name that several
catalogued isomers go by stands in AMBIGUOUS and identifies none of them, alias or not.
"""

from __future__ import annotations

import csv
import json
import re
from collections.abc import Mapping
from pathlib import Path

from CoolProp.CoolProp import get_fluid_param_string

from eosmuster.components import catalogue

FILE = Path(__file__).resolve().parents[1] / "formulas.csv"
COLUMNS = ("component", "formula", "names", "ambiguous", "source")
SOURCE = "coolprop-2014"

# Standard atomic weights, abridged to five digits: Prohaska et al., Pure Appl. Chem. 94 (2022) 573, table 1
# (deuterium: the mass of the isotope).
ATOMIC_WEIGHTS: Mapping[str, float] = {
    **{"H": 1.0080, "D": 2.0141, "He": 4.0026, "C": 12.011, "N": 14.007, "O": 15.999, "F": 18.998, "Ne": 20.180},
    **{"Si": 28.085, "S": 32.06, "Cl": 35.45, "Ar": 39.95, "Kr": 83.798, "I": 126.90, "Xe": 131.29},
}

# The record of a spin isomer holds no InChI; the formula is its substance's.
SPIN_ISOMERS: Mapping[str, str] = {
    **dict.fromkeys(("OrthoHydrogen", "ParaHydrogen"), "H2"),
    **dict.fromkeys(("OrthoDeuterium", "ParaDeuterium"), "D2"),
}

NAMES: Mapping[str, str] = {
    "1-Butene": "butene-1",
    "Acetone": "propan-2-one",
    "Ammonia": "azane",
    "CarbonylSulfide": "carbon oxide sulfide|carbon oxysulfide",
    "cis-2-Butene": "2-butene, (Z)-|(Z)-but-2-ene",
    "Deuterium": "deuterium molecule",
    "DiethylEther": "1,1'-oxybisethane|oxydiethane",
    "DimethylCarbonate": "carbonic acid, dimethyl ester|carbonic acid dimethyl ester",
    "DimethylEther": "oxybismethane|oxydimethane",
    "EthylBenzene": "phenylethane",
    "HFE143m": "trifluoromethoxymethane|trifluoro(methoxy)methane|trifluoromethyl methyl ether",
    "HeavyWater": "water-d2|water (D2O)|deuterated water",
    "HydrogenChloride": "hydrochloric acid",
    "IsoButene": "2-methylprop-1-ene",
    "MethylLinoleate": "9,12-octadecadienoic acid (9Z,12Z)-, methyl ester|methyl (9Z,12Z)-octadeca-9,12-dienoate",
    "MethylLinolenate": "methyl (9Z,12Z,15Z)-octadeca-9,12,15-trienoate",
    "MethylOleate": "methyl cis-9-octadecenoate|methyl (9Z)-octadec-9-enoate|methyl (Z)-9-octadecenoate",
    "MethylPalmitate": "methyl hexadecanoate|hexadecanoic acid, methyl ester",
    "MethylStearate": "methyl octadecanoate|octadecanoic acid, methyl ester",
    "NitrousOxide": "dinitrogen oxide|nitrogen oxide (N2O)",
    "Novec649": "1,1,1,2,2,4,5,5,5-nonafluoro-4-(trifluoromethyl)pentan-3-one|"
    "1,1,1,2,2,4,5,5,5-nonafluoro-4-(trifluoromethyl)-3-pentanone",
    "Propylene": "1-propene|prop-1-ene",
    "PropyleneGlycol": "1,2-propanediol|propylene glycol",
    "Propyne": "1-propyne|prop-1-yne",
    "R1123": "1,1,2-trifluoroethene|trifluoroethene",
    "R113": "1,1,2-trichloro-1,2,2-trifluoroethane",
    "R1130(E)": "trans-1,2-dichloroethene|(E)-1,2-dichloroethene",
    "R1132(E)": "trans-1,2-difluoroethene|(E)-1,2-difluoroethene",
    "R114": "1,2-dichloro-1,1,2,2-tetrafluoroethane",
    "R115": "1-chloro-1,1,2,2,2-pentafluoroethane|chloro-1,1,2,2,2-pentafluoroethane",
    "R116": "1,1,1,2,2,2-hexafluoroethane",
    "R1224YDZ": "(Z)-1-chloro-2,3,3,3-tetrafluoropropene|(Z)-1-chloro-2,3,3,3-tetrafluoro-1-propene|"
    "(Z)-1-chloro-2,3,3,3-tetrafluoroprop-1-ene",
    "R123": "1,1-dichloro-2,2,2-trifluoroethane",
    "R1233zd(E)": "trans-1-chloro-3,3,3-trifluoropropene|(E)-1-chloro-3,3,3-trifluoropropene|"
    "(E)-1-chloro-3,3,3-trifluoro-1-propene|(E)-1-chloro-3,3,3-trifluoroprop-1-ene|"
    "trans-1-chloro-3,3,3-trifluoro-1-propene",
    "R1234yf": "2,3,3,3-tetrafluoro-1-propene|2,3,3,3-tetrafluoroprop-1-ene",
    "R1234ze(E)": "(E)-1,3,3,3-tetrafluoropropene|(E)-1,3,3,3-tetrafluoro-1-propene|"
    "(E)-1,3,3,3-tetrafluoroprop-1-ene|trans-1,3,3,3-tetrafluoro-1-propene|trans-1,3,3,3-tetrafluoroprop-1-ene",
    "R1234ze(Z)": "(Z)-1,3,3,3-tetrafluoropropene|(Z)-1,3,3,3-tetrafluoro-1-propene|"
    "(Z)-1,3,3,3-tetrafluoroprop-1-ene|cis-1,3,3,3-tetrafluoro-1-propene|cis-1,3,3,3-tetrafluoroprop-1-ene",
    "R124": "2-chloro-1,1,1,2-tetrafluoroethane",
    "R1243zf": "3,3,3-trifluoro-1-propene|3,3,3-trifluoroprop-1-ene",
    "R125": "1,1,1,2,2-pentafluoroethane",
    "R1336mzz(E)": "trans-1,1,1,4,4,4-hexafluoro-2-butene|trans-1,1,1,4,4,4-hexafluorobut-2-ene|"
    "(E)-1,1,1,4,4,4-hexafluoro-2-butene|(E)-1,1,1,4,4,4-hexafluorobut-2-ene",
    "R1336mzz(Z)": "cis-1,1,1,4,4,4-hexafluorobut-2-ene|(Z)-1,1,1,4,4,4-hexafluoro-2-butene|"
    "(Z)-1,1,1,4,4,4-hexafluorobut-2-ene",
    "R13I1": "iodotrifluoromethane|trifluoromethyl iodide",
    "R218": "1,1,1,2,2,3,3,3-octafluoropropane",
    "R22": "difluorochloromethane",
    "R40": "methyl chloride",
    "RC318": "1,1,2,2,3,3,4,4-octafluorocyclobutane",
    "SulfurHexafluoride": "sulfur fluoride (SF6)",
    "VinylChloride": "vinyl chloride|1-chloroethene",
    "Water": "oxidane",
    "n-Perfluorobutane": "1,1,1,2,2,3,3,4,4,4-decafluorobutane",
    "n-Perfluorohexane": "1,1,1,2,2,3,3,4,4,5,5,6,6,6-tetradecafluorohexane",
    "n-Perfluoropentane": "1,1,1,2,2,3,3,4,4,5,5,5-dodecafluoropentane",
    "trans-2-Butene": "2-butene, (E)-|(E)-but-2-ene",
}

AMBIGUOUS: Mapping[str, str] = {
    "1-Butene": "butene",
    "Dichloroethane": "dichloroethane",
    "R114": "dichlorotetrafluoroethane",
    "R1234ze(E)": "R1234ze|1,3,3,3-tetrafluoropropene",
}


def main() -> None:
    """Write the file."""
    with FILE.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(COLUMNS)
        writer.writerows(row(name) for name in catalogue())


def row(name: str) -> tuple[str, ...]:
    """Give the row of a fluid, its formula checked against its molar mass."""
    found = formula(name)
    stored = catalogue()[name].molar_mass
    if stored is None or abs(molar_mass(found) / stored - 1.0) > 3e-4:
        raise SystemExit(f"{name}: {found} has {molar_mass(found)} kg/mol, the record {stored}")
    return name, found, NAMES.get(name, ""), AMBIGUOUS.get(name, ""), SOURCE


def formula(name: str) -> str:
    """Give the formula of a fluid: the InChI's, deuterium marked as the record's own formula marks it."""
    if name in SPIN_ISOMERS:
        return SPIN_ISOMERS[name]
    info = json.loads(get_fluid_param_string(name, "JSON"))[0]["INFO"]
    layer = str(info["INCHI_STRING"]).split("/")[1]
    return re.sub(r"^H(?=\d)", "D", layer) if str(info["FORMULA"]).startswith("D_") else layer


def molar_mass(text: str) -> float:
    """Give the molar mass (kg/mol) of a formula.

    >>> round(molar_mass("C2H2F4"), 6)
    0.10203
    """
    atoms = re.findall(r"([A-Z][a-z]?)(\d*)", text)
    return 1e-3 * sum(ATOMIC_WEIGHTS[element] * int(count or 1) for element, count in atoms)


if __name__ == "__main__":
    main()
