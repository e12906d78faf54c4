"""One strict reader for every reference table: a damaged row is named with its file and line."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

from eosmuster import components, reference_rows
from eosmuster.errors import InputError
from eosmuster.models import model
from eosmuster.paths import references_folder
from eosmuster.sources.measured import substances

READERS: dict[str, Callable[[], object]] = {
    "components.csv": components.catalogue,
    "equations.csv": components.equation_citations,
    "formulas.csv": substances.formulas,
    "parameters/prsv_kappa1.csv": lambda: model.parameter_file("prsv_kappa1.csv"),
}
CACHES = (
    components._rows,
    components.catalogue,
    components.equation_citations,
    substances._rows,
    substances.formulas,
    model.parameter_file,
)


@pytest.fixture
def copied(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Path]:
    """A copy of the tables that may be damaged; what was read from it is forgotten again."""
    for name in READERS:
        (tmp_path / name).parent.mkdir(exist_ok=True)
        shutil.copyfile(references_folder() / name, tmp_path / name)

    def forget() -> None:
        for cached in CACHES:
            cached.cache_clear()

    monkeypatch.setattr(reference_rows, "references_folder", lambda: tmp_path)
    forget()
    yield tmp_path
    forget()


@pytest.mark.parametrize("name", READERS)
@pytest.mark.parametrize("change", [-1, 1])
def test_a_row_of_another_length_is_refused_whoever_reads(copied: Path, name: str, change: int) -> None:
    """A lost or an added comma would shift every cell behind it."""
    lines = (copied / name).read_text(encoding="utf-8").splitlines()
    head = lines[0].count(",") + 1
    lines[2] = ",".join(["x"] * (head + change))
    (copied / name).write_text("\n".join(lines) + "\n", encoding="utf-8")
    with pytest.raises(
        InputError, match=rf"^references/{name}, line 3: {head + change} cells?, but the header names"
    ):
        READERS[name]()


def test_a_row_without_a_source_is_refused_but_in_the_table_of_citations(copied: Path) -> None:
    (copied / "formulas.csv").write_text("component,formula,names,ambiguous,source\nArgon,Ar,,,\n", encoding="utf-8")
    with pytest.raises(InputError, match=r"formulas\.csv, line 2: no source"):
        substances.formulas()
    assert len(components.equation_citations()) > 80
