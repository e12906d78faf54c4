"""The page as a tree, and invented records that show every part of it."""

from __future__ import annotations

import io
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field, replace
from html.parser import HTMLParser

import numpy as np
import pytest

from eosmuster.record import Block, Record, Region, Ring
from eosmuster.report.dossier.page import write_dossier

VOID = {"meta", "link", "input", "br"}


@dataclass
class Node:
    """One element: its text and its children in order."""

    tag: str
    attributes: dict[str, str]
    parts: list[Node | str] = field(default_factory=list)

    @property
    def text(self) -> str:
        return "".join(part if isinstance(part, str) else part.text for part in self.parts)

    def walk(self) -> Iterator[Node]:
        yield self
        for part in self.parts:
            if isinstance(part, Node):
                yield from part.walk()

    def all(self, tag: str, **attributes: str) -> list[Node]:
        """Find elements by tag and by words that an attribute must have (``class_`` for class)."""
        wanted = {key.rstrip("_"): value for key, value in attributes.items()}
        return [
            node
            for node in self.walk()
            if node.tag == tag and all(v in node.attributes.get(k, "").split() for k, v in wanted.items())
        ]

    def one(self, tag: str, **attributes: str) -> Node:
        found = self.all(tag, **attributes)
        assert len(found) == 1, (tag, attributes, len(found))
        return found[0]

    def rows(self) -> list[list[str]]:
        """Read the body of a table."""
        return [
            [part.text for part in row.parts if isinstance(part, Node)]
            for body in self.all("tbody")
            for row in body.all("tr")
        ]


class _Reader(HTMLParser):
    """Builds the tree; what is not closed where it should be fails."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.root = Node("#", {})
        self.open = [self.root]

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        names = [name for name, _ in attrs]
        assert len(names) == len(set(names)), (tag, names)
        node = Node(tag, {name: value or "" for name, value in attrs})
        self.open[-1].parts.append(node)
        if tag not in VOID:
            self.open.append(node)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.handle_starttag(tag, attrs)
        if tag not in VOID:
            self.open.pop()

    def handle_endtag(self, tag: str) -> None:
        assert self.open[-1].tag == tag, (self.open[-1].tag, tag)
        self.open.pop()

    def handle_data(self, data: str) -> None:
        self.open[-1].parts.append(data)


def parsed(text: str) -> Node:
    reader = _Reader()
    reader.feed(text)
    reader.close()
    assert len(reader.open) == 1
    return reader.root


def dossier_bytes(record: Record) -> bytes:
    file = io.BytesIO()
    write_dossier(record, file)
    return file.getvalue()


@pytest.fixture
def written() -> Callable[[Record], bytes]:
    """Write a page."""
    return dossier_bytes


@pytest.fixture
def read_page() -> Callable[[Record], Node]:
    """Write a page and read it back as a tree."""
    return lambda record: parsed(dossier_bytes(record).decode())


def plane_block(component: str) -> Block:
    """Single-phase states over a grid of temperatures and pressures; invented."""
    temperature, pressure = (a.ravel() for a in np.meshgrid(np.linspace(230, 400, 9), np.geomspace(1e5, 1e7, 7)))
    deviation = np.vstack([(temperature - 300.0) / 30.0 + k * np.log(pressure / 1e6) for k in (0.8, 1.6)])
    deviation[1, ::11] = np.nan
    verdict = np.where(np.isnan(deviation), 4, np.where(np.abs(deviation) <= 2.0, 0, 1)).astype(np.int8)
    reference = np.full(temperature.size, 1e4)
    return Block(
        *(component, "000-00-0", "density", "mol/m3", "liquid", "coolprop"),
        candidates=("PR", "SRK"),
        independence=("independent", "independent"),
        temperature=temperature,
        pressure=pressure,
        reduced_temperature=temperature / 375.0,
        reference=reference,
        reference_uncertainty_pct=np.full(temperature.size, 0.2),
        limit_pct=np.full(temperature.size, 2.0),
        predicted=reference * (1.0 + deviation / 100.0),
        deviation_pct=deviation,
        probability_inside=np.full(deviation.shape, np.nan),
        verdict=verdict,
        note=np.zeros(deviation.shape, dtype=np.int16),
        notes=("",),
    )


@pytest.fixture
def plane_record(record_of: Callable[..., Record]) -> Record:
    """Two fluids over a plane; one candidate has a region with a hole."""
    outline = Ring(
        np.array([240.0, 290.0, 350.0, 340.0]),
        np.array([1e5, 1e5, 2e6, 6e6]),
        ("plan_limit", "phase_boundary", "limit", "undecided"),
    )
    hole = Ring(np.array([290.0, 290.0, 300.0]), np.array([3e5, 6e5, 4e5]), ("unsolved", "limit", "limit"))
    record = record_of([plane_block("alphane"), plane_block("betane")])
    region = Region("alphane", "PR", "density", "coolprop", "liquid", outline, (hole,), 0.41, 2)
    return replace(record, regions=(region,), references=("coolprop",))
