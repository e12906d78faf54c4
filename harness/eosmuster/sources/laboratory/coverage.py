"""What makes a standard uncertainty of an expanded one: the coverage factor or level that a column states."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from eosmuster.quantities import shown
from eosmuster.sources.measured.uncertainty import ASSUMED_LEVEL, FACTORS, LEVELS, coverage_factor


@dataclass(frozen=True)
class Coverage:
    """How far an uncertainty is expanded.

    Attributes
    ----------
    divisor : of the uncertainty; 1 for a standard one
    assumed : True if nothing usable is stated, so that the level had to be assumed
    doubt : what is to be said of it; "" if there is nothing
    """

    divisor: float = 1.0
    assumed: bool = False
    doubt: str = ""


STANDARD = Coverage()


def coverage(expanded: bool, factors: Sequence[object], level: object) -> Coverage:
    """Find how far an uncertainty is expanded, and name what is stated and cannot be used.

    Parameters
    ----------
    expanded : whether it is called so; a stated factor or level says it too
    factors : as stated, the first usable one counts; None or "" for none
    level : of confidence, %, as stated; counts where no factor is usable

    Examples
    --------
    >>> coverage(False, [None], None), coverage(True, ["2"], None).divisor
    (Coverage(divisor=1.0, assumed=False, doubt=''), 2.0)
    >>> coverage(True, ["0.1"], None).doubt
    "its coverage factor '0.1' cannot be used (valid: 0.5 to 10); 95 % is assumed"
    """
    stated, level = [one for one in factors if one not in _NOT_STATED], None if level in _NOT_STATED else level
    if not (expanded or stated or level is not None):
        return STANDARD
    numbers = [number for one in stated if _is_factor(number := _number(one))]
    divisor, assumed = coverage_factor(_number(level), numbers[0] if numbers else None)
    faults = [f"its coverage factor {shown(one)} cannot be used ({_FACTORS})" for one in stated if not numbers]
    if assumed and level is not None:
        faults.append(f"its level of confidence {shown(level)} cannot be used ({_LEVELS})")
    if assumed and not faults:
        faults = ["expanded uncertainties without a coverage factor"]
    taken = f"{ASSUMED_LEVEL:g} % is assumed" if assumed else "its level of confidence is taken"
    return Coverage(divisor, assumed, "; ".join([*faults, taken]) if faults else "")


_NOT_STATED = (None, "")
_FACTORS = f"valid: {FACTORS[0]:g} to {FACTORS[1]:g}"
_LEVELS = f"valid: {LEVELS[0]:g} to below {LEVELS[1]:g} %"


def _is_factor(number: float | None) -> bool:
    return number is not None and FACTORS[0] <= number <= FACTORS[1]


def _number(stated: object) -> float | None:
    if isinstance(stated, (int, float, str)) and re.fullmatch(r"\d{1,3}(\.\d{1,6})?", str(stated)):
        return float(stated)
    return None
