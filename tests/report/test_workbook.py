"""The workbook read back with another library."""

import io
import math
import sys
import zipfile
from dataclasses import fields, replace

import numpy as np
import pytest

from eosmuster.errors import InputError
from eosmuster.record import Region, Ring, SummaryRow
from eosmuster.report.sizes import blocks_by_key, passing_limit
from eosmuster.report.views import overviews
from eosmuster.report.workbook import cell_text, write_workbook


@pytest.fixture
def book():
    openpyxl = pytest.importorskip("openpyxl")
    pytest.importorskip("xlsxwriter")

    def write(record):
        file = io.BytesIO()
        write_workbook(record, file)
        return openpyxl.load_workbook(file)

    return write


def rows(sheet):
    header, *body = sheet.values
    return [dict(zip(header, row, strict=True)) for row in body]


def test_the_summary_is_that_of_the_record(record, book):
    found = rows(book(record)["summary"])
    names = [field.name for field in fields(SummaryRow)]
    assert list(found[0])[: len(names)] == names
    for shown, row in zip(found, record.summary, strict=True):
        for name in names:
            value, held = shown[name], getattr(row, name)
            if isinstance(held, str):
                assert (value or "") == held
            elif math.isnan(held):
                assert value is None
            else:
                assert value == pytest.approx(held, rel=1e-15)  # written with 16 digits


def test_the_answer_counts_what_the_views_count(record, book):
    found = rows(book(record)["answer"])
    wanted = [(view.label, s) for view in overviews(record) for s in reversed(view.standings)]
    for shown, (label, standing) in zip(found, wanted, strict=True):
        assert (shown["property"], shown["candidate"]) == (label, standing.candidate)
        assert (shown["held"], shown["points inside"]) == (standing.held, standing.inside)
        assert shown["unavailable"] == len(standing.fluids["unavailable"])
        assert shown["not judged"] == len(standing.fluids["unjudged"])


def test_what_is_read_in_a_unit_of_its_own_is_told_in_it(record, book):
    opened = book(record)
    for shown in rows(opened["answer"]):
        in_kelvin = shown["property"] == "boiling temperature"
        assert shown["its unit"] == (("K" if in_kelvin else "%") if shown["largest deviation"] is not None else None)
        standing = next(
            s for v in overviews(record) if v.label == shown["property"] for s in v.standings
            if s.candidate == shown["candidate"]
        )  # fmt: skip
        if shown["largest deviation"] is not None:
            assert shown["largest deviation"] == pytest.approx(standing.largest, rel=1e-15)
    blocks = blocks_by_key(record.blocks)
    for shown, row in zip(rows(opened["summary"]), record.summary, strict=True):
        assert shown["unit of these"] == ("K" if row.property == "boiling_temperature" else "%")
        wanted = passing_limit(blocks, row, "guarded")
        assert shown["passing limit"] == (None if math.isnan(wanted) else pytest.approx(wanted, rel=1e-15))


def test_names_never_become_formulas_links_or_numbers(block, record_of, nasty_names, book):
    names = (*nasty_names, "https://example.org", "1e5", "{=1+1}", "\ud800")
    record = record_of([block("=1+1", names, 4)])
    record = replace(record, left_out=tuple((n, "'=2") for n in names), citations={n: n for n in names})
    opened = book(record)
    for sheet in opened:
        for row in sheet.iter_rows():
            for cell in row:
                assert cell.data_type in ("s", "n")
                assert cell.hyperlink is None
    shown = [row["what"] or "" for row in rows(opened["left out"])]
    assert [text.strip() for text in shown] == [cell_text(name).strip() for name in names]
    assert "1e5" in shown


def test_windows_regions_and_constants_have_sheets(record, book):
    ring = Ring(np.array([250.0, 300.0, 280.0]), np.array([1e5, 2e5, 3e6]), ("limit",) * 3)
    region = Region("alphane", "PR", "density", "coolprop", "liquid", ring, (), 0.25, 1)
    opened = book(replace(record, regions=(region,)))
    shown = rows(opened["regions"])[0]
    assert (shown["lowest_K"], shown["highest_Pa"], shown["share"], shown["vertices"]) == (250.0, 3e6, 0.25, 3)
    assert rows(opened["windows"])[0]["from_K"] == 210.5
    constants = {row["constant"]: row["value"] for row in rows(opened["constants"])}
    assert constants["critical_temperature"] == 375.0
    assert constants["note"] == "acentric factor replaced: invented"


def test_two_runs_give_the_same_bytes(record):
    pytest.importorskip("xlsxwriter")
    one, other = io.BytesIO(), io.BytesIO()
    write_workbook(record, one)
    write_workbook(record, other)
    assert one.getvalue() == other.getvalue()
    assert zipfile.ZipFile(one).testzip() is None


def test_without_the_package_the_remedy_is_named(record, monkeypatch):
    monkeypatch.setitem(sys.modules, "xlsxwriter", None)
    with pytest.raises(InputError, match=r"needs the package xlsxwriter; install it with: pip install"):
        write_workbook(record, io.BytesIO())
