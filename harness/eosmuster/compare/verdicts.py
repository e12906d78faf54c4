"""Decision rules: whether a deviation is inside its tolerance, given what is known of the reference.

After JCGM 106:2012 (ISO/IEC Guide 98-4; formulas from memory) and ILAC-G8:09/2019, section 4.2. The tolerance
interval reaches from -limit to +limit around zero deviation. The rule is stated before the run:

simple (shared risk)
    inside if ``|deviation| <= limit``, else outside.
guarded (guard band w = U, the reference's expanded uncertainty)
    inside if ``|deviation| <= limit - U``, outside if ``|deviation| > limit + U``, in between undecided.
    ILAC-G8 splits the undecided at the limit into a conditional pass and a conditional fail.

Arrays have shape (m, n): m candidates at n states.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.compare.conformance import conformance_probability
from eosmuster.errors import InputError, suggestion
from eosmuster.record import POINT_VERDICTS, Floats

RULES = ("simple", "guarded")

INSIDE, OUTSIDE, UNDECIDED, UNFIT_REFERENCE, UNSOLVED, NO_REFERENCE = range(len(POINT_VERDICTS))

Flags = NDArray[np.bool_]


@dataclass(frozen=True)
class Judgement:
    """Verdicts of the points of one block, each of shape (m, n).

    Attributes
    ----------
    verdict : index into `POINT_VERDICTS`
    probability_inside : probability that the true deviation is inside the tolerance interval; NaN where there
        is no deviation or no uncertainty
    simple_rule : the point was judged by the simple rule because the reference's uncertainty is unknown
    """

    verdict: NDArray[np.int8]
    probability_inside: Floats
    simple_rule: Flags


def unsolved_mask(predicted: ArrayLike, reference: ArrayLike) -> Flags:
    """Tell where a candidate owes a value: the reference has one and the candidate does not.

    Where both are missing the point is `no_reference`: nothing can be judged there whatever the candidate
    does, and all candidates are then judged on the same states.

    Examples
    --------
    >>> unsolved_mask([[1.0, float("nan"), float("nan")]], [1.0, 1.0, float("nan")])
    array([[False,  True, False]])
    """
    return np.asarray(~np.isfinite(predicted) & np.isfinite(reference))


def acceptance_pct(limit_pct: ArrayLike, uncertainty_pct: ArrayLike, rule: str) -> Floats:
    """Give the acceptance limit: the limit less the guard band U; the limit itself where U is unknown (NaN).

    Negative where U exceeds the limit: then nothing can be inside.

    Examples
    --------
    >>> acceptance_pct(2.0, [0.5, float("nan"), 3.0], "guarded")
    array([ 1.5,  2. , -1. ])
    """
    limit, uncertainty = np.asarray(limit_pct, float), np.asarray(uncertainty_pct, float)
    guard = np.where(np.isnan(uncertainty), 0.0, uncertainty) if check_rule(rule) == "guarded" else 0.0
    return np.asarray(limit - guard)


def margin(deviation_pct: ArrayLike, limit_pct: ArrayLike, uncertainty_pct: ArrayLike, rule: str) -> Floats:
    """Give how far inside its acceptance limit a deviation is, in percent points: zero or more is inside.

    Examples
    --------
    >>> margin([1.0, -1.75, 2.0], 2.0, 0.5, "guarded")
    array([ 0.5 , -0.25, -0.5 ])
    """
    return np.asarray(acceptance_pct(limit_pct, uncertainty_pct, rule) - np.abs(deviation_pct))


def judge(
    deviation_pct: Floats,
    limit_pct: ArrayLike,
    uncertainty_pct: ArrayLike,
    unsolved: Flags,
    *,
    rule: str = "guarded",
    coverage_factor: float = 2.0,
    unfit_ratio: float = 1.0 / 3.0,
) -> Judgement:
    """Judge every point of a block.

    Parameters
    ----------
    deviation_pct : (m, n), signed, NaN where candidate or reference has no value
    limit_pct : broadcastable to (m, n), positive wherever there is a deviation
    uncertainty_pct : broadcastable to (m, n), expanded uncertainty U of the reference; NaN where unknown:
        such points are judged by the simple rule and have no probability
    unsolved : (m, n), see `unsolved_mask`; a point without deviation is `unsolved` there, else `no_reference`
    rule : ``simple`` or ``guarded``
    coverage_factor : k of U = k u, with u the standard uncertainty of a normal distribution
    unfit_ratio : an undecided point is `unfit_reference` if U is larger than this share of the limit; a gross
        failure stays `outside`. Not a published number: a setting of the plan

    Raises
    ------
    InputError
        unknown rule; a limit or coverage factor that is not positive; a negative uncertainty

    Examples
    --------
    >>> d = np.array([[0.5, 1.8, 2.5, np.nan]])
    >>> j = judge(d, 2.0, 0.3, np.isnan(d))
    >>> [POINT_VERDICTS[v] for v in j.verdict[0]]
    ['inside', 'undecided', 'outside', 'unsolved']
    """
    guarded = check_rule(rule) == "guarded"
    limit, uncertainty = np.asarray(limit_pct, float), np.asarray(uncertainty_pct, float)
    size = np.abs(deviation_pct)
    missing = np.isnan(deviation_pct)
    _check_numbers(limit, uncertainty, missing, coverage_factor)
    guard = np.where(np.isnan(uncertainty), 0.0, uncertainty) if guarded else np.zeros(())
    between = np.where(guard > unfit_ratio * limit, UNFIT_REFERENCE, UNDECIDED)
    verdict = np.where(size <= limit + guard, between, OUTSIDE)
    verdict = np.where(size <= acceptance_pct(limit, uncertainty, rule), INSIDE, verdict)
    verdict = np.where(missing, np.where(unsolved, UNSOLVED, NO_REFERENCE), verdict)
    probability = conformance_probability(size, uncertainty / coverage_factor, -limit, limit)
    return Judgement(verdict.astype(np.int8), probability, np.isnan(uncertainty) & ~missing)


def check_rule(rule: str) -> str:
    """Return a known decision rule, or say which ones there are.

    Raises
    ------
    InputError
        the rule is unknown
    """
    if rule not in RULES:
        raise InputError(f"decision rule {rule!r} is unknown ({suggestion(rule, RULES)})")
    return rule


def _check_numbers(limit: Floats, uncertainty: Floats, missing: Flags, coverage_factor: float) -> None:
    if not coverage_factor > 0:
        raise InputError(f"coverage factor {coverage_factor!r} is not valid: a number above 0 is, 2 as a rule")
    if not (ok := (limit > 0) & np.isfinite(limit) | missing).all():
        worst = np.broadcast_to(limit, ok.shape)[~ok][0]
        raise InputError(f"limit {worst} % is not valid: a finite number above 0 is")
    if (uncertainty < 0).any():
        raise InputError(f"uncertainty {np.nanmin(uncertainty)} % is not valid: 0 or more is, or NaN for unknown")


def tally(verdict: NDArray[np.int8]) -> NDArray[np.intp]:
    """Count the verdicts of each candidate: shape (m, 6), columns in the order of `POINT_VERDICTS`.

    Examples
    --------
    >>> tally(np.array([[0, 0, 1, 4]], np.int8))
    array([[2, 1, 0, 0, 1, 0]])
    """
    return np.stack([(verdict == code).sum(axis=1) for code in range(len(POINT_VERDICTS))], axis=1)


def summary_verdict(counts: Sequence[int] | NDArray[np.intp]) -> str:
    """Give the verdict of a summary row from the counts of its points, in the order of `POINT_VERDICTS`.

    In this order: `inside` if every point is inside; `undecided` if nothing is outside or unsolved; `outside`
    if no point is inside; else `partly`. States without a reference (`no_reference`) are counted beside and
    change no verdict. Where nothing was judged at all the row is `undecided`, never `inside`. `unavailable`
    is the caller's: it has no points.

    Examples
    --------
    >>> [summary_verdict(c) for c in ([41, 0, 0, 0, 0, 0], [40, 0, 0, 0, 1, 0], [0, 0, 0, 0, 0, 41])]
    ['inside', 'partly', 'undecided']
    """
    inside, outside, undecided, unfit_reference, unsolved, _no_reference = counts
    if inside and not (outside or undecided or unfit_reference or unsolved):
        return "inside"
    if not (outside or unsolved):
        return "undecided"
    return "partly" if inside else "outside"


def passing_limit_pct(
    deviation_pct: Floats, uncertainty_pct: ArrayLike, verdict: NDArray[np.int8], rule: str
) -> Floats:
    """Give each candidate's smallest limit, one for all its states, at which every point would be inside.

    The largest ``|deviation|``, plus U where the rule is guarded and U is known. Shape (m,); NaN where a
    point is unsolved (no limit would do) or none was judged. Judging at this very limit gives only `inside`.

    Examples
    --------
    >>> passing_limit_pct(np.array([[1.0, -2.5]]), [0.1, 0.2], np.zeros((1, 2), np.int8), "guarded")
    array([2.7])
    """
    size = np.abs(deviation_pct)
    guard = -acceptance_pct(0.0, uncertainty_pct, rule)
    needed = size + guard
    # one step up where rounding would leave the point just outside its own passing limit
    needed = np.where(needed - guard < size, np.nextafter(needed, np.inf), needed)
    largest = np.where(np.isnan(needed), -np.inf, needed).max(axis=1, initial=-np.inf)
    hopeless = (verdict == UNSOLVED).any(axis=1) | np.isneginf(largest)
    return np.where(hopeless, np.nan, largest)


def surely_passing_limit_pct(deviation_pct: Floats, uncertainty_pct: ArrayLike, verdict: NDArray[np.int8]) -> Floats:
    """Give each candidate's smallest limit at which every point would surely be inside: abs(deviation) + U.

    Shape (m,); NaN where a point is unsolved, none was judged, or U is unknown at any of the judged points.

    Examples
    --------
    >>> surely_passing_limit_pct(np.array([[1.0, -2.5]]), [0.1, 0.2], np.zeros((1, 2), np.int8))
    array([2.7])
    >>> surely_passing_limit_pct(np.array([[1.0, -2.5]]), [0.1, np.nan], np.zeros((1, 2), np.int8))
    array([nan])
    """
    judged = ~np.isnan(deviation_pct)
    unknown = (judged & np.isnan(np.asarray(uncertainty_pct, np.float64))).any(axis=1)
    return np.where(unknown, np.nan, passing_limit_pct(deviation_pct, uncertainty_pct, verdict, "guarded"))


def false_acceptance_pct(probability_inside: Floats, verdict: NDArray[np.int8]) -> Floats:
    """Give each candidate's risk of false acceptance: mean of 1 - p over its `inside` points, in percent.

    Shape (m,); points without a probability are left out, and the risk is NaN where none remains.

    Examples
    --------
    >>> false_acceptance_pct(np.array([[1.0, 0.98, 0.1]]), np.array([[0, 0, 1]], np.int8)).round(12)
    array([1.])
    """
    counted = (verdict == INSIDE) & ~np.isnan(probability_inside)
    count = counted.sum(axis=1)
    risk = np.where(counted, 1.0 - probability_inside, 0.0).sum(axis=1)
    return np.asarray(100.0 * risk / np.where(count > 0, count, np.nan))
