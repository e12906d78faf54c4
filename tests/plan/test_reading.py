"""Good plans: everything the design's example says arrives, in SI."""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import pairwise
from pathlib import Path

import pytest

from eosmuster.errors import InputError
from eosmuster.plan.grids import Grid
from eosmuster.plan.limits import DEFAULT_RULES
from eosmuster.plan.reading import load_plan, parse_plan
from eosmuster.plan.schema import REFERENCES, Decision, Display, Gate, Limit, Plan, ToleranceRule
from eosmuster.plan.states import choose_regions
from eosmuster.quantities import PROPERTIES, SATURATION, SINGLE_PHASE

MINIMAL = 'components = ["propane"]\nproperties = ["saturation_pressure"]\n'

EXAMPLE = """
title = "Propylene refrigeration loop"
service = "an invented loop"
components = ["propane", "propylene", "ethane", "Plant Cut 7"]
models = ["SRK", "PR", "PR78", "PR-Twu91"]
properties = ["saturation_pressure", "liquid_density"]

[states]
temperature = { from = "-60 degC", to = "90 degC", points = 61 }

[tolerance]
saturation_pressure = "2 %"
liquid_density = "3 %"

[[tolerance.exception]]
property = "liquid_density"
above_reduced_temperature = 0.95
limit = "10 %"

[[tolerance.exception]]
property = "saturation_pressure"
component = ["propane", "plant cut 7"]
below_reduced_temperature = 0.6
limit = "20 mbar"
rationale = "vacuum"

[decision]
rule = "simple"
coverage_factor = 3

[references]
use = ["coolprop"]
files = []

[gate]
fail_on = ["unsolved"]

[display]
temperature = "K"
density = "mol/L"

[[component]]
name = "plant cut 7"
critical_temperature = "540.2 K"
critical_pressure = "27.4 bar"
acentric_factor = 0.35
molar_mass = "100.2 g/mol"
critical_density = "232 kg/m3"
triple_temperature = "-90 degC"
class = "n-alkane"
source = "invented"
"""


def parse(text: str) -> Plan:
    return parse_plan(text, "t", "t.toml")


@pytest.fixture(scope="module")
def example() -> Plan:
    return parse(EXAMPLE)


def test_heading(example: Plan) -> None:
    assert (example.name, example.title, example.service) == ("t", "Propylene refrigeration loop", "an invented loop")
    assert (example.path, example.text) == ("", EXAMPLE)


def test_components_keep_the_order_of_the_plan(example: Plan) -> None:
    assert [c.cas for c in example.components] == ["74-98-6", "115-07-1", "74-84-0", ""]
    assert example.components[3].name == "plant cut 7"


def test_own_component_arrives_in_si_with_its_source(example: Plan) -> None:
    own = example.components[3]
    assert own.critical_temperature == 540.2
    assert own.critical_pressure == pytest.approx(2.74e6, rel=1e-15)
    assert own.acentric_factor == 0.35
    assert own.molar_mass == pytest.approx(0.1002, rel=1e-15)
    assert own.critical_density == pytest.approx(232 / 0.1002, rel=1e-15)
    assert own.triple_temperature == pytest.approx(183.15, rel=1e-15)
    assert (own.family, own.library_name) == ("n-alkane", "")
    assert dict(own.sources) == {
        "critical_temperature": "invented",
        "critical_pressure": "invented",
        "acentric_factor": "invented",
        "molar_mass": "invented",
        "critical_density": "invented",
        "triple_temperature": "invented",
    }


def test_models_and_properties(example: Plan) -> None:
    assert example.models == ("SRK", "PR", "PR78", "PR-Twu91")
    assert example.own_models == ()
    assert example.properties == ("saturation_pressure", "liquid_density")


def test_grid(example: Plan) -> None:
    assert (example.grid.coordinate, example.grid.points, example.grid.default_range) == ("temperature", 61, False)
    assert example.grid.values == pytest.approx([213.15 + 2.5 * i for i in range(61)], rel=1e-14)


def test_tolerances_follow_the_defaults(example: Plan) -> None:
    assert example.tolerances[: len(DEFAULT_RULES)] == DEFAULT_RULES
    stated = "stated by the plan"
    cold = (0.0, 0.6, "vacuum")
    propane = example.components[0].name
    assert example.tolerances[len(DEFAULT_RULES) :] == (
        ToleranceRule("saturation_pressure", Limit(2.0, "percent"), "property", rationale=stated),
        ToleranceRule("liquid_density", Limit(3.0, "percent"), "property", rationale=stated),
        ToleranceRule("liquid_density", Limit(10.0, "percent"), "property_range", "", "", 0.95, math.inf, stated),
        ToleranceRule("saturation_pressure", Limit(2000.0, "pascal"), "component_range", "", propane, *cold),
        ToleranceRule("saturation_pressure", Limit(2000.0, "pascal"), "component_range", "", "plant cut 7", *cold),
    )


def test_settings(example: Plan) -> None:
    assert example.decision == Decision("simple", 3.0, 1 / 3)
    assert (example.references_use, example.reference_files) == (("coolprop",), ())
    assert example.gate == Gate(("unsolved",))
    assert example.display == Display("K", "bar", "mol/L")


def test_what_is_not_said_is_the_default() -> None:
    plan = parse(MINIMAL)
    assert plan.title == "t"
    assert plan.grid == Grid("reduced_temperature", (), True, 41)
    assert len(plan.models) >= 20
    assert plan.tolerances == DEFAULT_RULES
    assert plan.decision == Decision("guarded", 2.0, 1 / 3)
    assert plan.references_use == REFERENCES
    assert plan.gate == Gate(("outside", "unsolved"))
    assert plan.display == Display("degC", "bar", "kg/m3")
    assert plan.left_out == ()


@pytest.mark.parametrize("written", ['"all"', '["all"]'])
def test_all_models_and_properties(written: str) -> None:
    plan = parse(f'components = ["propane"]\nmodels = {written}\nproperties = {written}')
    assert plan.models == parse(MINIMAL).models
    assert plan.properties == SATURATION
    table = "[states.single_phase]\ntemperature = [300]\npressure = [1e5]\n"
    components = 'components = ["propane"]\nproperties = "all"\n'
    assert parse(f"{components}{table}").properties == SINGLE_PHASE
    assert parse(f"{components}[states]\ntemperature = [300]\n{table}").properties == tuple(PROPERTIES)


def test_single_phase_states_are_every_temperature_with_every_pressure() -> None:
    plan = parse("""
        components = ["propane"]
        properties = ["density"]
        [states.single_phase]
        temperature = ["40 degC", "20 degC"]
        pressure = { from = "1 bar", to = "100 bar", points = 5, spacing = "logarithmic" }
        phase = "supercritical"
        supercritical_alpha = "Boston-Mathias"
    """)
    grid = plan.single_phase
    assert grid is not None
    assert grid.temperature == (293.15, 313.15)
    assert grid.pressure == pytest.approx((1e5, 10**5.5, 1e6, 10**6.5, 1e7), rel=1e-13)
    assert (grid.points, grid.phase, grid.supercritical_alpha) == (10, "supercritical", "Boston-Mathias")
    assert grid.logarithmic
    assert grid.regions


def test_regions_may_be_left_out() -> None:
    text = """
        components = ["propane"]
        properties = ["density"]
        [states.single_phase]
        temperature = ["40 degC", "20 degC"]
        pressure = ["1 bar", "2 bar"]
        regions = "{}"
    """
    plan = parse(text.format("no"))
    assert plan.single_phase is not None
    assert not plan.single_phase.regions
    assert choose_regions(plan, True) == replace(plan, single_phase=replace(plan.single_phase, regions=True))
    with pytest.raises(InputError, match=r"states\.single_phase\.regions: unknown 'maybe'; valid: yes, no"):
        parse(text.format("maybe"))
    saturated = parse('components = ["propane"]\nproperties = ["saturation_pressure"]')
    assert choose_regions(saturated, False) is saturated


def test_names_ignore_case_and_groups_may_overlap_with_names() -> None:
    plan = parse('components = ["Propane", "family:n-alkanes"]\nmodels = ["pr", "all"]\n' + MINIMAL.splitlines()[1])
    names = [c.name for c in plan.components]
    assert plan.components[0].cas == "74-98-6"
    assert len(names) == len(set(names)) > 10
    assert plan.models[0] == "PR"
    assert len(plan.models) == len(set(plan.models))


def test_a_component_by_its_cas_number() -> None:
    assert parse(MINIMAL.replace("propane", "74-98-6")).components == parse(MINIMAL).components


@pytest.mark.parametrize(
    ("states", "grid"),
    [
        ('temperature = ["20 degC", 250, "300 K"]', Grid("temperature", (250.0, 293.15, 300.0), False, 3)),
        ('temperature = "300 K"', Grid("temperature", (300.0,), False, 1)),
        ("reduced_temperature = [0.7, 0.5]", Grid("reduced_temperature", (0.5, 0.7), False, 2)),
        (
            "reduced_temperature = { from = 0.5, to = 0.75, points = 3 }",
            Grid("reduced_temperature", (0.5, 0.625, 0.75), False, 3),
        ),
        ("reduced_temperature = { points = 7 }", Grid("reduced_temperature", (), True, 7)),
        ('pressure = ["1 atm", "5 bar"]', Grid("pressure", (101325.0, 5e5), False, 2)),
        (
            'pressure = { from = "1 bar", to = 500000, points = 3, spacing = "linear" }',
            Grid("pressure", (1e5, 3e5, 5e5), False, 3),
        ),
    ],
)
def test_states(states: str, grid: Grid) -> None:
    assert parse(f"{MINIMAL}[states]\n{states}").grid == grid


def test_logarithmic_pressures_have_a_constant_ratio_and_exact_ends() -> None:
    text = 'pressure = { from = "1 bar", to = "100 bar", points = 5, spacing = "logarithmic" }'
    values = parse(f"{MINIMAL}[states]\n{text}").grid.values
    assert (values[0], values[-1]) == (1e5, 1e7)
    assert [b / a for a, b in pairwise(values)] == pytest.approx([10**0.5] * 4, rel=1e-13)


@pytest.mark.parametrize(
    ("name", "written", "limit"),
    [
        ("saturation_pressure", "7 %", Limit(7.0, "percent")),
        ("saturation_pressure", "0.5 bar", Limit(5e4, "pascal")),
        ("boiling_temperature", "0.5 K", Limit(0.5, "kelvin")),
        ("boiling_temperature", "0.5 degC", Limit(0.5, "kelvin")),
        ("boiling_temperature", "0.9 degF", Limit(0.5, "kelvin")),
        ("liquid_density", "5 kg/m3", Limit(5.0, "kg/m3")),
        ("liquid_density", "0.1 mol/L", Limit(100.0, "mol/m3")),
        ("vapor_density", "2%", Limit(2.0, "percent")),
        ("enthalpy_of_vaporization", "0.3 kJ/mol", Limit(300.0, "J/mol")),
    ],
)
def test_limits_in_their_units(name: str, written: str, limit: Limit) -> None:
    plan = parse(f'components = ["propane"]\nproperties = ["{name}"]\n[tolerance]\n{name} = "{written}"')
    rule = plan.tolerances[-1]
    assert (rule.property, rule.limit.kind) == (name, limit.kind)
    assert rule.limit.value == pytest.approx(limit.value, rel=1e-15)


def test_an_own_component_runs_even_if_it_is_only_declared() -> None:
    own = EXAMPLE[EXAMPLE.index("[[component]]") :]
    plan = parse(MINIMAL + own)
    assert [c.name for c in plan.components][1:] == ["plant cut 7"]
    only = parse('properties = ["saturation_pressure"]\n' + own)
    assert [c.name for c in only.components] == ["plant cut 7"]


@pytest.mark.parametrize(
    ("line", "family"), [('class = "other"', "other"), ("", "other"), ('family = "n-alkanes"', "n-alkane")]
)
def test_class_of_an_own_component(line: str, family: str) -> None:
    text = EXAMPLE[EXAMPLE.index("[[component]]") :].replace('class = "n-alkane"', line)
    assert parse(MINIMAL + text).components[1].family == family


def test_own_models_run_and_know_components_by_any_name() -> None:
    text = """
models = ["PR"]
[[model]]
name = "PR+house"
form = "Peng-Robinson"
alpha = "Soave"
parameters = { m = { propane = 0.6, "plant cut 7" = 0.9 } }
translation = { volume = { R290 = "-4.6 cm3/mol" } }
source = "invented"
"""
    own = EXAMPLE[EXAMPLE.index("[[component]]") :]
    plan = parse(MINIMAL + text + own)
    assert plan.models == ("PR", "PR+house")
    (record,) = plan.own_models
    assert record.name == "PR+house"
    assert dict(record.parameters["m"].values) == {"n-Propane": 0.6, "plant cut 7": 0.9}  # type: ignore[union-attr]
    assert dict(record.translation.volume.values) == {"n-Propane": pytest.approx(-4.6e-6)}  # type: ignore[union-attr]


def test_blends_are_said_to_be_left_out_where_all_are_asked_for() -> None:
    plan = parse(MINIMAL.replace('["propane"]', '"all"'))
    assert len(plan.components) == 130
    assert {"Air", "R410A"} <= {name for name, _ in plan.left_out}
    assert all(why for _, why in plan.left_out)


def test_limits_that_meet_nothing_are_left_out_with_the_reason() -> None:
    text = f"""{MINIMAL}
[tolerance]
liquid_density = "3 %"
[[tolerance.exception]]
property = "saturation_pressure"
component = "ethane"
limit = "3 %"
[[tolerance.exception]]
property = "saturation_pressure"
class = "associating"
limit = "4 %"
"""
    whats, whys = zip(*parse(text).left_out, strict=True)
    assert whats[0] == "limit 3 % for liquid_density"
    assert whats[1].startswith("limit 3 % for saturation_pressure of ")
    assert whats[2] == "limit 4 % for saturation_pressure of class associating"
    assert whys == (
        "the plan does not judge this property",
        "the component is not in the plan",
        "no component of the plan is of this class",
    )


def test_a_file_gives_its_stem_as_the_name(tmp_path: Path) -> None:
    path = tmp_path / "my service.v2.toml"
    path.write_bytes(b"\xef\xbb\xbf" + MINIMAL.replace("\n", "\r\n").encode())  # as a Windows editor saves it
    plan = load_plan(path)
    assert (plan.name, plan.path, plan.text) == ("my service.v2", str(path), MINIMAL)
    assert load_plan(str(path)) == plan
