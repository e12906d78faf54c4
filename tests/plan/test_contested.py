"""[references] contested_above: from which disagreement on references are contested."""

from __future__ import annotations

import pytest

from eosmuster.errors import InputError
from eosmuster.plan.reading import parse_plan
from eosmuster.quantities import CONTESTED_ABOVE

PLAN = """
components = ["propane"]
models = ["PR"]
properties = ["saturation_pressure"]
[references]
"""


def above(line: str) -> dict[str, float]:
    return dict(parse_plan(PLAN + line, "small", "small.toml").contested_above)


def test_the_default_is_by_property() -> None:
    assert above("") == CONTESTED_ABOVE


def test_one_percentage_is_for_all_properties() -> None:
    assert above('contested_above = "2.5 %"') == dict.fromkeys(CONTESTED_ABOVE, 2.5)


def test_a_table_replaces_what_it_names() -> None:
    assert above('contested_above = { liquid_density = "7 %" }') == {**CONTESTED_ABOVE, "liquid_density": 7.0}


@pytest.mark.parametrize(
    ("line", "said"),
    [
        ("2", "references.contested_above: 2 has no percent sign"),
        ('"0 %"', "references.contested_above: '0 %' is not above 0 and finite"),
        ('"-1 %"', "references.contested_above: '-1 %' is not above 0 and finite"),
        ('"2 K"', "references.contested_above: '2 K'"),
        ("true", "references.contested_above: "),
        ("[]", "references.contested_above: "),
        ('{ boiling_temperature = "1 %" }', "references.contested_above: unknown key 'boiling_temperature'"),
        ('{ density = "2" }', "references.contested_above.density: "),
    ],
)
def test_bad_values_are_one_sentence(line: str, said: str) -> None:
    with pytest.raises(InputError) as caught:
        above(f"contested_above = {line}")
    message = str(caught.value)
    assert message.startswith(f"small.toml: {said}")
    assert "\n" not in message
