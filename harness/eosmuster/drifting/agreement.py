"""When two numbers of two runs are one: what rounding, another processor or another library build may leave.

With the tolerance t (1e-6 unless another is asked for):

- means of predictions, references, limits and uncertainties agree within t of themselves;
- statistics of deviations are percentages, and a relative difference d of a property moves them by 100 d percent
  points however small they are. They agree within t of themselves or t percent points, whichever is more, so 1e-9 of
  noise in a property (1e-7 percent points) passes;
- the risk of false acceptance is steep: where the limit lies at the edge of the uncertainty U (k = 2), 1e-7 percent
  points of a deviation are 1e-7 * 80/U percent points of it, 1e-3 for a U of 0.01 %. It agrees within 1000 t;
- temperatures and pressures agree within t of themselves, except for the place of the largest deviation, which may
  jump between two equal ones and counts as part of the statistics;
- ends of windows agree within 1000 t kelvin, but never less than 1e-6 K, to which they are located: a deviation may
  cross its limit at 1e-4 %/K only;
- regions agree as `eosmuster.drifting.regions` has it;
- counts, verdicts and other text must be equal; notes must be equal apart from the numbers in them, which repeat
  what the columns say.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from dataclasses import dataclass, fields

from eosmuster.errors import InputError
from eosmuster.quantities import shown
from eosmuster.record import SummaryRow, WindowRow

DEFAULT = 1e-6
"""The tolerance unless another is asked for."""

MEANS = ("mean_predicted", "mean_reference", "mean_limit_pct", "mean_uncertainty_pct")

_KEY = ("component", "candidate", "property", "reference_source")
_FOLLOWING = ("max_at_K", "max_at_Pa", "share_inside")  # other columns say the same
_PLACES = ("from_K", "to_K")
_STEEP = "false_acceptance_pct"
_TYPES = {field.name: str(field.type) for field in fields(SummaryRow)}
_COLUMNS = tuple(name for name in _TYPES if name not in (*_KEY, *_FOLLOWING))
STEEPNESS = 1e3
"""How many times the tolerance what is steep may move: risks, ends of windows in kelvin, edges of regions."""

_LOCATED = 1e-6  # K
_DIGITS = re.compile(r"\d[\d.]*(?:[eE][-+]?\d+)?")


@dataclass(frozen=True)
class Agreement:
    """Compare the numbers of two runs; see the module's text.

    Attributes
    ----------
    tolerance : relative, above 0 and at most 0.1
    """

    tolerance: float = DEFAULT

    def __post_init__(self) -> None:
        if not 0.0 < self.tolerance <= 0.1:
            raise InputError(f"tolerance = {self.tolerance!r} is not valid: above 0 and at most 0.1 is, e.g. 1e-6")

    @property
    def of_cause(self) -> float:
        """Relative difference of a prediction or a reference that moves a statistic by more than its tolerance.

        100 times this is the tolerance in percent points.
        """
        return self.tolerance / 100.0

    def numbers(self, old: float, new: float) -> bool:
        """Tell whether two numbers agree relatively; two unknown ones do.

        Examples
        --------
        >>> Agreement().numbers(1e5, 1e5 + 0.05), Agreement().numbers(1e5, 1e5 + 0.2)
        (True, False)
        """
        return _close(old, new, self.tolerance, 0.0)

    def percents(self, old: float, new: float) -> bool:
        """Tell whether two statistics of deviations agree.

        Examples
        --------
        >>> Agreement().percents(1e-9, 2e-7), Agreement().percents(0.5, 0.500002)
        (True, False)
        """
        return _close(old, new, self.tolerance, self.tolerance)

    def column(self, name: str, old: float | str, new: float | str) -> bool:
        """Tell whether two cells of summary.csv agree."""
        if isinstance(old, str) or isinstance(new, str):
            return old == new if name != "note" else _wording(str(old)) == _wording(str(new))
        if _TYPES[name] == "int":
            return old == new
        if name == _STEEP:
            return _close(old, new, self.tolerance, STEEPNESS * self.tolerance)
        return self.numbers(old, new) if name in (*_PLACES, *MEANS) else self.percents(old, new)

    def moved(self, old: SummaryRow, new: SummaryRow) -> Iterator[str]:
        """Name the columns in which two rows of one key do not agree."""
        for name in _COLUMNS:
            if not self.column(name, getattr(old, name), getattr(new, name)):
                yield name

    def windows(self, old: WindowRow, new: WindowRow) -> bool:
        """Tell whether two windows agree, ends and reasons."""
        kelvin = max(_LOCATED, STEEPNESS * self.tolerance)
        ends = ((old.from_K, new.from_K), (old.to_K, new.to_K))
        same = all(_close(a, b, 0.0, kelvin) for a, b in ends)
        return same and (old.from_end, old.to_end) == (new.from_end, new.to_end)


def read_tolerance(text: str) -> float:
    """Read a tolerance from the command line.

    Raises
    ------
    InputError : no number, or out of range

    Examples
    --------
    >>> read_tolerance("1e-9")
    1e-09
    """
    try:
        return Agreement(float(text)).tolerance
    except ValueError:
        raise InputError(f"--tolerance {shown(text)} is not a number; write e.g. 1e-6") from None


def _close(old: float, new: float, relative: float, absolute: float) -> bool:
    if math.isnan(old) or math.isnan(new):
        return math.isnan(old) and math.isnan(new)
    return math.isclose(old, new, rel_tol=relative, abs_tol=absolute)


def _wording(note: str) -> str:
    return _DIGITS.sub("#", note)
