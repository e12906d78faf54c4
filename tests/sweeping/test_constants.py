"""A plan can bring constants from a cited table: what changes, what stays, and what is said about it."""

import pytest

from eosmuster.components import find
from eosmuster.errors import InputError
from eosmuster.plan.reading import parse_plan
from eosmuster.sweeping.constants import choose
from eosmuster.sweeping.run import run

PLAN = """
components = ["propane", "water", "own"]
models = ["PR"]
properties = ["saturation_pressure"]
[states]
reduced_temperature = {{ points = 11 }}
[constants]
source = "{source}"
[[component]]
name = "own"
critical_temperature = 400.0
critical_pressure = 4e6
acentric_factor = 0.2
molar_mass = 0.06
source = "invented"
"""


def plan(source: str):
    return parse_plan(PLAN.format(source=source), "constants", "constants")


def test_the_library_is_the_default() -> None:
    chosen = choose(plan("library"))
    assert chosen.replaced == frozenset()
    assert chosen.components[0] == find("propane")


def test_crc_replaces_tc_and_pc_and_keeps_omega() -> None:
    """CRC Handbook, 95th edition, prints 369.9 K and 4.25 MPa for propane, and no acentric factor."""
    chosen = choose(plan("crc-95"))
    propane = chosen.components[0]
    assert (propane.critical_temperature, propane.critical_pressure) == (369.9, 4.25e6)
    assert propane.acentric_factor == find("propane").acentric_factor
    assert propane.sources["critical_temperature"] == "critical:crc-95"
    assert chosen.replaced == {"n-Propane"}
    assert [name for name, _ in chosen.left] == ["Water"]


def test_own_components_keep_their_own() -> None:
    assert choose(plan("crc-95")).components[2].critical_temperature == 400.0


def test_the_difference_is_shown_and_states_stay() -> None:
    usual, changed = run(plan("library")), run(plan("crc-95"))
    one, other = (next(r for r in record.summary if r.component == "n-Propane") for record in (usual, changed))
    assert other.aad_pct != one.aad_pct
    assert f"AAD {one.aad_pct:.3g} % with the library's constants" in other.note
    assert (other.from_K, other.to_K) == (one.from_K, one.to_K)
    assert changed.constants["n-Propane"]["critical_pressure"]["source"] == "critical:crc-95"


def test_only_a_whole_set_makes_a_candidate_independent() -> None:
    """Passut and Danner (1973) give Tc, pc and omega; the CRC tables leave omega to the library."""
    labels = {
        source: next(b for b in run(plan(source)).blocks if b.component == "n-Propane").independence
        for source in ("crc-95", "passut-danner-1973")
    }
    assert labels == {"crc-95": ("constants",), "passut-danner-1973": ("independent",)}


CALORIC = """
components = ["propane"]
models = ["PR"]
properties = ["liquid_heat_capacity", "vapor_heat_capacity", "isobaric_heat_capacity"]
[states]
reduced_temperature = { from = 0.7, to = 0.9, points = 3 }
[states.single_phase]
temperature = [300.0, 320.0, 350.0]
pressure = [1e5, 2e5, 3e5]
phase = "vapor"
[references]
use = ["coolprop"]
[constants]
source = "passut-danner-1973"
"""


def test_a_whole_set_of_constants_leaves_the_ideal_gas_to_the_reference() -> None:
    """No constant of the library is left, and still only the residual part of a heat capacity is judged."""
    record = run(parse_plan(CALORIC, "caloric", "caloric"))
    assert {row.property: row.unsolved for row in record.summary} == dict.fromkeys(
        ("liquid_heat_capacity", "vapor_heat_capacity", "isobaric_heat_capacity"), 0
    )
    [region] = record.regions
    assert region.property == "isobaric_heat_capacity"
    assert {block.independence for block in record.blocks} == {("independent",)}


def test_a_series_takes_the_first_part_that_knows_the_fluid() -> None:
    """IUPAC part 2 (Ambrose and Tsonopoulos) has the n-alkanes; its n-decane is excluded, so no part has that."""
    chosen = choose(parse_plan(PLAN.format(source="iupac-critical").replace("water", "n-decane"), "series", "series"))
    assert chosen.components[0].sources["critical_temperature"] == "critical:iupac-critical-2"
    assert chosen.left == (("n-Decane", "no Tc and pc in iupac-critical"),)


@pytest.mark.parametrize("source", ["iupac-critical-1", "c", "p", "i", "crc-9", "CRC-95", ""])
def test_a_part_of_a_name_is_no_name(source: str) -> None:
    """It would mean whatever begins so: "i" took propane from part 2 and left cyclohexane to the library."""
    with pytest.raises(InputError, match=rf"constants\.source.*'{source}'"):
        plan(source)


def test_an_unknown_table_is_one_sentence() -> None:
    """It is refused when the plan is read, before anything is computed."""
    with pytest.raises(InputError, match=r"^constants: constants.source = 'crc-59' is unknown; nearest: crc-95"):
        plan("crc-59")
    with pytest.raises(InputError, match=r"nearest: iupac-critical-11.*valid: library, crc-95, .*, iupac-critical$"):
        plan("iupac-critical-1")
