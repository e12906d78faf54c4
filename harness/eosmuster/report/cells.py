"""Cells of the CSV files: numbers that round-trip, text that stays text.

A spreadsheet runs a cell that begins with ``=``, ``+``, ``-`` or ``@`` as a formula. Text that comes from
a plan or a data file and begins so (or with a tab or a line break, behind which some programs look) gets
an apostrophe in front, the spreadsheets' own mark for text. So does what follows a semicolon, a tab or a line
break within a cell, since some countries' settings begin another field there. Numbers are never touched: a cell
``-1.5`` of a number column stays a number. NUL characters are dropped.
"""

from __future__ import annotations

import math
import re
from functools import lru_cache

_FORMULA = ("=", "+", "-", "@", "\t", "\r", "\n")
_FURTHER = re.compile(r"(?<=[;\t\r\n])(?=\"*[=+\-@])")
"""Where another field begins for a program that takes another character than a comma for the separator."""

_QUOTED = ',"\r\n'


@lru_cache(maxsize=4096)  # names come again and again
def text_cell(text: str) -> str:
    r'''Write text as one CSV cell (RFC 4180 quoting), inert in a spreadsheet.

    Examples
    --------
    >>> print(text_cell("propane"), text_cell("C4, mixed"), text_cell('say "x"'), text_cell("=1+1;=2"))
    propane "C4, mixed" "say ""x""" '=1+1;'=2
    '''
    text = _FURTHER.sub("'", text.replace("\0", ""))
    if text.startswith(_FORMULA):
        text = "'" + text
    if any(character in text for character in _QUOTED):
        return '"' + text.replace('"', '""') + '"'
    return text


def number_cell(value: float) -> str:
    """Write a number as one CSV cell that reads back to the last bit, or nothing where it is not known.

    Examples
    --------
    >>> number_cell(-0.1), number_cell(7), number_cell(math.nan)
    ('-0.1', '7', '')
    """
    return "" if math.isnan(value) else repr(value)


def cell(value: str | float) -> str:
    """Write a number or text as one CSV cell."""
    return text_cell(value) if isinstance(value, str) else number_cell(value)


def encoded(text: str) -> bytes:
    r"""Encode for a file; what UTF-8 cannot hold (a lone surrogate) is written as an escape.

    Examples
    --------
    >>> encoded("n\u00b0"), encoded("\udc80")
    (b'n\xc2\xb0', b'\\udc80')
    """
    return text.encode("utf-8", "backslashreplace")
