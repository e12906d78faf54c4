"""What a record says of its plan."""

from eosmuster.plan.reading import parse_plan
from eosmuster.sweeping.describing import decision

PLAN = """
components = ["propane"]
models = ["PR"]
properties = ["saturation_pressure", "vapor_density", "boiling_temperature"]
[states]
temperature = [250, 300]
[tolerance]
saturation_pressure = "0.5 mbar"
vapor_density = "2%"
boiling_temperature = "0.5 K"
"""


def test_a_limit_is_told_in_si_and_as_it_was_written_where_that_is_another_unit() -> None:
    told = {t["property"]: t for t in decision(parse_plan(PLAN, "plan", "plan.toml"))["tolerances"]}
    pressure = told.pop("saturation_pressure")
    assert (pressure["limit"], pressure["as_written"]) == ("50 Pa", "0.5 mbar")
    assert {name: t["limit"] for name, t in told.items()} == {"vapor_density": "2 %", "boiling_temperature": "0.5 K"}
    assert not any("as_written" in t for t in told.values())
