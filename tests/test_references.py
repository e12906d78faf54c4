"""Every row of the reference tables names where it comes from: a publication, or words that README.md explains."""

from __future__ import annotations

import csv
import re
from pathlib import Path

import pytest

from eosmuster.components import equation_citations
from eosmuster.paths import references_folder
from eosmuster.sources.bibliography import bibliography

TABLES = sorted(path.relative_to(references_folder()).as_posix() for path in references_folder().rglob("*.csv"))
WITHOUT = {"equations.csv"}
"""Tables whose rows are citations themselves."""


def rows(name: str) -> list[dict[str, str]]:
    with (references_folder() / name).open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


def exceptions() -> dict[str, list[re.Pattern[str]]]:
    """Table -> what README.md lists in place of keys; VERSION stands for a version of the library."""
    readme = (references_folder() / "README.md").read_text(encoding="utf-8")
    listed = re.findall(r"^\| `([^`]+)` \| `([^`]+\.csv)` \|", readme, re.MULTILINE)
    found: dict[str, list[re.Pattern[str]]] = {}
    for words, table in listed:
        found.setdefault(table, []).append(re.compile(re.escape(words).replace("VERSION", r"\d+\.\d+\.\d+")))
    return found


@pytest.mark.parametrize("table", [name for name in TABLES if name not in WITHOUT])
def test_every_source_is_a_key_or_one_of_the_words_that_the_readme_lists(table: str) -> None:
    keys, words = {*bibliography(), *equation_citations()}, exceptions().get(table, [])
    strange = {
        row["source"]
        for row in rows(table)
        if not set(row["source"].split("|")) <= keys and not any(w.fullmatch(row["source"]) for w in words)
    }
    assert strange == set()


def test_the_readme_lists_no_words_that_no_table_has() -> None:
    for table, words in exceptions().items():
        found = {row["source"] for row in rows(table)}
        assert all(any(w.fullmatch(source) for source in found) for w in words), table


def test_no_key_is_two_publications() -> None:
    assert set(bibliography()) & set(equation_citations()) == set()
    text = (references_folder() / "bibliography.bib").read_text(encoding="utf-8")
    assert len(re.findall(r"^@\w+\{", text, re.MULTILINE)) == len(bibliography())


def test_the_readme_names_every_folder_of_tables() -> None:
    readme = (references_folder() / "README.md").read_text(encoding="utf-8")
    assert [name for name in TABLES if Path(name).parts[0] not in readme] == []
