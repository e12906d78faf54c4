"""Pure components: frozen constants, each with its source."""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from functools import cache
from numbers import Real
from types import MappingProxyType

from eosmuster.errors import InputError, suggestion
from eosmuster.reference_rows import Row, rows

FAMILIES: Mapping[str, str] = MappingProxyType(
    {
        "n-alkane": "straight-chain alkanes, methane and ethane among them",
        "branched alkane": "isobutane, isopentane, neopentane, isohexane",
        "cycloalkane": "saturated rings of carbon and hydrogen",
        "alkene": "hydrocarbons with one double bond",
        "alkyne": "hydrocarbons with a triple bond",
        "aromatic": "benzene and its alkyl derivatives",
        "refrigerant": "hydrocarbons and ethers with some hydrogen replaced by F, Cl or I, refrigerants by use or "
        "by number; chlorinated solvents and monomers are among them, fully fluorinated substances are not",
        "perfluorocarbon": "fully fluorinated alkanes and cycloalkanes, and one fluoroketone",
        "siloxane": "linear (M) and cyclic (D) methylsiloxanes",
        "fatty acid ester": "methyl esters of C16 and C18 acids, the parts of biodiesel",
        "polar": "ethers, ketones, carbonates and ammonia: polar without strong self-association",
        "associating": "water, heavy water, alcohols and glycols: chains and networks of hydrogen bonds",
        "quantum gas": "He, Ne, H2, D2 and their spin forms: corresponding states fail for light molecules",
        "noble gas": "Ar, Kr, Xe: monatomic, nearly simple fluids",
        "acid gas": "CO2, H2S, SO2, COS, HCl: what dissolves in water to an acid",
        "inorganic gas": "N2, O2, F2, Cl2, CO, N2O, SF6",
    }
)
"""Chemical class -> what it holds. Every catalogued fluid is in exactly one."""

_CSV_CONSTANTS = {
    "critical_temperature": "critical_temperature_K",
    "critical_pressure": "critical_pressure_Pa",
    "critical_density": "critical_density_mol_m3",
    "molar_mass": "molar_mass_kg_mol",
    "triple_temperature": "triple_temperature_K",
}


@dataclass(frozen=True)
class Component:
    """A pure substance and the constants a cubic equation of state needs.

    Attributes
    ----------
    name : unique; for catalogued fluids the name the reference library knows
    critical_temperature : K
    critical_pressure : Pa
    acentric_factor : dimensionless
    molar_mass : kg/mol, or None if not known
    critical_density : mol/m3, or None; only forms that use the critical compressibility need it
    triple_temperature : K, or None
    cas : CAS number, or "" if there is none
    inchikey : or ""
    family : chemical class (``n-alkane``, ``refrigerant``, ``associating``, ...)
    aliases : other names it is found by
    library_name : name in the reference library, "" for a component of the user's own
    sources : constant's field name -> where its value comes from; ``equation`` holds the keys (into
        `equation_citations`) of the library's equation of state, joined by ", "
    notes : what a reader must know (a replaced constant, a spin isomer, ...)

    Raises
    ------
    InputError : a constant that is no finite number, not positive where it must be, an acentric factor
        outside -1 to 3, or a triple point at or above the critical temperature.

    Examples
    --------
    >>> Component("x", critical_temperature=-5.0, critical_pressure=4e6, acentric_factor=0.1)
    Traceback (most recent call last):
    eosmuster.errors.InputError: component 'x': critical_temperature is -5.0; valid is a finite number above 0 K
    """

    name: str
    critical_temperature: float
    critical_pressure: float
    acentric_factor: float
    molar_mass: float | None = None
    critical_density: float | None = None
    triple_temperature: float | None = None
    cas: str = ""
    inchikey: str = ""
    family: str = "other"
    aliases: tuple[str, ...] = ()
    library_name: str = ""
    # a plain dict: a mappingproxy can be neither pickled (process pools) nor hashed
    sources: Mapping[str, str] = field(default_factory=dict, hash=False)
    notes: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        if not isinstance(self.name, str) or not self.name.strip():
            raise InputError(f"component: name is {self.name!r}; valid is a text that is not empty")
        self._check("critical_temperature", "K", 0.0)
        self._check("critical_pressure", "Pa", 0.0)
        self._check("acentric_factor", "", -1.0, 3.0)
        self._check("molar_mass", "kg/mol", 0.0, optional=True)
        self._check("critical_density", "mol/m3", 0.0, optional=True)
        self._check("triple_temperature", "K", 0.0, self.critical_temperature, optional=True)

    def _check(self, key: str, unit: str, low: float, high: float = math.inf, optional: bool = False) -> None:
        value = getattr(self, key)
        if value is None and optional:
            return
        number = isinstance(value, Real) and not isinstance(value, bool)
        if number and math.isfinite(value) and low < value < high:
            return
        ends = f"above {low:g}" + (f" and below {high:g}" if high < math.inf else "") + (f" {unit}" if unit else "")
        raise InputError(f"component {self.name!r}: {key} is {value!r}; valid is a finite number {ends}")


def acentric_from_saturation(saturation_pressure: float, critical_pressure: float) -> float:
    """Give the acentric factor of its definition, omega = -1 - log10(psat(0.7 Tc)/pc).

    Both pressures in Pa, the first at 0.7 Tc. Source: K. S. Pitzer et al., J. Am. Chem. Soc. 77 (1955) 3433.

    >>> acentric_from_saturation(0.05e6, 5e6)
    1.0
    """
    return -1.0 - math.log10(saturation_pressure / critical_pressure)


@cache
def catalogue() -> Mapping[str, Component]:
    """Give every pure fluid of the reference library by its name there, in alphabetical order.

    Constants come from ``references/components.csv``, written by ``references/generators/components.py``
    from the library's own records; the library is not imported.

    >>> len(catalogue()), catalogue()["n-Propane"].critical_temperature
    (130, 369.89)
    """
    return MappingProxyType({row["name"]: _component(row) for row in _rows() if not row["left_out"]})


@cache
def left_out() -> Mapping[str, str]:
    """Give the library's fluids that are no pure substances, each with the reason it is left out.

    >>> "R410A" in left_out()
    True
    """
    return MappingProxyType({row["name"]: row["left_out"] for row in _rows() if row["left_out"]})


@cache
def equation_citations() -> Mapping[str, str]:
    """Give the citation of each reference equation of state, by the key the library files it under.

    >>> print(equation_citations()[find("propane").sources["equation"]])
    E. W. Lemmon, M. O. McLinden, W. Wagner, J. Chem. Eng. Data 54 (2009) 3141, doi:10.1021/je900217v
    """
    return MappingProxyType({row["key"]: row["citation"] for _, row in rows("equations.csv", source=False)})


def find(name: str) -> Component:
    """Find a catalogued component by name, alias or CAS number.

    Case, spaces, hyphens and underscores do not matter in names: ``R-134a`` is ``r134a``.

    Raises `InputError` if there is none (the nearest names are offered), or for a blend (with the reason).

    >>> find("propane").name, find("R-290").name, find("74-98-6").name
    ('n-Propane', 'n-Propane', 'n-Propane')
    >>> find("propanol")  # doctest: +ELLIPSIS
    Traceback (most recent call last):
    eosmuster.errors.InputError: component 'propanol' is unknown; nearest: ...
    """
    if not isinstance(name, str):
        raise InputError(f"component {name!r} is not a text; valid is a name, an alias or a CAS number")
    found = _index().get(_folded(name))
    if found is None:
        raise InputError(f"component {name!r} is unknown; {_nearest(name)}")
    if found in left_out():
        raise InputError(f"component {name!r} is left out: {left_out()[found]}")
    return catalogue()[found]


def family(name: str) -> tuple[Component, ...]:
    """Give the components of a chemical class, named in the singular or the plural.

    Raises `InputError` if there is no such class.

    >>> [c.name for c in family("noble gases")]
    ['Argon', 'Krypton', 'Xenon']
    """
    singular = _families_by_any_name().get(_folded(name))
    if singular is None:
        raise InputError(f"family {name!r} is unknown; {suggestion(name, FAMILIES, most=len(FAMILIES))}")
    return tuple(c for c in catalogue().values() if c.family == singular)


def resolve(selection: Iterable[str]) -> tuple[Component, ...]:
    """Turn a plan's list of components into components, in the order given.

    Entries are names, aliases, CAS numbers, ``family:...`` or ``all``.

    Raises `InputError` on an unknown or left-out entry, a component that is named twice, or a text instead
    of a list.

    >>> [c.name for c in resolve(["water", "family:alkynes"])]
    ['Water', 'Propyne']
    >>> resolve(["propane", "R290"])
    Traceback (most recent call last):
    eosmuster.errors.InputError: components: named twice: n-Propane (propane, R290); each may be named once
    """
    if isinstance(selection, str):
        raise InputError(f"components: {selection!r} is a text; valid is a list such as [{selection!r}]")
    entries = [(entry, component) for entry in selection for component in _expanded(entry)]
    counts = Counter(component.name for _, component in entries)
    twice = [
        f"{name} ({', '.join(entry for entry, component in entries if component.name == name)})"
        for name, count in counts.items()
        if count > 1
    ]
    if twice:
        raise InputError(f"components: named twice: {'; '.join(twice)}; each may be named once")
    return tuple(component for _, component in entries)


def _expanded(entry: str) -> tuple[Component, ...]:
    if isinstance(entry, str):
        text = entry.strip().casefold()
        if text == "all":
            return tuple(catalogue().values())
        if text.startswith("family:"):
            return family(text.removeprefix("family:").strip())
    return (find(entry),)


@cache
def _rows() -> tuple[Row, ...]:
    return tuple(row for _, row in rows("components.csv"))


def _of_omega(note: str) -> str:
    """Say which constant was replaced, where one was."""
    return f"omega {note}" if note.startswith("replaced") else note


def _component(row: Mapping[str, str]) -> Component:
    constants = {key: float(row[column]) for key, column in _CSV_CONSTANTS.items()}
    return Component(
        name=row["name"],
        acentric_factor=float(row["acentric_factor"]),
        cas=row["cas"],
        inchikey=row["inchikey"],
        family=row["family"],
        aliases=tuple(filter(None, row["aliases"].split("|"))),
        library_name=row["name"],
        sources=_sources(row),
        notes=tuple(filter(None, (_of_omega(row["acentric_note"]), row["note"]))),
        **constants,
    )


def _sources(row: Mapping[str, str]) -> dict[str, str]:
    keys = row["source"].replace("|", ", ")
    stored = f"stored in the record of CoolProp 8 ({keys})"
    sources = dict.fromkeys(("molar_mass", "triple_temperature", "acentric_factor"), stored)
    sources |= dict.fromkeys(
        ("critical_temperature", "critical_pressure", "critical_density"), f"critical state {stored}"
    )
    if row["acentric_note"].startswith("replaced"):
        sources["acentric_factor"] = f"-1 - log10(psat(0.7 Tc)/pc) of the equation in CoolProp 8 ({keys})"
    return sources | {"equation": keys}


def _folded(name: str) -> str:
    """Drop what people write in different ways; a CAS number folds to its digits, which no name does."""
    return name.casefold().translate({ord(c): None for c in " \t-_"})


@cache
def _index() -> Mapping[str, str]:
    index: dict[str, str] = {}
    for row in _rows():
        for key in (row["name"], row["cas"], *row["aliases"].split("|")):
            if key:
                index[_folded(key)] = row["name"]
    return index


def _nearest(name: str) -> str:
    """Offer names and aliases alike, since a misspelt everyday name is nearest to the everyday name."""
    known = [*catalogue(), *(alias for c in catalogue().values() for alias in c.aliases)]
    near = suggestion(name, known, most=0).partition("valid:")[0]
    return f"{near}valid: a name, an alias or a CAS number of 'eosmuster list components'"


@cache
def _families_by_any_name() -> Mapping[str, str]:
    plurals = {f"{name}es" if name.endswith("s") else f"{name}s": name for name in FAMILIES}
    singulars = {name: name for name in FAMILIES}
    return {_folded(key): value for key, value in (plurals | singulars).items()}
