"""From when on references contest each other, and what their uncertainties leave open, in words."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from eosmuster.quantities import PROPERTIES
from eosmuster.report.text import number

KEYS = ("contested_above_pct", "coverage_factor_unstated")
"""What a record's decision rule holds of them."""


def sentences(rule: Mapping[str, Any]) -> Iterator[str]:
    """Say both, as far as the record has them.

    Examples
    --------
    >>> print(*sentences({"contested_above_pct": {"density": 1.0}}))
    References contest each other above a median disagreement of 1 % (density), and above their combined U.
    """
    above = rule.get("contested_above_pct")
    if isinstance(above, Mapping) and above:
        by_size: dict[str, list[str]] = {}
        for name, size in above.items():
            by_size.setdefault(number(size), []).append(PROPERTIES[name].label if name in PROPERTIES else str(name))
        sizes = ", ".join(f"{size} % ({', '.join(names)})" for size, names in by_size.items())
        yield f"References contest each other above a median disagreement of {sizes}, and above their combined U."
    if unstated := rule.get("coverage_factor_unstated"):
        yield str(unstated)
