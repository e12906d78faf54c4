import csv
import io
import math

import numpy as np
import pandas as pd
import pytest

from eosmuster.record import POINT_VERDICTS
from eosmuster.report.points import COLUMNS, block_rows, write_points


def table_of(record):
    file = io.BytesIO()
    write_points(record, file)
    file.seek(0)
    return pd.read_csv(file, dtype=str, keep_default_na=False)


def bits(values):
    # one bit pattern for every NaN, so that an empty cell equals any of them
    return np.where(np.isnan(values), np.nan, values).view(np.int64).tolist()


def numbers(column):
    return np.array([float(cell) if cell else math.nan for cell in column])


def test_columns_are_those_of_the_contract():
    contract = (
        "component cas candidate property temperature_K pressure_Pa phase reduced_temperature predicted reference "
        "unit reference_source reference_uncertainty_pct deviation_pct limit_pct probability_inside verdict "
        "contested independence note"
    )
    assert list(COLUMNS) == contract.split()


@pytest.mark.parametrize("states", [1, 7, 3000])  # 3000: more than one piece
def test_every_number_comes_back_bit_for_bit(block, record_of, states):
    models = tuple(f"model {i}" for i in range(3))
    blocks = [block("alphane", models, states, seed=1), block("betane", models, states, seed=2)]
    table = table_of(record_of(blocks))
    assert len(table) == 2 * 3 * states
    per_state = {
        "temperature_K": "temperature",
        "pressure_Pa": "pressure",
        "reduced_temperature": "reduced_temperature",
        "reference": "reference",
        "reference_uncertainty_pct": "reference_uncertainty_pct",
        "limit_pct": "limit_pct",
    }
    for column, name in per_state.items():
        expected = np.concatenate([np.tile(getattr(b, name), 3) for b in blocks])
        assert bits(numbers(table[column])) == bits(expected), column
    for column in ("predicted", "deviation_pct", "probability_inside"):
        expected = np.concatenate([getattr(b, column).ravel() for b in blocks])
        assert bits(numbers(table[column])) == bits(expected), column


def test_text_columns_follow_candidate_state_and_note(block, record_of):
    one = block("alphane", ("PR", "SRK", "vdW"), 50, source="cited, table 3", seed=3)
    table = table_of(record_of([one]))
    assert table["candidate"].tolist() == [c for c in one.candidates for _ in range(50)]
    assert table["verdict"].tolist() == [POINT_VERDICTS[v] for v in one.verdict.ravel()]
    assert set(table["verdict"]) == set(POINT_VERDICTS)
    assert table["note"].tolist() == [one.notes[n] for n in one.note.ravel()]
    assert table["independence"].tolist() == [i for i in one.independence for _ in range(50)]
    assert set(table["contested"]) == {""}
    fixed = {
        "component": "alphane",
        "cas": "000-00-0",
        "property": "saturation_pressure",
        "phase": "two-phase",
        "unit": "Pa",
        "reference_source": "cited, table 3",
    }
    for column, value in fixed.items():
        assert set(table[column]) == {value}


def test_names_of_users_are_inert_and_come_back(block, record_of, nasty_names):
    blocks = [block(name, (name + " model",), 2, source=name) for name in nasty_names]
    file = io.BytesIO()
    write_points(record_of(blocks), file)
    rows = list(csv.DictReader(io.StringIO(file.getvalue().decode(), newline="")))
    assert len(rows) == 2 * len(nasty_names)
    for name, row in zip(nasty_names, rows[::2], strict=True):
        guarded = "'" + name if name[:1] in tuple("=+-@\t\r\n") else name
        assert (row["component"], row["reference_source"]) == (guarded, guarded)
    texts = [row[c] for row in rows for c in ("component", "candidate", "reference_source", "note")]
    assert not [t for t in texts if t.startswith(tuple("=+-@\t\r\n"))]


def test_nothing_to_write_leaves_the_header(record_of, block):
    assert len(table_of(record_of([]))) == 0
    assert len(table_of(record_of([block(states=3)]))) == 6
    assert list(block_rows(block(candidates=(), states=3))) == []
    assert list(block_rows(block(states=0))) == []
