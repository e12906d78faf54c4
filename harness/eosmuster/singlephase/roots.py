"""The volumes of a cubic form at given temperature and pressure, to full precision.

With w = V/b - 1, q = a/(b R T) and p* = p b/(R T), p* = 1/w - q/P becomes the cubic

    p* w**3 + (p* B - 1) w**2 + (p* K - B + q) w - K = 0,    B = s + 2, K = 1 + s + m,

of which w > 0 has a meaning. For q > q_c the two spinodals lie on either side of the critical volume, so a root below
it is a liquid's and one above it a vapor's; for q <= q_c there is one root.

Each root is found as the largest one of a cubic, where the closed form does not cancel: a dense one in 1/w, a light
one in p* w, and near the critical point in the distance from the critical volume, with coefficients that are formed
from p*/p*_c - 1 and q/q_c - 1. Newton's method removes what rounding the closed form leaves.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.models.attraction import mean_attraction
from eosmuster.models.critical import critical_point

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

_NEAR = 0.25  # p* and q within this share of their critical values: the cubic in the distance is solved
_POLISHES = 2


@dataclass(frozen=True)
class Shape:
    """A cubic form and its critical point: arrays of one shape, or of shape () for one form.

    Attributes
    ----------
    s, m : d1 + d2 and d1 d2
    w, q, p : V_c/b - 1, and q and p* at the critical point
    b, k : B and K of the cubic
    """

    s: Floats
    m: Floats
    w: Floats
    q: Floats
    p: Floats
    b: Floats
    k: Floats


@dataclass(frozen=True)
class Point:
    """Temperature and pressure in reduced variables; arrays of one shape, or those of `Shape` broadcast to it.

    Attributes
    ----------
    p, q : p b/(R T) > 0 and a/(b R T)
    pressure, attraction : p*/p*_c - 1 and q/q_c - 1, as exact as can be: near the critical point they are what counts
    """

    p: Floats
    q: Floats
    pressure: Floats
    attraction: Floats


@dataclass(frozen=True)
class Volume:
    """A root as w = V/b - 1 and as its distance from the critical one, w - w_c; NaN where there is none."""

    w: Floats
    distance: Floats


def shape(s: Floats | float, m: Floats | float) -> Shape:
    """Give a form by s = d1 + d2 and m = d1 d2 (which are real also where d1 and d2 are complex)."""
    s, m = np.asarray(s, float), np.asarray(m, float)
    c = critical_point(s, m)
    return Shape(s, m, c.v - 1.0, c.q, c.omega_b, s + 2.0, 1.0 + s + m)


def point(form: Shape, p: Floats | float, q: Floats | float) -> Point:
    """Give a point by p* and q alone; their distances from the critical values are then as exact as subtraction."""
    p, q = np.asarray(p, float), np.asarray(q, float)
    return Point(p, q, (p - form.p) / form.p, (q - form.q) / form.q)


def liquid(form: Shape, at: Point) -> Volume:
    """Root below the critical volume, metastable ones included; NaN where there is none, as for q <= q_c."""
    found = _root(form, at, np.ones(np.shape(at.p), bool))
    return _kept(found, (at.attraction > 0.0) & (found.distance < 0.0))


def vapor(form: Shape, at: Point) -> Volume:
    """Root above the critical volume, as `liquid`."""
    found = _root(form, at, np.zeros(np.shape(at.p), bool))
    return _kept(found, (at.attraction > 0.0) & (found.distance > 0.0))


def gas(form: Shape, at: Point) -> Volume:
    """Root of the lowest Gibbs energy where it lies above the critical volume, however hot; NaN elsewhere."""
    found = stable(form, at)
    return _kept(found, found.distance > 0.0)


def stable(form: Shape, at: Point) -> Volume:
    """Root of the lowest Gibbs energy.

    Examples
    --------
    >>> form = shape(0.0, 0.0)                                     # van der Waals at 4 p*_c and q_c/2
    >>> w = float(stable(form, point(form, 0.5, 1.6875)).w)
    >>> round(1 / w - 1.6875 / (1 + w) ** 2, 12)
    0.5
    """
    several = at.attraction > 0.0
    first = _root(form, at, several)
    if not several.any():
        return first
    light = _root(form, at, np.zeros_like(several))
    better = several & (light.distance > 0.0)
    two = better & (first.distance < 0.0)
    if two.any():
        better &= ~two | (_log_fugacity_ratio(form, at, first, light) > 0.0)
    return Volume(np.where(better, light.w, first.w), np.where(better, light.distance, first.distance))


def volumes(form: Shape, at: Point) -> Floats:
    """All volumes V/b > 1, ascending, along a new first axis of three; NaN behind the last.

    The middle, unstable one follows from the product of the three w, K/p*.

    Examples
    --------
    >>> form = shape(1.0, 0.0)                                     # Redlich-Kwong at 0.5 p*_c and 1.2 q_c
    >>> v = volumes(form, point(form, 0.5 * form.p, 1.2 * form.q))
    >>> np.round(1 / (v - 1) - 1.2 * form.q / (v * (v + 1)) - 0.5 * form.p, 12) + 0.0
    array([0., 0., 0.])
    """
    low, high, only = liquid(form, at), vapor(form, at), stable(form, at)
    middle = form.k / (at.p * low.w * high.w)
    three = np.isfinite(middle)
    first = np.where(three, low.w, only.w)
    return np.asarray(1.0 + np.stack([first, np.where(three, middle, np.nan), np.where(three, high.w, np.nan)]))


def _kept(found: Volume, exists: Flags) -> Volume:
    return Volume(np.where(exists, found.w, np.nan), np.where(exists, found.distance, np.nan))


def _log_fugacity_ratio(form: Shape, at: Point, low: Volume, high: Volume) -> Floats:
    """ln(f_L/f_V): positive where the vapor is the stable one."""
    change = high.distance - low.distance
    mean = mean_attraction(1.0 + low.w, 1.0 + high.w, form.s, form.m)
    return np.asarray(np.log1p(change / low.w) - (at.q * mean + at.p) * change)


def _root(form: Shape, at: Point, dense: Flags) -> Volume:
    """Smallest w > 0 where `dense`, else the largest; where there is one root, that one."""
    dense = dense | (at.pressure > 0.0)  # above p*_c there is but one root, and it is not a light one
    near = (np.abs(at.pressure) < _NEAR) & (np.abs(at.attraction) < _NEAR)
    if near.all():
        distance = _near_critical(form, at, dense)
        return Volume(form.w + distance, distance)
    w = _far(form, at, dense)
    if not near.any():
        return Volume(w, w - form.w)
    distance = np.where(near, _near_critical(form, at, dense), w - form.w)
    return Volume(np.where(near, form.w + distance, w), distance)


def _far(form: Shape, at: Point, dense: Flags) -> Floats:
    """Scaled so that the largest root is of order one, whatever p* and q are."""
    p, q, b, k = at.p, at.q, form.b, form.k
    scale = 1.0 + p + np.abs(q) / k  # of 1/w, which is below p* + q/K
    free = 1.0 - p * b
    z = _largest_root(
        np.where(dense, ((b - q) / k - p) / scale, -free),
        np.where(dense, free / (k * scale * scale), p * (p * k - b + q)),
        np.where(dense, -p / (k * scale * scale * scale), -p * p * k),
    )
    return np.asarray(np.where(dense, 1.0 / (scale * z), z / p))


def _near_critical(form: Shape, at: Point, dense: Flags) -> Floats:
    """Distance from the critical volume."""
    c3, c2, c1, c0 = near_coefficients(form, at)
    sign = np.where(dense, -1.0, 1.0)
    return np.asarray(sign * _largest_root(sign * c2 / c3, c1 / c3, sign * c0 / c3))


def near_coefficients(form: Shape, at: Point) -> tuple[Floats, Floats, Floats, Floats]:
    """Coefficients of the cubic in the distance from the critical volume, divided by p*_c, highest power first.

    The cubic is w P (p* - p*(w)) at any state, so its derivative at a root is -w P dp*/dw.
    """
    w, b, k = form.w, form.b, form.k
    share = form.q / form.p * at.attraction
    c1 = at.pressure * (w * (3.0 * w + 2.0 * b) + k) + share
    return 1.0 + at.pressure, at.pressure * (3.0 * w + b), c1, (at.pressure * (w * (w + b) + k) + share) * w


def _largest_root(a: Floats, b: Floats, c: Floats) -> Floats:
    """Largest real root of z**3 + a z**2 + b z + c: Vieta's and Cardano's closed forms, then Newton's method.

    A step is taken where it makes the cubic smaller, so that rounding ends it and nothing else.
    """
    third = a / 3.0
    q, r = third * third - b / 3.0, third * (third * third - 0.5 * b) + 0.5 * c
    q3 = q * q * q
    one = r * r >= q3
    root = np.sqrt(np.where(one, 1.0, q))
    angle = np.arccos(np.clip(-r / (root * root * root), -1.0, 1.0))
    outer = -np.copysign(np.cbrt(np.abs(r) + np.sqrt(np.where(one, r * r - q3, 0.0))), r)
    inner = q / np.where(outer == 0.0, np.inf, outer)
    z = np.where(one, outer + inner, 2.0 * root * np.cos(angle / 3.0)) - third
    value = ((z + a) * z + b) * z + c
    for _ in range(_POLISHES):
        slope = (3.0 * z + 2.0 * a) * z + b
        trial = z - value / np.where(slope == 0.0, np.inf, slope)
        trial_value = ((trial + a) * trial + b) * trial + c
        smaller = np.abs(trial_value) < np.abs(value)  # False for NaN
        if not smaller.any():
            break
        z, value = np.where(smaller, trial, z), np.where(smaller, trial_value, value)
    return np.asarray(z)
