"""The shortcut hands out what the parser would: whatever stands around the rows, and wherever a chunk ends."""

from __future__ import annotations

import io
from pathlib import Path

import pytest

from eosmuster.errors import InputError
from eosmuster.sources.thermoml import stream as thermoml_stream
from eosmuster.sources.thermoml.shape import BLOCK, ROW, Shape, nodes
from eosmuster.sources.thermoml.stream import read_parts

GOOD = (Path(__file__).parents[1] / "fixtures" / "thermoml" / "older_pure.xml").read_text(encoding="utf-8")
START = GOOD.index("<NumValues>")
FIRST_ROW = GOOD[START : GOOD.index("</NumValues>") + len("</NumValues>")]
MANY = GOOD.replace(FIRST_ROW, "\n".join(FIRST_ROW.replace(">250<", f">{250 + i}<") for i in range(50)), 1)
NAMESPACE = "http://www.iupac.org/namespaces/ThermoML"

Part = tuple[str, object, int]


def parts(data: bytes, *, shortcut: bool, skip: int = 0) -> list[Part | str]:
    """All parts, and how it ends; block number `skip` is skipped after its first row."""
    found: list[Part | str] = []
    block = 1

    def take(name: str, shape: Shape, texts: list[str], skipped: int) -> bool:
        nonlocal block
        found.append((name, nodes(shape, texts) if shape else [], skipped))
        block += name == BLOCK
        return name != ROW or block != skip

    try:
        read_parts(io.BytesIO(data), take, shortcut=shortcut)
    except InputError as error:
        found.append(str(error))
    return found


@pytest.fixture
def parsed_rows(monkeypatch: pytest.MonkeyPatch) -> list[int]:
    """Counts the rows that were not parsed."""
    counted: list[int] = []
    original = thermoml_stream._Parser.take_rows

    def counting(self: object, shape: Shape, rows: list[list[str]], lines: int) -> None:
        counted.append(len(rows))
        original(self, shape, rows, lines)  # type: ignore[arg-type]

    monkeypatch.setattr(thermoml_stream._Parser, "take_rows", counting)
    return counted


def test_all_rows_but_the_first_of_their_kind_are_cut_out(parsed_rows: list[int]) -> None:
    assert parts(MANY.encode(), shortcut=True) == parts(MANY.encode(), shortcut=False)
    assert sum(parsed_rows) >= 51 - 1


def test_nothing_is_cut_out_without_it(parsed_rows: list[int]) -> None:
    parts(MANY.encode(), shortcut=False)
    assert parsed_rows == []


@pytest.mark.parametrize("skip", [1, 4, 12])
def test_skipped_values_are_counted_alike(skip: int) -> None:
    data = MANY.encode()
    assert parts(data, shortcut=True, skip=skip) == parts(data, shortcut=False, skip=skip)


@pytest.mark.parametrize("size", [1, 2, 7, 61, 499, 4096])
def test_chunks_may_end_anywhere(monkeypatch: pytest.MonkeyPatch, size: int) -> None:
    data = MANY[: 3 * len(MANY) // 4].encode()
    expected = parts(data, shortcut=False)
    monkeypatch.setattr(thermoml_stream, "_CHUNK", size)
    assert parts(data, shortcut=True) == expected
    assert parts(data, shortcut=False) == expected


AROUND = {
    "a comment": "<!--{rows}-->",
    "a comment that ends in the middle": "<!-- {row} -->{rows}",
    "a CDATA section": "<![CDATA[{rows}]]>",
    "a processing instruction": "<?x {rows}?>",
    "an element nobody knows": "<x>{rows}</x>",
    "another default namespace": "<x xmlns='urn:other'>{rows}</x>",
    "text": "7{rows}",
    "an attribute": "<x y='>{rows}'/>",
    "an attribute of a tag that goes on": "<x y='<z>{rows}'/>",
    "a tag with an attribute": "<x y='1'/>{rows}",
    "a prefix that is declared on the spot": "<t:x xmlns:t='urn:t'/>{rows}",
}


@pytest.mark.parametrize("around", AROUND.values(), ids=AROUND.keys())
@pytest.mark.parametrize("place", ["between rows", "after the last row"])
def test_what_is_around_rows_keeps_its_meaning(around: str, place: str) -> None:
    """Rows that were parsed come before, so that the shortcut knows their shape."""
    text = around.format(row=FIRST_ROW, rows=FIRST_ROW * 5)
    at = GOOD.index("<NumValues>", START + 5) if place == "between rows" else GOOD.rindex("</PureOrMixtureData>")
    data = (GOOD[:at] + text + GOOD[at:]).encode()
    assert parts(data, shortcut=True) == parts(data, shortcut=False)


ROWS = {
    "an attribute": FIRST_ROW.replace("<NumValues>", "<NumValues a='1'>"),
    "a reference": FIRST_ROW.replace(">250<", ">2&#53;0<"),
    "an unknown element": FIRST_ROW.replace("<PropertyValue>", "<x/><PropertyValue>"),
    "a comment": FIRST_ROW.replace(">250<", ">25<!-- -->0<"),
    "text outside": FIRST_ROW.replace("<PropertyValue>", "9<PropertyValue>"),
    "a letter outside ASCII": FIRST_ROW.replace(">250<", ">25\u0660<"),
    "a blank in a tag": FIRST_ROW.replace("</NumValues>", "</NumValues >"),
    "a greater-than sign": FIRST_ROW.replace(">250<", ">>250<"),
    "an empty element": FIRST_ROW.replace("<nVarValue>250</nVarValue>", "<nVarValue/>"),
    "another order": FIRST_ROW.replace("<nVarDigits>5</nVarDigits>", "", 1),
    "a row in a row": FIRST_ROW.replace("</NumValues>", FIRST_ROW + "</NumValues>"),
    "no end": FIRST_ROW.replace("</NumValues>", ""),
    "two ends": FIRST_ROW + "</NumValues>",
    "Windows line ends": FIRST_ROW.replace("\n", "\r\n"),
}


@pytest.mark.parametrize("row", ROWS.values(), ids=ROWS.keys())
def test_rows_written_in_other_ways_keep_their_meaning(row: str) -> None:
    data = GOOD.replace(FIRST_ROW, FIRST_ROW * 3 + row + FIRST_ROW * 3, 1).encode()
    assert parts(data, shortcut=True) == parts(data, shortcut=False)


@pytest.mark.parametrize(
    "change",
    [
        lambda text: text.replace("<DataReport", "<t:DataReport").replace("xmlns=", "xmlns:t="),
        lambda text: text.replace(f'xmlns="{NAMESPACE}"', 'xmlns="urn:other"'),
        lambda text: text.replace("</DataReport>", "<!-- the end --></DataReport>"),
        lambda text: text.replace("<Citation>", "<!-- <DataReport> --><Citation>"),
        lambda text: text.replace('encoding="UTF-8"', 'encoding="cp037"'),
        lambda text: text.replace('encoding="UTF-8"', 'encoding="windows-1252"'),
        lambda text: text[: len(text) // 2],
    ],
)
def test_other_files_keep_their_meaning(change) -> None:  # type: ignore[no-untyped-def]
    data = change(MANY).encode()
    assert parts(data, shortcut=True) == parts(data, shortcut=False)


def test_lines_are_counted_with_the_rows_that_were_cut_out() -> None:
    text = MANY.replace("</DataReport>", "<x></DataReport>")
    line = text[: text.index("<x></DataReport>")].count("\n") + 1
    assert parts(text.encode(), shortcut=True)[-1] == f"it is not well formed in line {line}: mismatched tag"
