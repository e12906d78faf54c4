"""The Python interface, as its contract has it."""

from __future__ import annotations

import csv
from collections.abc import Callable
from dataclasses import fields, replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import eosmuster as em
from eosmuster.api import read_plan
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.plan import builtin
from eosmuster.record import POINT_VERDICTS, SummaryRow, WindowRow

PlanFile = Callable[..., Path]

NUMBERS = ("temperature", "pressure", "liquid_density", "vapor_density", "enthalpy_of_vaporization", "log_slope")


# ---------------------------------------------------------------- saturate


@pytest.mark.parametrize("shape", [(), (1,), (4,), (2, 3), (0,), (2, 0), (2, 1, 3)])
@pytest.mark.parametrize("given", ["temperature", "pressure"])
def test_results_have_the_shape_that_was_asked_for(given: str, shape: tuple[int, ...]) -> None:
    values = np.full(shape, 300.0 if given == "temperature" else 1e6)
    r = em.saturate("propane", "PR", **{given: values})
    for name in NUMBERS:
        array = getattr(r, name)
        assert isinstance(array, np.ndarray)
        assert (array.shape, array.dtype) == (shape, np.float64)
    assert r.status.shape == shape
    assert (r.status == "solved").all()
    assert np.array_equal(getattr(r, given), values)


@pytest.mark.parametrize("values", [300, 300.0, [300, 310], (300.0,), np.array([300, 310])])
def test_anything_like_an_array_will_do(values: Any) -> None:
    r = em.saturate("propane", "PR", temperature=values)
    assert r.pressure.shape == np.shape(values)
    assert r.pressure.flat[0] == pytest.approx(997430.0, abs=0.5)  # as the doctest of the package


def test_an_element_that_fails_is_nan_with_its_status_and_the_others_stay() -> None:
    r = em.saturate("propane", "PR", temperature=[300.0, 400.0, -5.0, 0.0, np.nan, np.inf, 310.0])
    assert r.status.tolist() == ["solved", "above_critical", *["invalid"] * 4, "solved"]
    for name in NUMBERS[1:]:
        assert np.isfinite(getattr(r, name)).tolist() == [True, *[False] * 5, True], name
    r = em.saturate("propane", "PR", pressure=[1e5, 1e7, -1.0, np.nan])
    assert r.status.tolist() == ["solved", "above_critical", "invalid", "invalid"]
    assert np.isfinite(r.temperature).tolist() == [True, False, False, False]


@pytest.mark.parametrize("model", CATALOGUE)
def test_temperature_and_pressure_are_each_other_s_inverse(model: str) -> None:
    there = em.saturate("propane", model, temperature=[200.0, 250.0, 300.0, 350.0])
    back = em.saturate("propane", model, pressure=there.pressure)
    assert back.temperature == pytest.approx(there.temperature, rel=1e-12)
    assert back.liquid_density == pytest.approx(there.liquid_density, rel=1e-9)


def test_a_result_is_not_changed_by_what_becomes_of_its_input() -> None:
    values = np.array([250.0, 300.0])
    r = em.saturate("propane", "PR", temperature=values)
    values[:] = 0.0
    assert r.temperature.tolist() == [250.0, 300.0]


def test_own_constants() -> None:
    own = em.Component(
        name="x",
        critical_temperature=369.89,
        critical_pressure=4251200.0,
        acentric_factor=0.1521,
        molar_mass=0.0440956,
    )
    mine, theirs = (em.saturate(c, "PR78", temperature=300.0) for c in (own, "propane"))
    assert mine.pressure == pytest.approx(theirs.pressure, rel=1e-4)  # the catalogue has more digits


@pytest.mark.parametrize("name", ["propane", "PROPANE", "n-Propane", "R290", "74-98-6"])
def test_names_aliases_and_cas_numbers(name: str) -> None:
    assert em.saturate(name, "PR", temperature=300.0).pressure == pytest.approx(997430.0, abs=0.5)


@pytest.mark.parametrize(
    ("arguments", "keywords", "fragments"),
    [
        (("propane", "PR"), {}, ("exactly one", "phase rule")),
        (("propane", "PR"), {"temperature": 300.0, "pressure": 1e5}, ("exactly one", "phase rule")),
        (("propan", "PR"), {"temperature": 300.0}, ("'propan' is unknown", "nearest: propan")),
        (("R410A", "PR"), {"temperature": 300.0}, ("left out", "a blend")),
        (("propane", "PR87"), {"temperature": 300.0}, ("'PR87'", "nearest: PR78")),
        (("propane", ["PR", "SRK"]), {"temperature": 300.0}, ("unknown model a list",)),
        ((["propane"], "PR"), {"temperature": 300.0}, ("component = a list", "neither a name nor a Component")),
        (("helium", "PR-Twu91"), {"temperature": 4.0}, ("PR-Twu91 is unavailable for Helium", "no parameters")),
        (("propane", "PR"), {"temperature": "hot"}, ("temperature = 'hot' is not a number",)),
        (("propane", "PR"), {"pressure": [[1.0], [1.0, 2.0]]}, ("pressure = ", "not a number or an array")),
    ],
)
def test_bad_calls(arguments: tuple[Any, Any], keywords: dict[str, Any], fragments: tuple[str, ...]) -> None:
    with pytest.raises(em.InputError) as caught:
        em.saturate(*arguments, **keywords)
    message = str(caught.value)
    assert "\n" not in message
    for fragment in fragments:
        assert fragment in message


# ---------------------------------------------------------------- sweep


def test_a_plan_by_path_by_text_of_its_path_and_by_itself(plan_file: PlanFile) -> None:
    path = plan_file()
    by_path, by_text, by_plan = (em.sweep(plan) for plan in (path, str(path), read_plan(path)))
    assert by_path.points.equals(by_text.points)
    assert by_path.points.equals(by_plan.points)
    assert by_path.record.plan_name == "small"


@pytest.mark.parametrize("name", builtin.names())
def test_built_in_plans_by_name(name: str) -> None:
    assert read_plan(name).name == name


def test_the_default_plan() -> None:
    assert read_plan(None).name == builtin.DEFAULT == "broad"


def test_a_file_wins_over_nothing_and_a_built_in_name_over_a_file(
    plan_file: PlanFile, monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    monkeypatch.chdir(tmp_path)
    plan_file("broad").rename("broad")
    assert len(read_plan("broad").components) > 30
    assert [c.name for c in read_plan(Path("broad")).components] == ["n-Propane"]
    plan_file("mine").rename("mine")
    assert read_plan("mine").name == "mine"
    with pytest.raises(em.InputError, match="'broud' is neither a file nor a built-in plan; nearest: broad"):
        read_plan("broud")


def test_tables_have_the_columns_of_the_files(plan_file: PlanFile, tmp_path: Path) -> None:
    results = em.sweep(plan_file(models='["PR", "vdW", "PR-Twu91"]', properties='"all"'))
    folder = results.save(tmp_path / "results")
    for name, table in (("points", results.points), ("summary", results.summary), ("windows", results.windows)):
        with (folder / f"{name}.csv").open(newline="", encoding="utf-8") as file:
            header, *rows = csv.reader(file)
        assert list(table) == header
        assert len(table) == len(rows)
        for column in table:
            if table[column].dtype.kind == "f":
                written = [float(cell[header.index(column)] or "nan") for cell in rows]
                assert np.array_equal(table[column], written, equal_nan=True), column
    assert list(results.summary) == [field.name for field in fields(SummaryRow)]
    assert list(results.windows) == [field.name for field in fields(WindowRow)]
    assert set(results.points["verdict"]) <= set(POINT_VERDICTS)


def test_a_part_with_nothing_to_do_has_empty_tables(plan_file: PlanFile) -> None:
    part, whole = (em.sweep(replace(read_plan(plan_file()), part=part)) for part in ((2, 2), None))
    assert part.record.blocks == ()
    for name in ("points", "summary", "windows"):
        assert getattr(part, name).empty
        assert list(getattr(part, name)) == list(getattr(whole, name))


def test_results_are_saved_whole_and_never_over_others_by_accident(plan_file: PlanFile, tmp_path: Path) -> None:
    results = em.sweep(plan_file())
    place = tmp_path / "results"
    assert results.save(place, points=False) == place
    assert not (place / "points.csv").exists()
    with pytest.raises(em.InputError, match="holds the results of an earlier run"):
        results.save(place)
    assert results.save(str(place), overwrite=True) == place
    assert (place / "points.csv").exists()


def test_a_sweep_that_cannot_judge_anything(plan_file: PlanFile) -> None:
    with pytest.raises(em.NothingJudged):
        em.sweep(plan_file(tail="[states]\npressure = ['60 bar']\n"))


# ---------------------------------------------------------------- the package itself


def test_every_name_of_the_package_is_there() -> None:
    assert dir(em) == sorted(em.__all__)
    for name in em.__all__:
        assert getattr(em, name) is not None
    assert em.EosmusterError in em.InputError.__mro__
    with pytest.raises(AttributeError, match="'eosmuster' has no attribute 'saturated'"):
        em.saturated  # noqa: B018
