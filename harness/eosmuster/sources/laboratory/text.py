"""How a laboratory file is written: its characters, its delimiter, its lines and its numbers. Nothing is guessed."""

from __future__ import annotations

import codecs
import csv
import math
import re
from collections.abc import Iterator
from dataclasses import dataclass

from eosmuster.errors import InputError
from eosmuster.quantities import shown

LARGEST_FILE = 64 << 20
"""Bytes; a table that people write and read is far smaller."""

DELIMITERS = {",": "commas", ";": "semicolons", "\t": "tabs", "|": "bars"}

_PLAIN = re.compile(
    r"[+-]?(?:\d+(?P<decimals>\.\d*)?|(?P<bare>\.\d+))(?:[eE](?P<exponent>[+-]?\d{1,3}))?\Z", re.ASCII
)
_LINE_END = re.compile("\r\n|\r|\n")
_SEPARATED = re.compile(r"[+-]?\d[\d.,' \u00a0\u2009\u202f_]*[\d.,](?:[eE][+-]?\d+)?\Z", re.ASCII)


@dataclass(frozen=True)
class Number:
    """A number as printed: its value, half a unit of its last digit, and its significant digits (0 for none)."""

    value: float
    half_unit: float
    digits: int


@dataclass(frozen=True)
class Style:
    """How numbers of a column are written: decimal character and, if declared, the one between thousands."""

    decimal: str = "."
    group: str = ""


PLAIN = Style()


def decoded(data: bytes) -> tuple[str, str]:
    r"""Give the text of a file, and a remark if it is not UTF-8; a byte order mark decides, and is dropped.

    >>> decoded(b"\xef\xbb\xbfa;b"), decoded("20 °C".encode("cp1252"))[1]
    (('a;b', ''), 'it is not UTF-8 and was read as Windows-1252')
    """
    if data.startswith((codecs.BOM_UTF16_LE, codecs.BOM_UTF16_BE)):
        return data.decode("utf-16", errors="replace"), "it was read as UTF-16, by its byte order mark"
    try:
        return data.decode("utf-8-sig"), ""
    except UnicodeDecodeError:
        return data.decode("cp1252", errors="replace"), "it is not UTF-8 and was read as Windows-1252"


def header_of(text: str) -> str:
    """Give the first line that is not empty and no comment; "" if there is none."""
    return next((line for line in _LINE_END.split(text) if line.strip() and not line.lstrip().startswith("#")), "")


def delimiter_of(header: str) -> str:
    """Find the delimiter by the header, outside of quotes and brackets.

    Raises `InputError` if there is none, or two occur equally often.

    >>> delimiter_of('temperature [K];"density, dried" [kg/m3]')
    ';'
    """
    bare = re.sub(r'"[^"]*"|\[[^\]]*\]|\([^)]*\)', "", header)
    counted = sorted(((bare.count(one), one) for one in DELIMITERS), reverse=True)
    if counted[0][0] == 0:
        raise InputError(f"its header {shown(header)} has no delimiter; valid: {', '.join(DELIMITERS.values())}")
    if counted[0][0] == counted[1][0]:
        raise InputError(f"its header {shown(header)} may be delimited by {counted[0][1]!r} or {counted[1][1]!r}")
    return counted[0][1]


def lines_of(text: str, delimiter: str) -> Iterator[tuple[int, list[str]]]:
    """Give the cells of every line that is not empty and no comment, with the number of the line.

    Raises `InputError` for a quote that does not end.
    """
    number = 0

    def fed() -> Iterator[str]:
        nonlocal number
        for line in _LINE_END.split(text):
            number += 1
            yield f"{line}\n"

    reader = csv.reader(fed(), delimiter=delimiter, strict=True)
    try:
        for cells in reader:
            stripped = [cell.strip() for cell in cells]
            if any(stripped) and not stripped[0].startswith("#"):
                yield number, stripped
    except csv.Error as error:
        raise InputError(f"line {number} cannot be read: {error}") from None


def number_of(text: str, style: Style = PLAIN) -> Number | None:
    """Read a number written in a style; None for anything else.

    >>> number_of("101.30")
    Number(value=101.3, half_unit=0.005, digits=5)
    >>> number_of("1.234,5", Style(",", "."))
    Number(value=1234.5, half_unit=0.05, digits=5)
    >>> number_of("12,5") is None, number_of("1.5 K") is None
    (True, True)
    """
    if style.group:
        if not re.fullmatch(_grouped(style), text):
            return None
        text = text.replace(style.group, "")
    if style.decimal != ".":
        if "." in text:
            return None
        text = text.replace(style.decimal, ".")
    found = _PLAIN.match(text)
    if found is None:
        return None
    value = float(text)
    decimals = len(found["decimals"] or found["bare"] or ".") - 1
    half_unit = float(f"5e{int(found['exponent'] or 0) - decimals - 1}")
    mantissa = re.split("[eE]", text.lstrip("+-"))[0].replace(".", "")
    return Number(value, half_unit, len(mantissa.lstrip("0"))) if math.isfinite(value) else None


def _grouped(style: Style) -> str:
    group, decimal = re.escape(style.group), re.escape(style.decimal)
    return rf"[+-]?(?:\d+|\d{{1,3}}(?:{group}\d{{3}})+)(?:{decimal}\d*)?(?:[eE][+-]?\d+)?"


def fault_of(text: str) -> tuple[str, bool]:
    """Say why a cell is no number, and whether that makes the whole column doubtful.

    >>> fault_of("12,5")[1], fault_of("n/a")[1]
    (True, False)
    """
    if _SEPARATED.match(text):
        if "," in text:
            what = "has a comma, which may be a decimal comma or a thousands separator"
        elif text.count(".") > 1:
            what = "has several points, which may be thousands separators"
        else:
            what = "has thousands separators"
        return f"{shown(text)} {what}: declare decimalChar or groupChar in a descriptor, or write 1234.5", True
    if text.startswith(("<", ">", "\u2264", "\u2265", "~")):
        return f"{shown(text)} is a limit, not a value", False
    return f"{shown(text)} is text in a column of numbers", False
