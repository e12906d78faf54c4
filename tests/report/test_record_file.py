import io
import json
import math
import pickle
import struct
import zipfile
from dataclasses import dataclass, fields, replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from eosmuster.errors import InputError
from eosmuster.record import Record, Region, Ring
from eosmuster.report import record_file
from eosmuster.report.folder import ONLY_IF, RECORD, written
from eosmuster.report.packing import KINDS, Packed, pack, unpack
from eosmuster.report.record_file import load, read_checked, read_record, write_record

ARRAYS = [f"{kind}.npy" for kind in KINDS]


def saved(record):
    file = io.BytesIO()
    write_record(record, file)
    return file.getvalue()


def loaded(data):
    return load(io.BytesIO(data), "record.npz")


def refused(data):
    with pytest.raises(InputError) as caught:
        loaded(data)
    message = str(caught.value)
    assert message.startswith("record.npz: ")
    assert "\n" not in message
    assert len(message) < 400
    return message


def members(data):
    with zipfile.ZipFile(io.BytesIO(data)) as archive:
        return {name: archive.read(name) for name in archive.namelist()}


def archive_of(parts, how=zipfile.ZIP_STORED):
    file = io.BytesIO()
    with zipfile.ZipFile(file, "w", how) as archive:
        for name, data in parts.items():
            archive.writestr(name, data)
    return file.getvalue()


def array_of(values):
    file = io.BytesIO()
    np.lib.format.write_array(file, np.asarray(values), allow_pickle=True)
    return file.getvalue()


@pytest.fixture
def whole(record):
    """A record with something in every field."""
    ring = Ring(np.array([300.0, 310.0, math.nan]), np.array([1e5, 1e5, 2e5]), ("limit", "plan_limit", "unsolved"))
    regions = (
        Region("alphane", "PR", "density", "coolprop", "vapor", ring, (ring, ring), 0.25, 3),
        Region("betane", "PR", "density", "coolprop", "vapor", ring),
    )
    return replace(
        record,
        regions=regions,
        part=(2, 8),
        files=(("a.xml", "0" * 64),),
        conflicts=(("alphane", "density", "they disagree"), ("", "", "exchanged")),
        references=("coolprop", "handbook"),
    )


@pytest.fixture
def data(whole):
    return saved(whole)


class TestRoundTrip:
    def test_every_field_comes_back(self, whole, data):
        again = loaded(data)
        assert saved(again) == data
        for field in fields(Record):
            mine, other = getattr(whole, field.name), getattr(again, field.name)
            assert type(mine) is type(other)
            if field.name not in ("blocks", "regions", "summary"):
                assert mine == other
        assert [repr(row) for row in whole.summary] == [repr(row) for row in again.summary]

    def test_every_bit_of_every_array(self, whole, data):
        for mine, other in zip(whole.blocks, loaded(data).blocks, strict=True):
            for field in fields(mine):
                a, b = getattr(mine, field.name), getattr(other, field.name)
                if isinstance(a, np.ndarray):
                    assert (a.dtype, a.shape, a.tobytes()) == (b.dtype, b.shape, b.tobytes())
                else:
                    assert a == b

    def test_every_view_is_the_same(self, whole, data):
        for name, view in written(whole):
            files = [io.BytesIO(), io.BytesIO()]
            for record, file in zip((whole, loaded(data)), files, strict=True):
                view(record, file)
            assert files[0].getvalue() == files[1].getvalue(), name

    def test_names_of_users(self, block, record_of, nasty_names):
        record = record_of([block(name, (name,), 2, source=name) for name in nasty_names])
        record = replace(record, citations={"surrogate": "\udc80"}, constants={"": {"x": [1, None, {"y": 0.1}]}})
        again = loaded(saved(record))
        assert [b.component for b in again.blocks] == list(nasty_names)
        assert (again.citations, again.constants) == (record.citations, record.constants)

    def test_nothing_at_all(self, record_of):
        record = record_of([])
        assert loaded(saved(record)).blocks == ()

    def test_numbers_of_numpy_where_anything_may_stand(self, record):
        decision = {"a": np.float64(0.1), "b": np.int64(3), "c": (1.5, np.array([2.0])), "d": math.inf}
        assert loaded(saved(replace(record, decision=decision))).decision == {
            "a": 0.1,
            "b": 3,
            "c": [1.5, [2.0]],
            "d": math.inf,
        }

    def test_what_cannot_be_saved_is_said(self, record):
        with pytest.raises(TypeError, match="object cannot be saved"):
            saved(replace(record, decision={"a": object()}))

    def test_it_is_the_same_wherever_it_is_written(self, whole, data, tmp_path):
        class OnlyWritable(io.RawIOBase):
            def __init__(self):
                self.data = b""

            def writable(self):
                return True

            def write(self, data, /):
                self.data += bytes(data)
                return len(data)

        stream = OnlyWritable()
        write_record(whole, stream)
        assert stream.data == data
        with (tmp_path / "x").open("wb") as file:
            write_record(whole, file)
        assert (tmp_path / "x").read_bytes() == data

    def test_numpy_reads_the_arrays_without_pickle(self, whole, data):
        arrays = np.load(io.BytesIO(data), allow_pickle=False)
        for name, dtype in KINDS.items():
            assert arrays[name].dtype == dtype
        assert arrays["codes"].size == sum(block.verdict.size for block in whole.blocks)

    def test_results_of_a_part_hold_it_and_no_others(self, whole):
        assert RECORD == record_file.NAME
        assert ONLY_IF[RECORD](whole)
        assert not ONLY_IF[RECORD](replace(whole, part=None))


class TestRefused:
    """One sentence each, and nothing is run."""

    @pytest.mark.parametrize(
        "data", [b"", b"component,cas\n", b"PK\x05\x06" + bytes(18), b"\x93NUMPY\x01\x00", b"{}", bytes(10_000)]
    )
    def test_foreign_files(self, data):
        assert "no record of eosmuster" in refused(data)

    def test_cut_short(self, data):
        for length in range(0, len(data), 997):
            refused(data[:length])
        refused(data[:-1])

    def test_a_number_changed(self, data):
        at = data.index(b"\x93NUMPY") + 200
        assert "CRC" in refused(data[:at] + bytes([data[at] ^ 1]) + data[at + 1 :])

    def test_another_version(self, data):
        parts = members(data)
        for version in (1, 3, True, None, "2", [2]):
            header = json.loads(parts["header.json"]) | {"record_version": version}
            message = refused(archive_of(parts | {"header.json": json.dumps(header)}))
            assert "use the version of eosmuster that wrote it" in message

    def test_members_that_do_not_belong(self, data):
        parts = members(data)
        refused(archive_of(parts | {"more.npy": array_of([1.0])}))
        refused(archive_of({name: part for name, part in parts.items() if name != "codes.npy"}))
        file = io.BytesIO(data)
        with pytest.warns(UserWarning, match="Duplicate"), zipfile.ZipFile(file, "a") as archive:
            archive.writestr("codes.npy", parts["codes.npy"])
        refused(file.getvalue())

    def test_what_would_grow_when_it_is_read(self, data):
        bomb = members(data) | {"numbers.npy": bytes(1 << 20)}
        assert "is compressed" in refused(archive_of(bomb, zipfile.ZIP_DEFLATED))

    @pytest.mark.parametrize("name", ARRAYS)
    def test_pickled_objects(self, data, name, tmp_path):
        class Trap:
            def __reduce__(self):
                return (Path.touch, (tmp_path / "run",))

        pickled = array_of(np.array([Trap()], dtype=object))
        (tmp_path / "run").unlink(missing_ok=True)
        for trap in (pickled, pickle.dumps(Trap())):
            refused(archive_of(members(data) | {name: trap}))
        assert list(tmp_path.iterdir()) == []

    @pytest.mark.parametrize("name", ARRAYS)
    @pytest.mark.parametrize(
        "values",
        [np.zeros(3), np.zeros((1, 1), np.int8), np.zeros(1, ">i4"), np.zeros(1, "S8"), np.zeros(1, "f8,f8")],
    )
    def test_other_arrays(self, data, name, values):
        refused(archive_of(members(data) | {name: array_of(values)}))

    @pytest.mark.parametrize("count", [0, 10**6, 10**12, 10**18, 2**63 - 1])
    def test_arrays_that_say_they_are_larger(self, data, count):
        header = f"{{'descr': '<f8', 'fortran_order': False, 'shape': ({count},), }}".ljust(117) + "\n"
        array = b"\x93NUMPY\x01\x00" + struct.pack("<H", len(header)) + header.encode() + bytes(80)
        refused(archive_of(members(data) | {"numbers.npy": array}))

    @pytest.mark.parametrize(
        "header",
        [
            b"",
            b"[]",
            b"\xff",
            b"{" * 100_000,
            b"[" * 100_000,
            b'{"format": "eosmuster results"}',
            b'{"format": "eosmuster record", "record_version": 2}',
        ],
    )
    def test_other_headers(self, data, header):
        refused(archive_of(members(data) | {"header.json": header}))

    @pytest.mark.parametrize("name", [field.name for field in fields(Record)])
    @pytest.mark.parametrize("value", [7, "x", [7], [None, 3], {"no": 1}, [{"no": [1]}, 0.5]])
    def test_other_content(self, data, name, value):
        parts = members(data)
        header = json.loads(parts["header.json"])
        header["content"][name] = value
        refused(archive_of(parts | {"header.json": json.dumps(header)}))

    def test_fields_that_do_not_belong(self, data):
        parts = members(data)
        header = json.loads(parts["header.json"])
        for content in (header["content"] | {"more": [1]}, dict(list(header["content"].items())[1:])):
            refused(archive_of(parts | {"header.json": json.dumps(header | {"content": content})}))

    @pytest.mark.parametrize("name", ARRAYS)
    def test_more_or_fewer_numbers_than_rows_ask_for(self, data, name):
        parts = members(data)
        array = np.load(io.BytesIO(parts[name]))
        for other in (array[:-1], np.append(array, array[-1:]), np.zeros(0, array.dtype), -array):
            if not np.array_equal(other, array) and not (name == "numbers.npy" and other.size == array.size):
                refused(archive_of(parts | {name: array_of(other)}))

    @pytest.mark.parametrize(
        ("change", "said"),
        [
            ({"verdict": 6}, "a verdict or note"),
            ({"verdict": -1}, "a verdict or note"),
            ({"note": 3}, "a verdict or note"),
            ({"notes": ()}, "a verdict or note"),
            ({"candidates": ("PR",)}, "unlike shapes"),
            ({"independence": ()}, "unlike shapes"),
            ({"limit_pct": np.zeros(2)}, "unlike shapes"),
            ({"predicted": np.zeros((9, 4))}, "unlike shapes"),
            ({"temperature": np.zeros((3, 3))}, "unlike shapes"),
        ],
    )
    def test_points_that_no_run_gives(self, record, change, said):
        block = record.blocks[0]
        for name, value in change.items():
            if isinstance(value, int):
                array = getattr(block, name).copy()
                array[0, 0] = value
                change = {name: array}
        block = replace(block, **change)
        assert said in refused(saved(replace(record, blocks=(block, *record.blocks[1:]))))

    def test_words_that_no_run_uses(self, whole):
        row, window, region = whole.summary[0], whole.windows[0], whole.regions[0]
        ring = region.outline
        for change in (
            {"summary": (replace(row, verdict="fine"),)},
            {"windows": (replace(window, to_end="<script>"),)},
            {"display": {"temperature": "furlong"}},
            {"regions": (replace(region, outline=replace(ring, reasons=("why", "limit", "limit"))),)},
            {"regions": (replace(region, holes=(replace(ring, reasons=("limit",)),)),)},
            {"regions": (replace(region, outline=Ring(np.empty(0), np.empty(0), ())),)},
        ):
            refused(saved(replace(whole, **change)))

    def test_too_large(self, data, monkeypatch):
        monkeypatch.setattr(record_file, "LARGEST_HEADER", 10)
        assert "header larger" in refused(data)
        monkeypatch.setattr(record_file, "LARGEST", len(data) - 1)
        assert "is larger than" in refused(data)

    def test_unreadable_files(self, tmp_path):
        for path in (tmp_path, tmp_path / "missing"):
            with pytest.raises(InputError, match="cannot be read"):
                read_record(path)
            with pytest.raises(InputError, match="cannot be read"):
                read_checked(path, "")

    def test_another_file_than_the_manifest_says(self, data, tmp_path):
        (tmp_path / "record.npz").write_bytes(data)
        assert read_record(tmp_path / "record.npz").part == (2, 8)
        with pytest.raises(InputError, match="is not as its run wrote it"):
            read_checked(tmp_path / "record.npz", "0" * 64)


def small():
    ring = Ring(np.array([300.0, 310.0]), np.array([1e5, 2e5]), ("limit", "plan_limit"))
    region = Region("alphane", "PR", "density", "coolprop", "vapor", ring)
    return saved(Record("invented", "An invented run", "x = 1", (), (), (), regions=(region,), part=(1, 2)))


SMALL = small()


@settings(max_examples=300, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(
    st.lists(st.tuples(st.floats(0.0, 1.0, exclude_max=True), st.binary(max_size=8), st.integers(0, 8)), max_size=4)
)
def test_mutated_files_are_records_or_refused(mutations):
    data = SMALL
    for place, piece, dropped in mutations:
        at = int(place * len(data))
        data = data[:at] + piece + data[at + dropped :]
    found: Record | InputError
    try:
        found = loaded(data)
    except InputError as error:
        found = error
    assert isinstance(found, Record) or "\n" not in str(found)


@dataclass(frozen=True)
class Everything:
    """Each kind of field that can be taken apart."""

    text: str
    number: float
    count: int
    flag: bool
    maybe: tuple[int, int] | None
    names: tuple[str, ...]
    anything: dict[str, Any] | None
    regions: tuple[Region, ...]
    ring: Ring


TEXTS = st.text(max_size=5)


@settings(max_examples=40, deadline=None)
@given(
    st.lists(
        st.tuples(
            TEXTS,
            st.floats(),
            st.integers(-(2**63), 2**63 - 1),
            st.booleans(),
            st.none() | st.tuples(st.integers(), st.integers()),
            st.lists(TEXTS, max_size=3).map(tuple),
        ),
        max_size=1,
    )
)
def test_anything_comes_back(rows):
    ring = Ring(np.array([1.0]), np.array([2.0]), ("limit",))
    region = Region("a", "b", "c", "d", "e", ring)
    for text, number, count, flag, maybe, names in rows:
        thing = Everything(text, number, count, flag, maybe, names, None, (region, region), ring)
        packed = pack(thing)
        again = unpack(Everything, Packed(json.loads(json.dumps(packed.content)), packed.arrays))
        for name in ("text", "count", "flag", "maybe", "names", "anything"):
            assert getattr(again, name) == getattr(thing, name)
            assert type(getattr(again, name)) is type(getattr(thing, name))
        assert np.float64(again.number).tobytes() == np.float64(number).tobytes()
        assert [r.outline.temperature.tolist() for r in again.regions] == [[1.0], [1.0]]
