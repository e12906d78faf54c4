"""The house: imports run downwards only, and nobody reaches back through the front door.

Every import counts, those inside functions too. An import under ``if TYPE_CHECKING`` never runs, so it may
close a cycle; it has to respect the floors all the same.
"""

from __future__ import annotations

import ast
from collections.abc import Iterator
from graphlib import CycleError, TopologicalSorter
from pathlib import Path
from typing import NamedTuple

import pytest

PACKAGE = "eosmuster"
SOURCE = Path(__file__).resolve().parents[1] / "harness" / PACKAGE

FLOORS = (
    {"__main__", "pytest_plugin"},
    {"cli"},
    {"commands"},
    {"listing"},
    {"listing_references"},
    {"api", "inquiry", "combining", "replaying"},
    {"prechecks"},
    {"sweeping", "drifting"},
    {"report"},
    {"compare", "diagnose"},
    {"record"},
    {"saturation", "singlephase", "sources"},
    {"plan"},
    {"models"},
    {"components"},
    {"reference_rows"},
    {"quantities", "paths"},
    {"errors", "progress"},
)
"""Rooms, top floor first. A room may import what lies below it; rooms on one floor do not know each other."""

ONLY = {
    "report": {"record", "quantities", "paths", "errors"},
    "compare": {"record", "quantities", "errors"},
    "diagnose": {"record", "components", "quantities", "errors"},
    "record": set(),
    "progress": set(),
    "sources": {"components", "reference_rows", "quantities", "paths", "errors", "progress"},
    "saturation": {"models", "quantities", "errors"},
    "singlephase": {"models", "quantities", "errors"},
    "drifting": {"report", "record", "quantities", "paths", "errors"},
}
"""Rooms that may see less than all that lies below: a report cannot recompute, a reference knows no model."""

ROOT_NAMES = {"cli": {"__version__"}}
"""Who may take what from the package itself."""

PROMISED_CYCLES: set[tuple[str, str]] = set()
"""Imports for the type checker alone that look back up, (importer, imported), each with its reason. None so far."""


class Import(NamedTuple):
    """One module imports another; both without the package's name in front."""

    importer: str
    imported: str
    typing_only: bool
    line: int

    @property
    def rooms(self) -> tuple[str, str]:
        return room(self.importer), room(self.imported)

    def __str__(self) -> str:
        return f"{self.importer}, line {self.line}: imports {self.imported or 'the package root'}"


def room(module: str) -> str:
    return module.partition(".")[0]


def modules(source: Path) -> dict[str, Path]:
    """Module names, a package's ``__init__`` under the package's own name; the root is ""."""
    found = {}
    for path in sorted(source.rglob("*.py")):
        parts = path.relative_to(source).with_suffix("").parts
        found[".".join(parts[:-1] if parts[-1] == "__init__" else parts)] = path
    return found


def imports_of(module: str, tree: ast.Module, known: set[str]) -> Iterator[Import]:
    typing_only = {
        id(inner)
        for node in ast.walk(tree)
        if isinstance(node, ast.If) and ast.unparse(node.test).endswith("TYPE_CHECKING")
        for statement in node.body
        for inner in ast.walk(statement)
    }
    for node in ast.walk(tree):
        for target in targets(node, known):
            yield Import(module, target, id(node) in typing_only, node.lineno)


def targets(node: ast.AST, known: set[str]) -> Iterator[str]:
    """Modules of the package that a statement imports; `from package import module` imports the module."""
    if isinstance(node, ast.Import):
        for alias in node.names:
            if room(alias.name) == PACKAGE:
                yield alias.name.partition(".")[2]
    elif isinstance(node, ast.ImportFrom):
        assert node.level == 0, f"line {node.lineno}: a relative import hides where it leads"
        if room(node.module or "") == PACKAGE:
            base = (node.module or "").partition(".")[2]
            for alias in node.names:
                inner = f"{base}.{alias.name}" if base else alias.name
                yield inner if inner in known else base


def read(source: Path) -> list[Import]:
    found = modules(source)
    return [
        one
        for module, path in found.items()
        for one in imports_of(module, ast.parse(path.read_text(encoding="utf-8")), set(found))
    ]


@pytest.fixture(scope="module")
def imports() -> list[Import]:
    return read(SOURCE)


def broken(imports: list[Import]) -> list[str]:
    """What breaks the floors, one sentence each."""
    floor = {name: i for i, names in enumerate(FLOORS) for name in names}
    found = []
    for one in imports:
        above, below = one.rooms
        if above in ("", below) or below == "":
            continue
        if not {above, below} <= set(floor):
            found.append(f"{one}, and one of them has no floor yet")
        elif floor[above] >= floor[below]:
            found.append(f"{one} on its own floor or above")
        if below not in ONLY.get(above, {below}):
            found.append(f"{one}, which it must not see")
    return found


def cycles(imports: list[Import]) -> list[str]:
    graph: dict[str, set[str]] = {}
    for one in imports:
        if not one.typing_only and one.importer != one.imported:
            graph.setdefault(one.importer, set()).add(one.imported)
    try:
        TopologicalSorter(graph).prepare()
    except CycleError as error:
        return list(error.args[1])
    return []


def test_every_room_has_a_floor() -> None:
    rooms = {room(name) for name in modules(SOURCE)} - {""}
    listed = [name for names in FLOORS for name in names]
    assert len(listed) == len(set(listed))
    assert rooms - set(listed) == set()


def test_imports_run_downwards(imports: list[Import]) -> None:
    assert broken(imports) == []


def test_there_is_no_cycle_between_modules(imports: list[Import]) -> None:
    assert cycles(imports) == []


def test_cycles_for_the_type_checker_are_promised(imports: list[Import]) -> None:
    running = [one for one in imports if not one.typing_only]
    back = {
        (one.importer, one.imported)
        for one in imports
        if one.typing_only and one.importer and cycles([*running, one._replace(typing_only=False)])
    }
    assert back == PROMISED_CYCLES


def test_nothing_comes_in_through_the_front_door(imports: list[Import]) -> None:
    for module, path in modules(SOURCE).items():
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            if isinstance(node, ast.ImportFrom) and node.module == PACKAGE:
                taken = {alias.name for alias in node.names if alias.name not in modules(SOURCE)}
                assert taken <= ROOT_NAMES.get(module, set()), f"{module}, line {node.lineno}"
    assert not [str(one) for one in imports if one.imported == "" and room(one.importer) not in ROOT_NAMES]


def test_the_front_door_opens_nothing_by_itself(imports: list[Import]) -> None:
    assert [str(one) for one in imports if one.importer == "" and not one.typing_only] == []


@pytest.mark.parametrize(
    ("module", "text", "fault"),
    [
        ("report.views", "from eosmuster.models.catalogue import CATALOGUE", "must not see"),
        ("report.views", "def f():\n    import eosmuster.sweeping.run", "on its own floor or above"),
        ("saturation.solver", "from eosmuster.sources import library", "on its own floor or above"),
        ("quantities", "from eosmuster import paths", "on its own floor or above"),
        ("errors", "if TYPE_CHECKING:\n    from eosmuster.components import Component", "on its own floor or above"),
    ],
)
def test_a_broken_rule_is_seen(module: str, text: str, fault: str) -> None:
    known = set(modules(SOURCE))
    [sentence] = broken(list(imports_of(module, ast.parse(text), known)))[:1]
    assert sentence.startswith(f"{module}, line ")
    assert fault in sentence


def test_a_cycle_is_seen() -> None:
    known = {"plan.a", "plan.b"}
    there = imports_of("plan.a", ast.parse("from eosmuster.plan import b"), known)
    back = imports_of("plan.b", ast.parse("def f():\n    from eosmuster.plan.a import x"), known)
    assert set(cycles([*there, *back])) == known
