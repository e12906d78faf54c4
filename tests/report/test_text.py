import pytest

from eosmuster.report.text import cells_of, for_encoding, list_within, number, one_line, plain_table, shortened


@pytest.mark.parametrize("width", [20, 40, 60, 100])
def test_no_line_of_a_table_is_wider_than_asked(nasty_names, width):
    rows = [(name, 1.5, name, "-", 123456) for name in nasty_names]
    lines = plain_table(["a name", "value", "another", "none", "count"], rows, width).split("\n")
    assert len(lines) == 2 + len(nasty_names)
    assert max(map(cells_of, lines)) <= width


def test_more_columns_than_fit_are_cut_off_not_wrapped():
    table = plain_table([f"column {i}" for i in range(60)], [[i * 1000.5 for i in range(60)]], 80)
    assert [cells_of(line) <= 80 for line in table.split("\n")] == [True] * 4


def test_names_give_way_before_numbers():
    table = plain_table(["model", "p, bar"], [["a name that is far too long for this", 12.34567]], 24)
    assert table.split("\n")[3] == "a name that is f…  12.35"


def test_columns_of_numbers_are_right_aligned_with_gaps():
    lines = plain_table(["x", "share"], [["a", "100 %"], ["b", "-"], ["c", "5 %"]]).split("\n")
    assert lines[2:] == ["a  100 %", "b      -", "c    5 %"]


def test_wide_characters_take_two_columns():
    lines = plain_table(["name", "n"], [["水水", 1], ["PR", 2]]).split("\n")
    assert [cells_of(line) for line in lines] == [7, 7, 7, 7]
    assert shortened("水水水", 4) == "水…"
    assert cells_of("e\u0301") == 1


@pytest.mark.parametrize("text", ["\x1b[31mred", "a\nb", "a\x00b", "\u202eabc\u202c", "a\u2028b", "\udc80x"])
def test_one_line_cannot_steer_a_terminal(text):
    cleaned = one_line(text)
    assert cleaned.isprintable()
    assert cleaned


def test_numbers_for_people():
    values = [0.0, -0.00012344, 8.314, 101325.0, 4251200.0, 1.2e12, float("inf"), 7, True, None]
    assert [number(v) for v in values] == [
        "0",
        "-0.0001234",
        "8.314",
        "101325",
        "4251200",
        "1.2e+12",
        "inf",
        "7",
        "True",
        "-",
    ]


@pytest.mark.parametrize("width", range(1, 40))
def test_a_list_never_exceeds_its_width_and_counts_what_is_left_out(width):
    names = ["propane", "propylene glycol", "water", "R134a"]
    text = list_within(names, width)
    assert cells_of(text) <= max(width, 2)  # "+4" is the least
    shown = [part for part in text.split("+")[0].strip().split(", ") if part]
    left = int(text.rsplit("+", 1)[1]) if "+" in text else 0
    assert len(shown) + left == len(names)


def test_encodings_that_lack_a_character():
    assert for_encoding("a…", "utf-8") == "a…"
    assert for_encoding("a…水", "latin-1") == "a~?"
    assert for_encoding("a…", None) == "a~"


@pytest.mark.parametrize("text", ["plain text", "水とアンモニア", "e\u0301" * 9, "a水b" * 5, "    blanks   "])
@pytest.mark.parametrize("width", [0, 1, 2, 5, 7, 30])
def test_shortened_keeps_as_much_as_fits(text, width):
    whole = max(n for n in range(len(text) + 1) if cells_of(text[:n]) <= max(width - 1, 0))
    expected = text if cells_of(text) <= width else (text[:whole].rstrip() + "…")[:width]
    assert shortened(text, width) == expected


def test_headers_are_broken_over_lines_before_anything_is_cut():
    table = plain_table(["", "liquid, kg/m3", "h_vap, kJ/mol"], [["SRK", 539.621, 24.1888]], 20)
    assert [line.rstrip() for line in table.split("\n")] == [
        "     liquid,  h_vap,",
        "       kg/m3  kJ/mol",
        "---  -------  ------",
        "SRK    539.6   24.19",
    ]
    assert plain_table(["", "h_vap, kJ/mol"], [["SRK", 24.2]], 30).split("\n")[0] == "     h_vap, kJ/mol"
