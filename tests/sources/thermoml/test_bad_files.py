"""Bad ThermoML: nothing is fetched, nothing expands, nothing is raised, and what came before is kept."""

from __future__ import annotations

import io
import re
import tracemalloc
from collections.abc import Iterator
from pathlib import Path
from time import process_time

import pytest

from eosmuster.sources.measured.table import Reading
from eosmuster.sources.thermoml import columns
from eosmuster.sources.thermoml import reader as thermoml

FIXTURES = Path(__file__).parents[1] / "fixtures" / "thermoml"
NAMESPACE = "http://www.iupac.org/namespaces/ThermoML"
GOOD = (FIXTURES / "older_pure.xml").read_text(encoding="utf-8")
ROOT = re.search(r"<DataReport[^>]*>", GOOD)[0]  # type: ignore[index]


def read(content: str | bytes) -> Reading:
    data = content.encode() if isinstance(content, str) else content
    return thermoml.read_stream(io.BytesIO(data), "bad.xml")


def only(reading: Reading) -> str:
    [found] = reading.diagnostics
    assert (found.file, found.block, found.code) == ("bad.xml", 0, "file")
    return found.sentence


LAUGHS = "".join(f'<!ENTITY l{i} "{f"&l{i - 1};" * 10}">' for i in range(1, 12))

REFUSED = {
    "empty": ("", "it is empty"),
    "blanks": ("  \n ", "it is empty"),
    "html": ("<html><body>Not found</body></html>", "it is not ThermoML: its root is 'html'"),
    "no namespace": ("<DataReport/>", "its root is 'DataReport' of the namespace ''"),
    "no xml": ("component,temperature\n", "it is not well formed in line 1"),
    "doctype": (f"<!DOCTYPE DataReport>{GOOD[GOOD.index('<DataReport') :]}", "document type definition (line 1)"),
    "external dtd": (
        f'<!DOCTYPE DataReport SYSTEM "file:///etc/passwd">{ROOT}</DataReport>',
        "document type definition",
    ),
    "entity bomb": (f'<!DOCTYPE x [<!ENTITY l0 "lol">{LAUGHS}]>{ROOT}&l11;</DataReport>', "document type definition"),
    "undefined entity": (f"{ROOT}<Compound>&who;</Compound></DataReport>", "not well formed in line 1"),
    "two documents": (f"{ROOT}</DataReport>{ROOT}</DataReport>", "not well formed in line 1"),
    "encoding nobody knows": ('<?xml version="1.0" encoding="no-such"?><DataReport/>', "its encoding cannot be read"),
    "encoding of two bytes": (
        '<?xml version="1.0" encoding="shift_jis"?><DataReport/>',
        "its encoding cannot be read",
    ),
    "nested compounds": (
        f"{ROOT}<Compound><Compound/></Compound></DataReport>",
        "a Compound lies in a Compound (line 1)",
    ),
    "nested blocks": (
        f"{ROOT}<PureOrMixtureData><PureOrMixtureData/></PureOrMixtureData></DataReport>",
        "a PureOrMixtureData lies in a PureOrMixtureData (line 1)",
    ),
    "deep in a part": (
        f"{ROOT}<Compound>{'<RegNum>' * 500}{'</RegNum>' * 500}</Compound>",
        "nested more than 100 deep",
    ),
    "deep": (f"{ROOT}{'<x><Compound/>' * 200}", "nested more than 100 deep"),
    "endless": (f"{ROOT}<Compound><sCommonName>{'a' * (5 << 20)}", "has no end within reason"),
    "endless tag": (f"{ROOT}<Compound a='{'a' * (5 << 20)}", "has no end within reason"),
    "endless list": (f"{ROOT}<Compound>{'<sCommonName>a</sCommonName>' * 250_000}", "has no end within reason"),
}


@pytest.mark.parametrize(("content", "words"), REFUSED.values(), ids=REFUSED.keys())
def test_a_bad_file_is_one_diagnostic(content: str, words: str) -> None:
    reading = read(content)
    assert words in only(reading)
    assert reading.sets == ()
    assert reading.files == 1


def test_an_entity_bomb_costs_nothing() -> None:
    began = process_time()
    read(REFUSED["entity bomb"][0])
    assert process_time() - began < 0.5


def test_a_missing_file_is_a_diagnostic(tmp_path: Path) -> None:
    assert "cannot be opened" in thermoml.read_file(tmp_path / "none.xml").diagnostics[0].sentence


@pytest.mark.parametrize("share", [0.3, 0.6, 0.9, 0.999])
def test_a_file_that_breaks_off_keeps_the_blocks_before(share: float) -> None:
    cut = GOOD[: int(share * len(GOOD))]
    reading = read(cut)
    whole = read(GOOD)
    ended = cut.count("</PureOrMixtureData>")
    assert [(s.block, s.values.tolist()) for s in reading.sets] == [
        (s.block, s.values.tolist()) for s in whole.sets if s.block <= ended
    ]
    assert re.match(r"it (breaks off|is not well formed) in line \d+", only(reading))


def test_rows_of_a_block_that_has_no_end_are_said_to_be_left_out() -> None:
    cut = GOOD[: GOOD.index("</NumValues>") + len("</NumValues>")]
    assert only(read(cut)).endswith("what block 1 held so far is left out")


@pytest.mark.parametrize("begin", [0, GOOD.rindex("<PureOrMixtureData>")], ids=["read", "nobody's"])
@pytest.mark.parametrize("rows_kept", [1, 3, 50])
def test_the_values_of_a_block_that_has_no_end_are_counted(begin: int, rows_kept: int) -> None:
    """Of a block that is not wanted the first row is looked at, and the others are skipped."""
    start = GOOD.index("<NumValues>", begin)
    row = GOOD[start : GOOD.index("</NumValues>", start) + len("</NumValues>")]
    before = GOOD[:start].count("<PropertyValue>")
    reading = read(GOOD[:start] + row * rows_kept + row[:40])
    [told] = [d for d in reading.diagnostics if d.code == "file"]
    assert told.lost == rows_kept
    assert reading.values == before + rows_kept
    assert sum(map(len, reading.sets)) + sum(reading.unread.values()) == before


def test_a_block_of_too_many_kinds_of_rows_is_given_up_and_counted(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(columns, "_MOST_GROUPS", 1)
    monkeypatch.setattr(columns, "_MOST_WAITING", 2)
    reading = read(GOOD.replace("<nExpandUncertValue>0.8</nExpandUncertValue>", ""))
    [told] = reading.diagnostics
    assert told.sentence == "the rows of a block are of more than 1 kinds; what block 1 held so far is left out"
    assert told.lost == reading.values == 2


@pytest.mark.parametrize("before", ["\ufeff", " \n\t"])
def test_what_stands_before_the_declaration_does_no_harm(before: str) -> None:
    assert len(read(before + GOOD).sets) == len(read(GOOD).sets)


@pytest.mark.parametrize("encoding", ["utf-16", "latin-1"])
def test_other_encodings_are_read(encoding: str) -> None:
    text = GOOD.replace('encoding="UTF-8"', f'encoding="{encoding}"')
    assert [s.values.tolist() for s in read(text.encode(encoding)).sets] == [
        s.values.tolist() for s in read(GOOD).sets
    ]


def test_a_prefix_does_no_harm() -> None:
    prefixed = re.sub(r"<(/?)(?=[A-Za-z])", r"<\1t:", GOOD).replace("xmlns=", "xmlns:t=")
    assert [s.values.tolist() for s in read(prefixed).sets] == [s.values.tolist() for s in read(GOOD).sets]


@pytest.mark.parametrize(
    ("old", "new", "sentence"),
    [
        ("<nVarValue>300<", "<nVarValue>300,0<", "variable 1 is not one number: '300,0'"),
        ("<nVarValue>300<", "<nVarValue>3<!-- -->00<", ""),  # a comment within a number changes nothing
        ("<nVarValue>300<", "<nVarValue>3<x/>00<", "variable 1 is not one number: it holds elements"),
        ("<nVarValue>300<", "<nVarValue>nan<", "variable 1 is not one number: 'nan'"),
        ("<nVarValue>300<", "<nVarValue>1e99<", "its temperature is 1e+99, which cannot be"),
        ("<nVarValue>300<", "7<nVarValue>300<", ""),  # stray text is no part of a number
        ("<nVarNumber>1</nVarNumber>\n        <nVarValue>300<", "<nVarValue>300<", "variable '' is not declared"),
        ("<nPropValue>1001.5<", "<nPropValue>1_001.5<", "the value is not one number: '1_001.5'"),
        ("<nPropValue>1001.5<", "<nPropValue>1001.5</nPropValue><nPropValue>5<", "the value is not one number"),
        ("<nPropValue>1001.5<", "<!--<nPropValue>7</nPropValue>--><nPropValue>1001.5<", ""),
        ("<nPropValue>1001.5<", "<nPropValue><![CDATA[1001.5]]><", ""),
    ],
)
def test_a_value_that_is_not_one_number_is_no_value(old: str, new: str, sentence: str) -> None:
    assert old in GOOD
    reading = read(GOOD.replace(old, new, 1))
    first = reading.sets[0]
    if not sentence:
        assert first.values.tolist() == [218400.0, 1001500.0, 2960000.0]
        assert first.temperature.tolist() == [250.0, 300.0, 350.0]
        return
    assert first.values.tolist() == [218400.0, 2960000.0]
    [told] = reading.diagnostics
    assert told.sentence.startswith(f"saturation_pressure: row 2 left out: {sentence}")
    assert told.lost == 1


def test_two_properties_of_one_number_refuse_the_block() -> None:
    start = GOOD.index("<Property>", GOOD.index("<PureOrMixtureData>"))
    one = GOOD[start : GOOD.index("</Property>", start) + len("</Property>")]
    reading = read(GOOD.replace(one, one + one, 1))
    assert {s.block for s in reading.sets} == set(range(2, 12))
    [told] = reading.diagnostics
    assert (told.block, told.code, told.lost) == (1, "block", 3)


def test_two_compounds_of_one_number_are_nobody() -> None:
    text = GOOD.replace("<nOrgNum>2</nOrgNum>", "<nOrgNum>1</nOrgNum>", 1)
    reading = read(text)
    assert {s.component.name for s in reading.sets} == set()
    assert "its substance is 'nOrgNum 1', which several compounds of the file are" in reading.diagnostics[0].sentence


def test_a_declaration_after_the_values_refuses_the_block() -> None:
    late = "</NumValues><Component><RegNum><nOrgNum>2</nOrgNum></RegNum></Component>"
    reading = read(GOOD.replace("</NumValues>", late, 1))
    assert {s.block for s in reading.sets} == set(range(2, 12))
    [told] = reading.diagnostics
    assert (told.block, told.code, told.lost) == (1, "block", 3)
    assert told.sentence == "a Component is declared after its first values"


def test_a_value_given_twice_is_lost_twice() -> None:
    value = "<PropertyValue><nPropNumber>1</nPropNumber><nPropValue>5</nPropValue></PropertyValue></NumValues>"
    reading = read(GOOD.replace("</NumValues>", value, 1))
    [told] = reading.diagnostics
    assert (told.lost, told.sentence) == (2, "saturation_pressure: row 1 left out: its value is given twice")


def test_an_unknown_element_is_read_over_with_all_in_it() -> None:
    alien = (
        "<NewThing><nPropValue>5</nPropValue><PropertyValue><nPropNumber>1</nPropNumber></PropertyValue></NewThing>"
    )
    assert read(GOOD.replace("</NumValues>", f"{alien}</NumValues>")).sets[0].values.tolist() == [
        218400.0,
        1001500.0,
        2960000.0,
    ]


def test_reactions_are_passed_over() -> None:
    reaction = (
        "<ReactionData><Property><nPropNumber>1</nPropNumber></Property><NumValues><PropertyValue><nPropNumber>1"
        "</nPropNumber><nPropValue>5</nPropValue></PropertyValue></NumValues></ReactionData>"
    )
    place = GOOD.index("<PureOrMixtureData>")
    reading = read(GOOD[:place] + reaction + GOOD[place:])
    assert [(s.block, s.values.tolist()) for s in reading.sets] == [
        (s.block, s.values.tolist()) for s in read(GOOD).sets
    ]


def test_values_of_properties_of_one_name_are_counted_together() -> None:
    start = GOOD.index("<Property>", GOOD.index("Viscosity, Pa*s") - 400)
    viscosity = GOOD[start : GOOD.index("</Property>", start) + len("</Property>")]
    value = "<PropertyValue><nPropNumber>7</nPropNumber><nPropValue>5</nPropValue></PropertyValue>"
    again = viscosity.replace("<nPropNumber>1<", "<nPropNumber>7<")
    text = GOOD.replace(viscosity, viscosity + again)
    row = text.index("</NumValues>", text.index(again))
    assert read(text[:row] + value + text[row:]).unread["Viscosity, Pa*s"] == 2


def test_rows_of_two_kinds_come_out_in_their_order() -> None:
    """The second row of three has no uncertainty, so it is read apart from the others."""
    value = "<nExpandUncertValue>0.8</nExpandUncertValue>"
    assert GOOD.count(value) == 1
    one = read(GOOD.replace(value, "")).sets[0]
    assert one.rows.tolist() == [1, 2, 3]
    assert one.values.tolist() == [218400.0, 1001500.0, 2960000.0]
    assert [u > 0.0 for u in one.standard_uncertainty] == [True, False, True]


def test_a_block_longer_than_what_waits_is_read_whole() -> None:
    start = GOOD.index("<NumValues>")
    row = GOOD[start : GOOD.index("</NumValues>") + len("</NumValues>")]
    many = "".join(row.replace("<nVarValue>250<", f"<nVarValue>{250 + i / 100}<") for i in range(3000))
    one = read(GOOD.replace(row, many, 1)).sets[0]
    assert one.rows.tolist() == list(range(1, 3003))
    assert one.temperature.tolist() == [*(250 + i / 100 for i in range(3000)), 300.0, 350.0]


class Endless(io.RawIOBase):
    """A file of rows that are made as they are read."""

    def __init__(self, pieces: Iterator[bytes]) -> None:
        self._pieces, self._rest = pieces, b""

    def read(self, size: int = -1) -> bytes:
        while len(self._rest) < size and (piece := next(self._pieces, b"")):
            self._rest += piece
        taken, self._rest = self._rest[:size], self._rest[size:]
        return taken


def test_memory_does_not_grow_with_rows_nobody_judges() -> None:
    begin = GOOD.rindex("<PureOrMixtureData>")  # speeds of sound
    rows = GOOD.index("<NumValues>", begin)
    row = GOOD[rows : GOOD.index("</NumValues>", rows) + len("</NumValues>")].encode()

    def peak(times: int) -> int:
        pieces = iter([GOOD[:rows].encode(), *[row * 100] * times, b"</PureOrMixtureData></DataReport>"])
        tracemalloc.start()
        reading = thermoml.read_stream(Endless(pieces), "long.xml")  # type: ignore[arg-type]
        found = tracemalloc.get_traced_memory()[1]
        tracemalloc.stop()
        assert reading.unread["Speed of sound, m/s"] == 100 * times
        return found

    assert peak(100) < 1.5 * peak(10)
