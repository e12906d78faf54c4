"""``list references``: counts, sources and fluids, and all there is of one fluid."""

from __future__ import annotations

import re

import pytest

from eosmuster import listing_references as listing
from eosmuster.components import catalogue, equation_citations, find
from eosmuster.errors import InputError
from eosmuster.report.text import cells_of
from eosmuster.sources import critical, handbook, library_gate, stated
from eosmuster.sources.bibliography import bibliography
from eosmuster.sources.contested import contested

TEXT = listing.references_text(100)


def row(text: str, first: str) -> list[str]:
    [found] = [line for line in text.splitlines() if re.match(re.escape(first) + r"(  |$)", line)]
    return re.split(r" {2,}", found.strip())


def test_how_many_fluids_have_something_of_each_property() -> None:
    """The least that a survey of all classes of fluids needs: our own numbers."""
    columns = {name: list(map(int, row(TEXT.partition("\n\n")[0], name)[1:])) for name in listing.BY_FLUID}
    known = {c.property: c for c in handbook.coverage()}
    for name, (equation, correlations, tables, either, uncertainty, read) in columns.items():
        assert equation == len(catalogue())
        assert (correlations, tables, either) == (known[name].correlations, known[name].tables, known[name].either)
        asked = "saturation_pressure" if name == "boiling_temperature" else name
        assert uncertainty == sum(bool(stated.statements(c, asked)) for c in catalogue())
        noted = [s for c in catalogue() for s in stated.statements(c, asked) if "memory" not in s.how_read]
        assert read == len({s.component for s in noted})
    assert columns["saturation_pressure"][1] >= 95
    assert columns["liquid_density"][1] >= 75
    assert columns["enthalpy_of_vaporization"][1] >= 70
    assert columns["saturation_pressure"][2] >= 36  # 35 and water
    assert columns["boiling_temperature"][2] >= 100
    assert min(columns["saturation_pressure"][4], columns["liquid_density"][4]) >= 60


def test_every_source_is_counted() -> None:
    for count in (*handbook.counts(), *critical.counts()):
        cells = [count.property, count.source, str(count.components), str(count.rows), str(count.excluded)]
        assert re.search("^" + " +".join(map(re.escape, cells)) + "$", TEXT, re.MULTILINE)


def test_every_fluid_has_a_row_that_fits() -> None:
    matrix = TEXT.split("\n\n")[3].splitlines()[2:]
    assert [re.split(r" {2,}", line)[0] for line in matrix] == list(catalogue())
    assert max(map(cells_of, matrix)) <= 80


@pytest.mark.parametrize("name", ["n-Propane", "CycloPropane", "SulfurDioxide", "OrthoHydrogen", "Water"])
def test_cells_count_what_is_handed_out_and_mark_the_rest(name: str) -> None:
    component = find(name)
    cells = dict(zip(["component", *listing.BY_FLUID], row(TEXT, component.name), strict=False))
    for about in listing.BY_FLUID:
        every = [*handbook.correlations(component.cas, about, include_excluded=True)] if component.cas else []
        every += handbook.tables(component.cas, about, include_excluded=True) if component.cas else ()
        used = {one.source for one in every if not one.excluded}
        left_out = {one.source for one in every if one.excluded} - used
        number, *marks = cells[about].split()
        assert int(number) == len(used) + 1
        assert (f"x{len(left_out)}" in marks) == bool(left_out)
        asked = "saturation_pressure" if about == "boiling_temperature" else about
        assert ("u" in "".join(marks)) >= bool(stated.statements(component.name, asked))
        assert ("!" in "".join(marks)) == ((component.name, about) in contested())


def test_one_fluid_with_its_sources_ranges_and_evidence() -> None:
    text = listing.component_references_text("SO2", 100)
    assert text.startswith("SulfurDioxide, CAS 7446-09-5\n")
    about = text.partition("boiling temperature\n")[0]
    [perry] = [c for c in handbook.correlations("7446-09-5", "saturation_pressure") if "perry" in c.source]
    assert row(about, perry.source) == [perry.source, "correlation", "197.67", "430.75", "not stated"]
    assert "! handbook:dippr101-perry-2008 stands alone against coolprop" in about
    assert "critical:mathews-1972   430.8   78.841" in text


def test_what_is_left_out_has_its_evidence() -> None:
    text = listing.component_references_text("perfluorobutane", 200)
    assert re.search(r"^handbook:antoine-landolt-boernstein-20 .* excluded; not stated$", text, re.MULTILINE)
    assert "a decimal point" in " ".join(text.split())
    assert "x critical:passut-danner-1973: omega +0.134" in listing.component_references_text("cyclopropane", 200)


def test_ranges_of_the_library_are_those_of_its_equation() -> None:
    """Cyclopropane's equation is meant to be used from 273 K on, far above the triple point."""

    ends = library_gate.limits(find("cyclopropane"))
    assert ends is not None
    name = f"coolprop {library_gate.version()}"
    about = listing.component_references_text("cyclopropane", 100).partition("boiling temperature\n")[0]
    assert row(about, name)[2] == f"{ends.from_K:.2f}" == "273.00"


@pytest.mark.parametrize("name", catalogue())
def test_every_fluid_can_be_shown_and_every_source_is_cited(name: str) -> None:
    text = listing.component_references_text(name, 90)
    assert max(map(cells_of, text.splitlines())) <= 90
    said = " ".join(text.split("\nsources\n")[1].split())
    for about in (*listing.BY_FLUID, listing.CONSTANTS):
        for one in listing.entries(catalogue()[name], about):
            assert one.citation in bibliography() or one.kind == "equation"
            assert one.citation.split(",")[0] in said
    keys = filter(None, catalogue()[name].sources["equation"].split(", "))
    assert all(" ".join(equation_citations()[key].split()) in said for key in keys)


def test_an_unknown_fluid_is_one_sentence() -> None:
    with pytest.raises(InputError, match="component 'propanol' is unknown; nearest: "):
        listing.component_references_text("propanol", 100)
