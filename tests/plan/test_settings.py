"""The table [gate] of a plan: what it fails on, and which rows it asks."""

from __future__ import annotations

from pathlib import Path

import pytest

from eosmuster.errors import InputError
from eosmuster.plan.reading import load_plan, parse_plan
from eosmuster.plan.schema import Gate

PLAN = """
components = ["propane", "n-butane", "ammonia", "cut 7"]
models = ["PR", "SRK", "house PR"]
properties = ["saturation_pressure", "liquid_density"]

[references]
use = ["coolprop"]
FILES

[[component]]
name = "cut 7"
critical_temperature = "540.2 K"
critical_pressure = "27.4 bar"
acentric_factor = 0.35
molar_mass = "100.2 g/mol"
family = "n-alkane"
source = "invented"

[[model]]
name = "house PR"
form = "Peng-Robinson"
alpha = "Soave"
parameters = { m = [0.38, 1.52, -0.26] }
source = "invented"

[gate]
"""


def gate(lines: str, files: str = "") -> Gate:
    return parse_plan(PLAN.replace("FILES", files) + lines, "small", "small.toml").gate


def test_a_gate_asks_everything_unless_it_says_otherwise() -> None:
    assert gate("") == Gate(("outside", "unsolved"), (), (), (), ())
    everything = 'components = "all"\ncandidates = ["all"]\nproperties = "all"\nreferences = "all"'
    assert gate(everything) == gate("")


@pytest.mark.parametrize(
    ("line", "components"),
    [
        ('components = ["propane"]', ("n-Propane",)),
        ('components = "N-PROPANE"', ("n-Propane",)),
        ('components = ["R290"]', ("n-Propane",)),  # an alias of the catalogue
        ('components = ["7664-41-7", "Cut 7"]', ("Ammonia", "cut 7")),
        ('components = ["family:n-alkanes"]', ("n-Propane", "n-Butane", "cut 7")),  # the plan's own is of the class
        ('components = ["n-Butane", "family:n-alkanes", "butane"]', ("n-Butane", "n-Propane", "cut 7")),
    ],
)
def test_components_by_any_of_their_names(line: str, components: tuple[str, ...]) -> None:
    assert gate(line).components == components


def test_candidates_properties_and_references() -> None:
    assert gate('candidates = ["pr", "House PR"]').candidates == ("PR", "house PR")
    assert gate('properties = "liquid_density"').properties == ("liquid_density",)
    assert gate('references = ["first"]').references == ("first",)
    assert gate('references = ["measured", "coolprop"]', 'files = ["*.csv"]').references == ("measured", "coolprop")


@pytest.mark.parametrize(
    ("line", "sentence"),
    [
        (
            'candidates = ["PR78"]',
            "small.toml: gate.candidates: 'PR78' is none of the plan's candidates; nearest: PR; "
            "valid: PR, SRK, house PR",
        ),
        (
            'properties = ["vapor_density"]',
            "small.toml: gate.properties: 'vapor_density' is none of the plan's properties; "
            "nearest: liquid_density; valid: saturation_pressure, liquid_density",
        ),
        (
            'components = ["propan"]',
            "small.toml: gate.components: 'propan' is none of the plan's components; nearest: n-Propane; "
            "valid: n-Propane, n-Butane, Ammonia, cut 7",
        ),
        # known to the catalogue, but not in this plan
        ('components = ["ethane"]', "'ethane' is none of the plan's components"),
        ('components = ["family:cyclic alkanes"]', "'family:cyclic alkanes' is none of the plan's components"),
        ('components = ["family:nonsense"]', "'family:nonsense' is none of the plan's components"),
        ('references = ["handbook"]', "'handbook' is none of the plan's references; valid: coolprop, first"),
        ('references = ["measured"]', "'measured' is none of the plan's references"),  # the plan has no files
        ("candidates = []", "gate.candidates: a gate that asks nothing; leave the key out, or name candidates"),
        ('candidates = ["PR", "pr"]', "gate.candidates: 'pr' is given twice"),
        ("candidates = 5", "gate.candidates: 5 is not a text"),
        ('models = ["PR"]', "gate: unknown key 'models'; valid: fail_on, components, candidates"),
        ("fail_on = []", "gate.fail_on: a gate that cannot fail"),
    ],
)
def test_what_a_plan_does_not_sweep_cannot_be_asked(line: str, sentence: str) -> None:
    with pytest.raises(InputError) as caught:
        gate(line)
    assert sentence in str(caught.value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize(
    ("file", "name"),
    [("chiller.toml", "chiller"), ("chiller.eos.toml", "chiller"), ("a.b.eos.toml", "a.b"), (".eos.toml", ".eos")],
)
def test_the_ending_that_makes_a_plan_a_test_is_no_part_of_its_name(tmp_path: Path, file: str, name: str) -> None:
    (tmp_path / file).write_text(PLAN.replace("FILES", ""), encoding="utf-8")
    assert load_plan(tmp_path / file).name == name
