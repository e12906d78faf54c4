"""Text of plans and files as cells: whole in our own readers, inert in a spreadsheet of any country."""

import csv
import io

import pytest
from hypothesis import given
from hypothesis import strategies as st

from eosmuster.report.cells import text_cell

BEGINS_A_FORMULA = tuple("=+-@")
SEPARATORS = (",", ";", "\t")


def fields(line, separator):
    """Read a line as a program does that takes this separator; a quote that stands inside a field means nothing."""
    return [cell for row in csv.reader(io.StringIO(line, newline=""), delimiter=separator) for cell in row]


@pytest.mark.parametrize(
    "text", ["=1+1", "a;=1+1", "a\t=1+1", 'a;"=1+1"', "a\n=1+1", "a;@x", "a;\t;-1", ';"";+1', "\t=1"]
)
@pytest.mark.parametrize("separator", SEPARATORS)
def test_no_field_becomes_a_formula_whatever_separates_fields(text, separator):
    line = f"propane,{text_cell(text)},x\n"
    assert not [cell for cell in fields(line, separator) if cell.startswith(BEGINS_A_FORMULA)]


@given(st.text("ab;,\t\n\"'=+-@ ", max_size=12))
def test_text_is_found_again_and_nothing_but_apostrophes_is_added(text):
    [cell] = fields(text_cell(text), ",") or [""]
    assert cell.replace("'", "") == text.replace("'", "")


@pytest.mark.parametrize("text", ["handbook:x; y", "a; b", "C4, mixed", "x-1;y", "1 - 2"])
def test_ordinary_text_stays_as_it_is(text):
    assert fields(text_cell(text), ",") == [text]
