from __future__ import annotations

import csv
import io
import math
from collections.abc import Callable

from eosmuster.drifting.comparing import Drift
from eosmuster.drifting.table import COLUMNS, csv_text


def test_the_file_reads_back_row_by_row_and_is_inert_in_a_spreadsheet(invented: Callable[..., Drift]) -> None:
    drift = invented(60)
    data = csv_text(drift)
    rows = list(csv.DictReader(io.StringIO(data.decode(), newline="")))
    assert tuple(rows[0]) == COLUMNS
    assert len(rows) == len(drift.rows)
    for row, expected in zip(rows, drift.rows, strict=True):
        assert row["component"] == expected.key.component
        assert row["causes"].split() == list(expected.causes)
        assert (row["old_verdict"], row["new_verdict"]) == expected.verdicts
        assert row["old_aad_pct"] == (repr(expected.old.aad_pct) if expected.old else "")
        assert row["worst_at_Pa"] == ""
        assert not any(cell.startswith(("=", "+", "@", "\t", "\r", "\n")) for cell in row.values())


def test_the_table_of_the_python_interface_has_the_same(invented: Callable[..., Drift]) -> None:
    table = invented(8).table
    assert tuple(table.columns) == COLUMNS
    assert len(table) == 8
    assert invented(0).table.empty
    vanished = table[table["state"] == "vanished"]
    assert vanished["new_aad_pct"].isna().all()
    assert all(not math.isnan(v) for v in vanished["old_aad_pct"])
