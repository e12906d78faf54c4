"""Which catalogued substance a data file means: by InChIKey or CAS number, else by name and formula, else none.

Everything a file says of a substance has to agree; what contradicts itself is refused, and nothing is guessed.
"""

from __future__ import annotations

import re
from collections import Counter, defaultdict
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cache
from types import MappingProxyType

from eosmuster.components import Component, catalogue
from eosmuster.errors import InputError
from eosmuster.quantities import shown
from eosmuster.reference_rows import Row, rows

_INCHIKEY = re.compile(r"[A-Z]{14}-[A-Z]{10}-[A-Z]\Z")
_INVERTED = re.compile(r"([^,]+), *(.+-)\Z")
_ATOMS = re.compile(r"([A-Z][a-z]?)(\d{0,3})")
_FORMULA = re.compile(r"(?:[A-Z][a-z]?\d{0,3})+\Z")


@dataclass(frozen=True)
class Description:
    """What a file says of a substance; "" and () for what it does not say.

    Attributes
    ----------
    names : any number of names
    formula : molecular formula, any order of the elements
    inchikey : standard InChIKey
    cas : CAS number, with or without hyphens
    """

    names: tuple[str, ...] = ()
    formula: str = ""
    inchikey: str = ""
    cas: str = ""

    def __str__(self) -> str:
        said = (*self.names[:1], self.inchikey, self.cas, self.formula)
        return shown(next(filter(None, said), "a substance without a name"))


def resolve(said: Description) -> Component:
    """Find the catalogued substance a description means.

    Raises
    ------
    InputError : it is not in the catalogue, it is ambiguous, or what is said contradicts itself.

    Examples
    --------
    >>> resolve(Description(("ethane, 1,1,1,2-tetrafluoro-",), "C2H2F4")).name
    'R134a'
    >>> resolve(Description(inchikey="ATUOYWHBWRKTHZ-UHFFFAOYSA-N")).name
    'n-Propane'
    >>> resolve(Description(("hexane",), "C6H12"))
    Traceback (most recent call last):
    eosmuster.errors.InputError: 'hexane' is n-Hexane, C6H14, by its name, but the file gives the formula 'C6H12'
    """
    named = _by_name(said)
    for kind, given, found in _identifiers(said):
        strangers = {name for name in named - found if not _same_substance(name, found)}
        if strangers:
            only = ", ".join(sorted(found)) or "no catalogued substance"
            raise InputError(f"{said} is {min(strangers)} by its name, but its {kind} {given} is that of {only}")
        if not found:
            raise InputError(f"{said} is not in the catalogue, by its {kind} {given}")
        return _checked(said, named or found, kind)
    if not named:
        raise InputError(f"{said} is not in the catalogue, by its name{_why_not(said)}")
    if not said.formula:
        raise InputError(f"{said} has no InChIKey and no formula, and a name alone is not enough")
    return _checked(said, named, "name")


def _identifiers(said: Description) -> Iterator[tuple[str, str, set[str]]]:
    """Give the identifiers that can be ones, with the substances they are of."""
    if _INCHIKEY.match(said.inchikey):
        yield "InChIKey", said.inchikey, _by_inchikey(said)
    digits = said.cas.replace("-", "")
    if _is_cas(digits):
        yield "CAS number", said.cas, set(filter(None, [_cas_numbers().get(digits)]))


def _checked(said: Description, found: set[str], kind: str) -> Component:
    """Take the only one found, if the formula agrees."""
    if len(found) > 1:
        raise InputError(f"{said} is one of {', '.join(sorted(found))} by its {kind}")
    (name,) = found
    if said.formula and _atoms(said.formula) != _atoms(formulas()[name]):
        own = f"{name}, {formulas()[name]}, by its {kind}"
        raise InputError(f"{said} is {own}, but the file gives the formula {shown(said.formula)}")
    return catalogue()[name]


def _why_not(said: Description) -> str:
    isomers = {n for name in said.names for n in _ambiguous().get(_folded(name), ())}
    return f": several isomers go by it ({', '.join(sorted(isomers))} is one)" if isomers else ""


def _by_inchikey(said: Description) -> set[str]:
    found = _inchikeys().get(said.inchikey)
    if found is None and (kin := _skeletons().get(said.inchikey[:14])):
        raise InputError(f"{said}: its InChIKey {said.inchikey} is that of another form of {', '.join(sorted(kin))}")
    return {found} if found else set()


def _is_cas(digits: str) -> bool:
    """Check the last digit of a CAS number: the sum of the others, weighted from the right, modulo 10."""
    if not (digits.isascii() and digits.isdigit() and 5 <= len(digits) <= 10):
        return False
    weighted = sum(i * int(digit) for i, digit in enumerate(reversed(digits[:-1]), start=1))
    return weighted % 10 == int(digits[-1])


def _by_name(said: Description) -> set[str]:
    return {found for name in said.names for found in _names().get(_folded(name), ())}


def _same_substance(name: str, found: set[str]) -> bool:
    """Tell whether `name` is a spin isomer of what was found: it has no identifier of its own."""
    spin = not catalogue()[name].cas and not catalogue()[name].inchikey
    return spin and any(formulas()[name] == formulas()[other] for other in found)


def _folded(name: str) -> str:
    """Drop what is written in different ways, and turn an inverted index name round.

    >>> _folded("Propane, 2-methyl-")
    '2methylpropane'
    """
    inverted = _INVERTED.match(name.strip())
    turned = f"{inverted[2]}{inverted[1]}" if inverted else name
    return re.sub(r"[\s_-]", "", turned.casefold())


def _atoms(formula: str) -> Counter[str] | None:
    """Count the atoms of a formula, deuterium as hydrogen; None for what is not a formula."""
    if not _FORMULA.match(formula):
        return None
    count: Counter[str] = Counter()
    for element, number in _ATOMS.findall(formula):
        count["H" if element == "D" else element] += int(number or 1)
    return count


@cache
def _rows() -> tuple[Row, ...]:
    return tuple(row for _, row in rows("formulas.csv"))


@cache
def formulas() -> Mapping[str, str]:
    """Give the formula (Hill order, D for deuterium) of every catalogued substance, by its name.

    >>> formulas()["Ammonia"]
    'H3N'
    """
    return MappingProxyType({row["component"]: row["formula"] for row in _rows()})


@cache
def _names() -> Mapping[str, frozenset[str]]:
    names: dict[str, set[str]] = defaultdict(set)
    for row in _rows():
        component = catalogue()[row["component"]]
        for name in (component.name, *component.aliases, *filter(None, row["names"].split("|"))):
            names[_folded(name)].add(component.name)
    return MappingProxyType({name: frozenset(found) for name, found in names.items() if name not in _ambiguous()})


@cache
def _ambiguous() -> Mapping[str, frozenset[str]]:
    names: dict[str, set[str]] = defaultdict(set)
    for row in _rows():
        for name in filter(None, row["ambiguous"].split("|")):
            names[_folded(name)].add(row["component"])
    return MappingProxyType({name: frozenset(found) for name, found in names.items()})


@cache
def _inchikeys() -> Mapping[str, str]:
    return MappingProxyType({c.inchikey: c.name for c in catalogue().values() if c.inchikey})


@cache
def _skeletons() -> Mapping[str, frozenset[str]]:
    """Give the substances by the first part of their InChIKeys, which leaves out stereochemistry and isotopes."""
    kin: dict[str, set[str]] = defaultdict(set)
    for key, name in _inchikeys().items():
        kin[key[:14]].add(name)
    return MappingProxyType({skeleton: frozenset(names) for skeleton, names in kin.items()})


@cache
def _cas_numbers() -> Mapping[str, str]:
    return MappingProxyType({c.cas.replace("-", ""): c.name for c in catalogue().values() if c.cas})
