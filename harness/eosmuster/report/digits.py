"""The shortest decimal text that reads back to the same double, for whole arrays at once.

`repr` of a float costs about a microsecond, which would be most of the cost of a points file. Here x is
scaled to an integer of 17 digits in double-double arithmetic, whether 15, 16 or 17 digits identify it is
decided against half a unit in its last place, and the text is put together in four 8-byte words.
Whatever is delicate (a decision within 1e-9 of its border, a power of two, an exponent beyond 250, an
infinity) goes through `repr`, so the text is that of `repr` in every case.
"""

from __future__ import annotations

from decimal import Context, Decimal
from functools import cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
Words = NDArray[np.uint64]
Bytes = NDArray[np.uint8]
Mask = NDArray[np.bool_]

WIDTH = 32
"""Bytes a number may take, NUL where there is none: four words, little end first.

Word 0: sign, up to five characters of "0.000", first digit, point; words 1 and 2: the other 16 digits
with a point among them; word 3: the digit that the point pushed out, the exponent.
"""

_DIGITS = 17
_LARGEST_EXPONENT = 250
_FIXED_FROM, _FIXED_BELOW = -4, 16  # `repr` writes 1e-4 <= abs(x) < 1e16 without an exponent
_SPLITTER = 134217729.0  # 2**27 + 1: Veltkamp's splitting, as in T. J. Dekker, Numer. Math. 18 (1971) 224
_ALL = 2**64 - 1
_ZEROS = np.uint64(int.from_bytes(b"00000000", "little"))
_POINT = int.from_bytes(b".", "little")
_FIRST = tuple(  # masks of the bytes of words 1 and 2 that hold the first 0..16 digits
    np.array([(1 << 8 * min(max(count - 8 * word, 0), 8)) - 1 for count in range(_DIGITS)], dtype=np.uint64)
    for word in range(2)
)
_BYTE, _HALF, _SEVEN = np.uint64(8), np.uint64(32), np.uint64(56)


class _Tables(NamedTuple):
    """Everything that depends on the decimal exponent alone, indexed by exponent + _LARGEST_EXPONENT."""

    high: Floats  # 10**(16 - exponent) = high + low
    low: Floats
    top: Floats  # high = top + rest, so that products with a split number are exact
    rest: Floats
    lead: Words  # "0.00" before the digits (word 0)
    tail: Words  # "e-05" behind them (word 3)
    least: NDArray[np.int64]  # digits behind the first that are written even if they are zeros
    scientific: Mask
    keep: tuple[Words, Words]  # what stays before the point, in words 1 and 2
    point: tuple[Words, Words]
    quads: Words  # four digits of 0..9999


@cache
def _tables() -> _Tables:
    exponents = range(-_LARGEST_EXPONENT, _LARGEST_EXPONENT + 1)
    exact = [Decimal(10) ** (_DIGITS - 1 - e) for e in exponents]
    high = np.array([float(power) for power in exact])
    context = Context(prec=60)
    low = np.array([float(context.subtract(p, Decimal(float(p)))) for p in exact])
    top = high * _SPLITTER - (high * _SPLITTER - high)
    fixed = [_FIXED_FROM <= e < _FIXED_BELOW for e in exponents]
    inserted = [_insertion(e) if 0 < e < _FIXED_BELOW else (_ALL, _ALL, 0, 0) for e in exponents]
    keep_1, keep_2, point_1, point_2 = (np.array(column, dtype=np.uint64) for column in zip(*inserted, strict=True))
    return _Tables(
        high,
        low,
        top,
        high - top,
        _words([_lead(e) for e in exponents]),
        _words(["" if f else f"\0e{e:+03d}" for f, e in zip(fixed, exponents, strict=True)]),
        np.array([e + 1 if 0 <= e < _FIXED_BELOW else 0 for e in exponents]),
        ~np.array(fixed),
        (keep_1, keep_2),
        (point_1, point_2),
        _words([f"{i:04d}" for i in range(10000)]),
    )


def _words(texts: list[str]) -> Words:
    return np.array([int.from_bytes(text.encode(), "little") for text in texts], dtype=np.uint64)


def _lead(exponent: int) -> str:
    """Give word 0 short of sign and first digit: zeros before it, or the point behind it."""
    if _FIXED_FROM <= exponent < 0:
        return "\0" + "0." + "0" * (-exponent - 1)
    return "\0" * 7 + "." if exponent == 0 else ""


def _insertion(place: int) -> tuple[int, int, int, int]:
    """Keep `place` of the 16 digits before the point: masks and points of words 1 and 2."""
    word, byte = divmod(place, 8)
    keep, point = (1 << 8 * byte) - 1, _POINT << 8 * byte
    return (keep, 0, point, 0) if word == 0 else (_ALL, keep, 0, point)


def digits(values: Floats) -> Bytes:
    """Write numbers as `repr` does, one a row, padded with NUL bytes anywhere in the row.

    Parameters
    ----------
    values : shape (n,)

    Returns
    -------
    shape (n, WIDTH), ASCII; a row of NUL alone for NaN. Dropping the NUL bytes leaves the text.

    Examples
    --------
    >>> [row.tobytes().replace(bytes(1), b"") for row in digits(np.array([0.1, -1e-7, np.nan]))]
    [b'0.1', b'-1e-07', b'']
    """
    values = np.ascontiguousarray(values, dtype=np.float64)
    size = np.abs(values)
    with np.errstate(divide="ignore", invalid="ignore"):
        exponent = np.floor(np.log10(size))
    plain = np.abs(exponent) <= _LARGEST_EXPONENT  # false for zero, NaN and infinity
    size = np.where(plain, size, 0.0)
    k = np.where(plain, exponent, 0.0).astype(np.int64) + _LARGEST_EXPONENT
    number, settled = _shortest(size, k)
    out = _spell(number, k, np.signbit(values))
    settled &= plain | (values == 0.0)
    empty = np.isnan(values)
    out[empty] = 0
    rest = np.flatnonzero(~(settled | empty))
    if rest.size:
        spelled = np.array([repr(value) for value in values[rest].tolist()], dtype=f"S{WIDTH}")
        out[rest] = spelled.view(np.uint8).reshape(rest.size, WIDTH)
    return out


def texts(values: Floats) -> list[bytes]:
    """Write numbers as `repr` does, NaN as nothing.

    Examples
    --------
    >>> texts(np.array([300.0, np.nan]))
    [b'300.0', b'']
    """
    values = np.asarray(values, dtype=np.float64)
    lines = np.empty((len(values), WIDTH + 1), dtype=np.uint8)
    lines[:, :WIDTH] = digits(values)
    lines[:, WIDTH] = ord("\n")
    return lines.tobytes().translate(None, b"\0").split(b"\n")[:-1]


def _shortest(size: Floats, k: Integers) -> tuple[Integers, Mask]:
    """Scale to 17 digits, round to the fewest that identify the number; tell where that is certain."""
    whole, fraction, half_ulp = _scaled(size, k)
    settled = np.abs(np.abs(fraction) - 0.5) > 1e-9
    below = fraction < 0.0
    number, exact = whole, below
    for unit in (10, 100):  # 16 digits, then 15
        rounded = (whole + (unit // 2 - below)) // unit * unit
        error = np.abs((rounded - whole) - fraction)
        number = np.where(error < half_ulp, rounded, number)
        exact = error == 0.0
        settled &= (np.abs(error - half_ulp) > 1e-9 * half_ulp) & (np.abs(error - unit // 2) > 1e-9)
    # the gap below a power of two is half as wide as the one above it
    settled &= (np.frexp(size)[0] != 0.5) | exact
    settled &= (number >= 10 ** (_DIGITS - 1)) & (number < 10**_DIGITS)  # the exponent was right
    return number, settled | (size == 0.0)


def _scaled(size: Floats, k: Integers) -> tuple[Integers, Floats, Floats]:
    """Return x 10**(16 - exponent) as a whole number and a fraction, and half an ulp of x on that scale."""
    tables = _tables()
    high, top, rest = tables.high[k], tables.top[k], tables.rest[k]
    product = size * high
    x_top = size * _SPLITTER
    x_top -= x_top - size
    x_rest = size - x_top
    error = ((x_top * top - product) + x_top * rest + x_rest * top) + x_rest * rest
    error += size * tables.low[k]
    nearest = np.rint(error)
    # above 2**53 a double is a whole number already
    return product.astype(np.int64) + nearest.astype(np.int64), error - nearest, 0.5 * np.spacing(size) * high


def _spell(number: Integers, k: Integers, negative: Mask) -> Bytes:
    """Put together sign, leading zeros, digits with their point, and exponent."""
    tables = _tables()
    first, word_1, word_2 = _spelled(number)
    last = np.maximum(_last_digit(word_1, word_2), tables.least[k])
    out = np.empty((len(number), 4), dtype="<u8")
    out[:, 0] = tables.lead[k] | (first << np.uint64(48)) | negative * np.uint64(ord("-"))
    out[:, 0] |= (tables.scientific[k] & (last > 0)) * np.uint64(_POINT << 56)
    carry: Words | int = 0
    for column, word in ((1, word_1), (2, word_2)):
        keep, point = tables.keep[column - 1][k], tables.point[column - 1][k]
        written = word & _FIRST[column - 1][last]
        moved = written & ~keep
        out[:, column] = (written & keep) | point | (moved << _BYTE) | carry
        carry = moved >> _SEVEN
    out[:, 3] = tables.tail[k] | carry
    return out.view(np.uint8)


def _spelled(number: Integers) -> tuple[Words, Words, Words]:
    """Return the first digit and the other 16 as two words of ASCII."""
    quads = _tables().quads
    fours = []
    for _ in range(4):
        rest = number // 10000
        fours.append(quads[number - rest * 10000])
        number = rest
    first = number.astype(np.uint64) + np.uint64(ord("0"))
    return first, fours[3] | (fours[2] << _HALF), fours[1] | (fours[0] << _HALF)


def _last_digit(word_1: Words, word_2: Words) -> Integers:
    """Count the digits behind the first one up to the last that is not 0."""
    # the binary exponent tells the highest byte in use: a digit is at most 9, so rounding never carries
    in_1, in_2 = (np.frexp((word ^ _ZEROS).astype(np.float64))[1] for word in (word_1, word_2))
    return np.where(in_2 > 0, (in_2 + 71) // 8, (in_1 + 7) // 8).astype(np.int64)
