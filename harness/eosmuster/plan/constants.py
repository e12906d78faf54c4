"""The table ``[constants]`` of a plan: the library's own record, a cited critical table, or a series of them."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache
from types import MappingProxyType

from eosmuster.errors import InputError, suggestion
from eosmuster.plan.tables import Table
from eosmuster.quantities import shown
from eosmuster.reference_rows import rows

LIBRARY = "library"
"""The reference library's own record: what a plan uses unless it says otherwise."""

SERIES = ("iupac-critical",)
"""Names of whole series, whose parts are keys of their own: ``iupac-critical-2``, ``iupac-critical-3`` and so on."""


@cache
def critical_tables() -> Mapping[str, tuple[str, ...]]:
    """Give what a plan may name besides the library: key of a table or name of a series -> keys of tables.

    Examples
    --------
    >>> critical_tables()["crc-95"], len(critical_tables()["iupac-critical"])
    (('crc-95',), 8)
    """
    keys = sorted({row["source"] for _, row in rows("critical_constants/critical_constants.csv")})
    series = {name: tuple(key for key in keys if key.startswith(f"{name}-")) for name in SERIES}
    return MappingProxyType({**{key: (key,) for key in keys}, **series})


def read_constants(plan: Table) -> str:
    """Read where the constants of catalogued components come from: `LIBRARY`, or a name of `critical_tables`.

    Raises
    ------
    InputError : an unknown key or name; a part of a name is none
    """
    table = plan.table("constants")
    table.check_keys(("source",))
    source = table.text("source", LIBRARY)
    if source != LIBRARY and source not in critical_tables():
        valid = suggestion(source[:60], (LIBRARY, *critical_tables()), most=20)
        raise InputError(f"{table.at('source')} = {shown(source)} is unknown; {valid}")
    return source
