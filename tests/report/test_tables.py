import io
from dataclasses import fields, replace

import pandas as pd

from eosmuster.record import SummaryRow, WindowRow
from eosmuster.report.tables import write_summary, write_windows

SUMMARY = (
    "component candidate property reference_source points from_K to_K aad_pct bias_pct rms_pct median_pct p95_pct "
    "max_pct max_at_K inside undecided outside unsolved share_inside passing_limit_pct false_acceptance_pct "
    "contested independence verdict"
)
WINDOWS = "component candidate property reference_source from_K to_K from_end to_end"


def read(write, record):
    file = io.BytesIO()
    write(record, file)
    file.seek(0)
    return pd.read_csv(file, dtype=str, keep_default_na=False)


def test_summary_has_the_contract_columns_and_every_row(record):
    table = read(write_summary, record)
    assert list(table.columns) == [f.name for f in fields(SummaryRow)]
    assert set(SUMMARY.split()) <= set(table.columns)
    assert table["candidate"].tolist() == [row.candidate for row in record.summary]
    assert [float(x) for x in table["share_inside"] if x] == [
        r.share_inside for r in record.summary if r.share_inside == r.share_inside
    ]


def test_an_unavailable_candidate_is_a_row_with_its_reason_and_without_numbers(record):
    last = read(write_summary, record).iloc[-1]
    assert (last["verdict"], last["points"], last["aad_pct"]) == ("unavailable", "0", "")
    assert last["note"] == "no Twu parameters for this component"


def test_windows(record):
    table = read(write_windows, record)
    assert list(table.columns) == WINDOWS.split() == [f.name for f in fields(WindowRow)]
    assert table.iloc[0].tolist()[4:] == ["210.5", "340.25", "plan_limit", "limit"]


def test_formulas_and_line_breaks_in_names_are_inert(record, nasty_names):
    rows = tuple(replace(record.summary[0], component=name) for name in nasty_names)
    table = read(write_summary, replace(record, summary=rows))
    assert len(table) == len(nasty_names)
    assert not [name for name in table["component"] if name.startswith(tuple("=+-@\t\r\n"))]
