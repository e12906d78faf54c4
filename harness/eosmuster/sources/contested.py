"""Which references handed out by default contradict each other, as `references/conflicts.csv` notes it down.

The table is made by ``references/generators/conflicts.py``, with the version of the library it was made with, so that
nobody has to load the library to look it up; ``eosmuster precheck`` compares anew.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from types import MappingProxyType

from eosmuster.reference_rows import rows

FILE = "conflicts.csv"


@dataclass(frozen=True)
class Contested:
    """References of one component and property that disagree.

    Attributes
    ----------
    alone : the sources in the minority; empty where no majority tells who is right
    sentence : who stands against whom, by how much and where
    source : the library that was compared, and its version
    """

    component: str
    property: str
    alone: tuple[str, ...]
    sentence: str
    source: str


@cache
def contested() -> Mapping[tuple[str, str], Contested]:
    """Give what is contested, by component and property.

    >>> contested()["SulfurDioxide", "saturation_pressure"].alone
    ('handbook:dippr101-perry-2008',)
    """
    found = (
        Contested(
            row["component"],
            row["property"],
            tuple(filter(None, row["alone"].split("|"))),
            row["sentence"],
            row["source"],
        )
        for _, row in rows(FILE)
    )
    return MappingProxyType({(one.component, one.property): one for one in found})
