"""Bracketing root and extremum search over many brackets at once, sparing with evaluations.

The function searched is a margin: zero or more is inside; below zero or NaN (no value) is not.
"""

from __future__ import annotations

from collections.abc import Callable, Generator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.record import Floats

Ints = NDArray[np.intp]
Flags = NDArray[np.bool_]
Margin = Callable[[Ints, Floats], Floats]
"""Called with bracket numbers and a temperature for each; gives the margins there."""
Seeking = Generator[tuple[Ints, Floats], Floats, tuple[Flags, Floats, Floats]]

TOLERANCE_K = 1e-6

_INTERPOLATIONS = 20
"""After so many steps only bisection is left, which bounds the work whatever the function does."""

_EVALUATIONS = 8  # of one interval at most, in `seek`


@dataclass(frozen=True)
class Refined:
    """Both sides of each located end, shape (k,), no further apart than the tolerance (if steps sufficed).

    Attributes
    ----------
    inside, outside : temperatures, K; the margin is >= 0 at `inside`, and negative or NaN at `outside`
    margin_inside, margin_outside : the margins there
    """

    inside: Floats
    outside: Floats
    margin_inside: Floats
    margin_outside: Floats


def refine(
    evaluate: Margin,
    t_in: Floats,
    t_out: Floats,
    g_in: Floats,
    g_out: Floats,
    *,
    guess: Floats | None = None,
    tolerance_K: float = TOLERANCE_K,
    max_iterations: int = 100,
) -> Refined:
    """Close in on the temperature where each margin changes sign.

    Inverse quadratic interpolation where it can be trusted and bisection elsewhere, by the criterion of
    T. R. Chandrupatla, Adv. Eng. Software 28 (1997) 145 (from memory); every step stays half a tolerance away
    from both sides, so that the far side comes near as well. Next to a NaN there is only bisection, and the
    first step tries the rim: where the margin is good up to a known edge one evaluation settles it. Only
    brackets wider than the tolerance are evaluated.

    Parameters
    ----------
    evaluate : called with the numbers of the brackets still open and one temperature for each
    t_in, t_out : (k,), in either order, K
    g_in, g_out : (k,), margins there, ``g_in >= 0`` and ``g_out < 0`` or NaN
    guess : (k,), first temperatures to try; NaN where there is no better guess than the secant
    tolerance_K : largest distance of the two sides in the end
    max_iterations : steps at most; 20 + log2(bracket/tolerance) always suffice

    Examples
    --------
    >>> t_in, t_out, g_in, g_out = np.array([[250.0], [400.0], [50.0], [-100.0]])
    >>> r = refine(lambda i, t: 300.0 - t, t_in, t_out, g_in, g_out)
    >>> bool(300.0 - 1e-6 <= r.inside[0] <= 300.0 < r.outside[0])
    True
    """
    # columns: newest, opposite and previous temperature; then the margins there
    state = np.full((6, len(t_in)), np.nan)
    state[0], state[1], state[3], state[4] = t_in, t_out, g_in, g_out
    for iteration in range(max_iterations):
        open_ = np.flatnonzero(np.abs(state[1] - state[0]) > tolerance_K)
        if not open_.size:
            break
        now = state[:, open_]
        a, b, _, fa, fb, _ = now
        if iteration == 0:
            share = _first_share(now, None if guess is None else guess[open_], tolerance_K)
        elif iteration <= _INTERPOLATIONS:
            share = _share(now)
        else:
            share = np.full(len(open_), 0.5)
        nearest = 0.5 * tolerance_K / np.abs(b - a)
        x = a + np.clip(share, nearest, 1.0 - nearest) * (b - a)
        f = evaluate(open_, x)
        same = (f >= 0) == (fa >= 0)
        state[:, open_] = (
            x, np.where(same, b, a), np.where(same, a, b), f, np.where(same, fb, fa), np.where(same, fa, fb)
        )  # fmt: skip
    newest = state[3] >= 0
    t, g = (np.where(newest, state[[i, i + 1]], state[[i + 1, i]]) for i in (0, 3))
    return Refined(t[0], t[1], g[0], g[1])


def _first_share(state: Floats, guess: Floats | None, tolerance_K: float) -> Floats:
    """Share of the way from a to b to try first: the guess, else the secant, else (b is NaN) the rim at b."""
    a, b, _, fa, fb, _ = state
    rim = 1.0 - 0.5 * tolerance_K / np.abs(b - a)
    with np.errstate(all="ignore"):
        share = np.where(np.isnan(fb), rim, fa / (fa - fb))
    share = share if guess is None else np.where(np.isnan(guess), share, (guess - a) / (b - a))
    return np.where(np.isfinite(share), share, 0.5)


def _share(state: Floats) -> Floats:
    """Share of the way from a to b to try next: inverse quadratic where Chandrupatla trusts it, else half."""
    a, b, c, fa, fb, fc = state
    with np.errstate(all="ignore"):
        xi, phi = (a - b) / (c - b), (fa - fb) / (fc - fb)
        trusted = (phi * phi < xi) & ((1.0 - phi) ** 2 < 1.0 - xi)
        share = fa / (fb - fa) * fc / (fb - fc) + (c - a) / (b - a) * fa / (fc - fa) * fb / (fc - fb)
    return np.where(trusted & np.isfinite(share), share, 0.5)


def polynomial_guess(t: Floats, g: Floats) -> Floats:
    """Guess where the margin is zero between the middle two of four neighbouring points.

    Parameters
    ----------
    t, g : (k, 4), temperatures and margins; the outer columns are NaN where there is no such neighbour, and
        the polynomial is then a quadratic or a straight line

    Returns
    -------
    (k,), strictly between the middle two where those differ in sign; NaN where either of them is NaN.

    Examples
    --------
    >>> t = np.array([[0.0, 1.0, 2.0, 3.0]])
    >>> float(polynomial_guess(t, 2.0 - t**2)[0].round(6))
    1.414214
    """
    t0, t1, t2, t3 = t.T
    g0, g1, g2, g3 = g.T
    with np.errstate(all="ignore"):
        slope = (g2 - g1) / (t2 - t1)
        bend_left = (slope - (g1 - g0) / (t1 - t0)) / (t2 - t0)
        bend_right = ((g3 - g2) / (t3 - t2) - slope) / (t3 - t1)
        bend = np.where(np.isnan(bend_left), np.nan_to_num(bend_right), bend_left)
        twist = np.nan_to_num((bend_right - bend_left) / (t3 - t0))
        # Newton's form g1 + x (slope + y (bend + twist z)), and Newton's method on it
        x = -g1 / slope
        for _ in range(4):
            y, z = x + (t1 - t2), x + np.where(np.isnan(t0), 0.0, t1 - t0)
            curve = bend + twist * z
            value = g1 + x * (slope + y * curve)
            steepness = slope + y * curve + x * (curve + y * twist)
            x = np.clip(x - value / steepness, 0.0, t2 - t1)
    return np.asarray(t1 + x)


def seek(t: Floats, g: Floats, guess: Floats) -> Seeking:
    """Look between two points whose margins have one sign for a point where the margin has the other.

    Successive parabolic interpolation towards the extremum (R. P. Brent, Algorithms for Minimization without
    Derivatives, 1973, chapter 5; from memory), given up as soon as the parabola has no extremum between its
    outer points, or one further from zero than twice what the parabola before was wrong by.

    Parameters
    ----------
    t, g : (k, 2), both ends of each interval (rising) and the margins there
    guess : (k,), where the extremum may be, within the interval

    Yields
    ------
    numbers of intervals and a temperature for each, to be sent the margins there

    Returns
    -------
    found, temperature, margin : (k,), whether, and where, the sign changed

    Examples
    --------
    >>> t = np.array([[1.0, 2.0]])
    >>> search = seek(t, np.cos(6 * t) + 0.99, np.array([1.5]))
    >>> index, x = next(search)
    >>> search.send(np.cos(6 * x) + 0.99)[1].round(2).tolist()
    [1.51]
    """
    sign = np.where(g[:, 0] >= 0, 1.0, -1.0)
    # rows: left, middle, right; y is the margin turned so that it has to fall through zero
    x, y = np.stack([t[:, 0], guess, t[:, 1]]), np.stack([g[:, 0], np.full(len(t), np.nan), g[:, 1]]) * sign
    found = np.zeros(len(t), np.bool_)
    where, margin = np.full(len(t), np.nan), np.full(len(t), np.nan)
    open_, trial, predicted = np.arange(len(t)), guess, np.full(len(t), np.inf)
    for _ in range(_EVALUATIONS):
        if not open_.size:
            break
        value = yield open_, trial
        hit = (value >= 0) != (sign[open_] > 0)
        found[open_], where[open_], margin[open_] = hit, trial, value
        left, turned = open_[~hit], (value * sign[open_])[~hit]
        x[:, left], y[:, left] = _narrower(x[:, left], y[:, left], trial[~hit], turned)
        vertex, lowest = _vertex(x[:, left], y[:, left])
        promising = lowest < 2.0 * np.abs(turned - predicted[~hit])
        open_, trial, predicted = left[promising], vertex[promising], lowest[promising]
    return found, where, margin


def _narrower(x: Floats, y: Floats, trial: Floats, value: Floats) -> tuple[Floats, Floats]:
    """Put a new point into each triple and drop the outer point that is no longer needed."""
    first = np.isnan(y[1])
    lower, before = value < y[1], trial < x[1]
    left = np.where(first | (lower == before), 0, np.where(lower, 1, 3))
    middle = np.where(first | lower, 3, 1)
    right = np.where(first | (lower != before), 2, np.where(lower, 1, 3))
    pick, row = np.stack([left, middle, right]), np.arange(x.shape[1])
    return np.vstack([x, trial])[pick, row], np.vstack([y, value])[pick, row]


def _vertex(x: Floats, y: Floats) -> tuple[Floats, Floats]:
    """Lowest point of each triple's parabola and the value there; NaN where it is not a new point within."""
    with np.errstate(all="ignore"):
        slope = (y[1] - y[0]) / (x[1] - x[0])
        bend = ((y[2] - y[1]) / (x[2] - x[1]) - slope) / (x[2] - x[0])
        vertex = 0.5 * (x[0] + x[1]) - 0.5 * slope / bend
        lowest = y[0] + (vertex - x[0]) * (slope + bend * (vertex - x[1]))
        new = np.abs(vertex - x[1]) > TOLERANCE_K
    return vertex, np.where((bend > 0) & (vertex > x[0]) & (vertex < x[2]) & new, lowest, np.nan)
