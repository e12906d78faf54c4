"""Which reference stands alone: constructed sources whose answer is known, and fluids that must not be contested."""

from dataclasses import replace

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.diagnose.conflicts import Conflict, Source, confront, find_conflict
from eosmuster.plan.reading import parse_plan
from eosmuster.quantities import SATURATION
from eosmuster.sources import handbook, library
from eosmuster.sweeping.saturated import collect
from eosmuster.sweeping.watching import watch

T = np.linspace(200.0, 300.0, 21)
NONE = np.full(T.size, np.nan)


def continuous(name: str, factor: float, low: float = 0.0, high: float = 1e3, u: float = np.nan) -> Source:
    def value(t: np.ndarray) -> np.ndarray:
        return np.where((t >= low) & (t <= high), factor * t, np.nan)

    return Source(name, T, value(T), np.full(T.size, u), value)


def tabulated(name: str, factor: float, at: list[float]) -> Source:
    t = np.array(at)
    return Source(name, t, factor * t, np.full(t.size, np.nan))


def test_agreement_is_no_conflict() -> None:
    assert find_conflict("x", "liquid_density", [continuous("a", 1.0), continuous("b", 1.005)]) is None


def test_one_against_two_stands_alone() -> None:
    found = find_conflict(
        "x", "liquid_density", [continuous("a", 1.0), continuous("b", 1.04), continuous("c", 1.001)]
    )
    assert found is not None
    assert found.alone == ("b",)
    assert found.others == ("a", "c")
    assert found.size_pct == pytest.approx(100 * (1.04 / 1.0005 - 1), abs=0.06)
    assert (found.from_K, found.to_K) == (200.0, 300.0)


@pytest.mark.parametrize(("high", "span"), [(300.0, "200.0-300.0 K"), (200.04, "at 200.0 K")])
def test_where_they_disagree_is_a_range_or_a_temperature(high: float, span: str) -> None:
    found = Conflict("x", "liquid_density", ("a",), ("b", "c"), 4.0, 5.0, 200.0, high)
    assert found.sentence == f"a stands alone against b, c by +4.00 % (median; 5.00 % at most), {span}"


def test_the_sign_is_that_of_the_lonely_one_wherever_it_stands() -> None:
    for order in ([0, 1, 2], [2, 0, 1], [1, 2, 0]):
        sources = [continuous("low", 0.95), continuous("a", 1.0), continuous("b", 1.0)]
        found = find_conflict("x", "liquid_density", [sources[i] for i in order])
        assert found is not None
        assert found.alone == ("low",)
        assert found.size_pct == pytest.approx(-5.0)


def test_two_sources_cannot_tell_who_is_right() -> None:
    found = find_conflict("x", "liquid_density", [continuous("a", 1.0), continuous("b", 1.03)])
    assert found is not None
    assert found.alone == ()
    assert "no majority" in found.sentence


def test_a_stated_uncertainty_excuses_a_disagreement() -> None:
    assert find_conflict("x", "liquid_density", [continuous("a", 1.0), continuous("b", 1.03, u=4.0)]) is None


def test_a_table_is_compared_at_its_own_temperatures() -> None:
    table = tabulated("table", 1.05, [210.0, 233.0, 288.0])
    found = find_conflict("x", "liquid_density", [continuous("a", 1.0), continuous("b", 1.0), table])
    assert found is not None
    assert found.alone == ("table",)
    assert (found.from_K, found.to_K) == (210.0, 288.0)


def test_sources_without_common_states_say_nothing() -> None:
    apart = [continuous("a", 1.0, high=240.0), continuous("b", 1.5, low=260.0)]
    assert find_conflict("x", "liquid_density", apart) is None


def test_one_gross_value_convicts_nobody() -> None:
    t = np.array([210.0, 230.0, 250.0, 270.0, 290.0])
    values = t.copy()
    values[2] *= 100.0
    table = Source("table", t, values, np.full(5, np.nan))
    assert find_conflict("x", "liquid_density", [continuous("a", 1.0), table]) is None


def test_both_sides_of_an_even_split_are_named() -> None:
    sources = [continuous("a", 1.0), continuous("b", 1.001), continuous("c", 1.05), continuous("d", 1.051)]
    found = find_conflict("x", "liquid_density", sources)
    assert found is not None
    assert found.alone == ()


def test_cyclopropane_tables_stand_apart_from_the_rest() -> None:
    """McGarry (1983) and the VDI Heat Atlas share the same 4 % (our own count over the transcribed tables)."""
    component = find("cyclopropane")
    at = np.linspace(200.0, 380.0, 30)
    sources = [
        Source(c.source, at, c(at), np.full(at.size, np.nan), c)
        for c in handbook.correlations(component.cas, "saturation_pressure", include_excluded=True)
    ]
    values = library.saturation(component, at, ["saturation_pressure"]).values["saturation_pressure"]
    sources.append(Source("coolprop", at, values, np.full(at.size, np.nan), lambda _: values))
    found = find_conflict(component.name, "saturation_pressure", sources)
    assert found is not None
    assert set(found.alone) == {"handbook:wagner-mcgarry-1983", "handbook:wagner-vdi-2010"}
    assert "coolprop" in found.others


@pytest.mark.parametrize("name", ["propane", "argon", "R134a"])
def test_sound_fluids_are_not_contested(name: str) -> None:
    text = f"""
title = "x"
components = ["{name}"]
models = ["PR"]
properties = ["saturation_pressure", "liquid_density"]
[states]
reduced_temperature = {{ points = 21 }}
"""
    series = list(collect(parse_plan(text, "x", "x"), []))
    watched = watch(series)
    assert watched.conflicts == ()
    # the one table of R134a's liquid density was computed from the library's equation: there is nothing to compare
    alone = {(0, "liquid_density"): ""} if name == "R134a" else {}
    assert watched.contested == {(0, "saturation_pressure"): "no", (0, "liquid_density"): "no"} | alone


# ---------------------------------------------------------------- tables without common states, and witnesses


def test_tables_without_common_states_are_compared_through_a_formula() -> None:
    """Two measured sets agree 1.7 % off the formula: the formula stands alone. One vote each, not by points."""
    big = tabulated("big", 0.983, [200.0 + 0.13 * i for i in range(700)])
    small = tabulated("small", 0.982, [205.5, 230.5, 250.5, 280.5])
    found = find_conflict("x", "liquid_density", [continuous("coolprop", 1.0), big, small])
    assert found is not None
    assert found.alone == ("coolprop",)
    assert found.others == ("big", "small")
    assert found.size_pct == pytest.approx(100.0 * (1.0 / 0.983 - 1.0), abs=0.2)


def test_the_bridge_cancels() -> None:
    """A formula 30 % off, which both tables contradict, shows all the same that they agree with each other."""
    one, other = (
        tabulated("one", 1.0, [210.0, 220.0, 230.0, 250.0]),
        tabulated("other", 1.005, [205.0, 211.0, 228.0, 240.0]),
    )
    found = find_conflict("x", "liquid_density", [continuous("bridge", 1.3), one, other])
    assert found is not None
    assert found.alone == ("bridge",)


def test_tables_that_reach_no_common_temperature_are_not_compared() -> None:
    """Were they compared, the tables would outvote the formula, which is 3 % off one of them only."""
    one, other = tabulated("one", 1.0, [210.0, 230.0, 240.0]), tabulated("other", 1.03, [260.0, 270.0, 290.0])
    found = find_conflict("x", "liquid_density", [continuous("formula", 1.0), one, other])
    assert found is not None
    assert found.alone == ("other",)
    assert (found.from_K, found.to_K) == (260.0, 290.0)


def test_a_witness_is_heard_where_no_majority_tells() -> None:
    one, other = continuous("right", 1.0), continuous("wrong", 1.2)
    witness = tabulated("boiling point", 1.0, [250.0])
    found = find_conflict("x", "saturation_pressure", [one, other], witnesses=[witness])
    assert found is not None
    assert found.alone == ("wrong",)
    assert found.others == ("right", "boiling point")


def test_a_witness_accuses_nobody() -> None:
    witness = tabulated("boiling point", 1.5, [250.0])
    agreeing = [continuous("a", 1.0), continuous("b", 1.001)]
    assert find_conflict("x", "saturation_pressure", agreeing, witnesses=[witness]) is None
    found = find_conflict("x", "saturation_pressure", [agreeing[0], continuous("c", 1.2)], witnesses=[witness])
    assert found is not None
    assert found.alone == ()


@pytest.mark.parametrize("name", [name for name in SATURATION if name != "boiling_temperature"])
def test_every_saturation_property_can_be_contested(name: str) -> None:
    pair = [continuous("a", 1.0), continuous("b", 1.5)]
    assert find_conflict("x", name, pair) is not None


def test_a_table_of_one_or_two_states_convicts_nobody_and_is_not_convicted() -> None:
    """It is but a witness: with three states it stands alone."""
    sources = [continuous("a", 1.0), continuous("b", 1.001)]
    for count, alone in ((1, None), (2, None), (3, ("few",))):
        found = find_conflict("x", "liquid_density", [*sources, tabulated("few", 1.5, [210.0, 230.0, 250.0][:count])])
        assert (found and found.alone) == alone
    small = tabulated("few", 1.0, [210.0])
    apart = find_conflict("x", "liquid_density", [continuous("right", 1.0), continuous("wrong", 1.2), small])
    assert apart is not None
    assert (apart.alone, apart.others) == (("wrong",), ("right", "few"))


def test_formulas_are_compared_at_the_only_state_of_a_plan() -> None:
    one = [
        Source(s.name, T[:1], s.values[:1], NONE[:1], s.evaluate)
        for s in (continuous("a", 1.0), continuous("b", 1.1))
    ]
    assert find_conflict("x", "liquid_density", one) is not None


def test_whether_anything_was_compared_is_told() -> None:
    apart = [continuous("a", 1.0, high=240.0), continuous("b", 1.5, low=260.0)]
    assert not confront("x", "liquid_density", apart).compared
    assert confront("x", "liquid_density", [apart[0], continuous("c", 1.0)]).compared


def test_sources_of_one_equation_have_one_vote() -> None:
    """Two against two tell nothing; where two of the four are one equation, it stands alone against the others."""
    first, copy = continuous("a", 1.0), continuous("copy of a", 1.0)
    others = [continuous("c", 1.05), continuous("d", 1.051)]
    even = find_conflict("x", "liquid_density", [first, copy, *others])
    assert even is not None
    assert even.alone == ()
    shared = [replace(one, equation="one") for one in (first, copy)]
    found = find_conflict("x", "liquid_density", [*shared, *others])
    assert found is not None
    assert (found.alone, found.others) == (("a",), ("c", "d"))


def test_another_threshold_is_the_plans() -> None:
    pair = [continuous("a", 1.0), continuous("b", 1.03)]
    assert find_conflict("x", "liquid_density", pair, above=5.0) is None
    assert find_conflict("x", "liquid_density", pair, above=2.0) is not None


@pytest.mark.parametrize(
    ("factors", "alone"),
    [((1.04, 1.041), ("library",)), ((1.04,), None), ((1.04, 0.9), None), ((0.9, 1.0), None)],
    ids=["two that agree", "one", "two that do not", "one is wrong itself"],
)
def test_excluded_sources_accuse_the_library_alone(factors: tuple[float, ...], alone: tuple[str, ...] | None) -> None:
    excluded = [continuous(f"excluded {i}", factor) for i, factor in enumerate(factors)]
    found = confront("x", "liquid_density", [continuous("library", 1.0)], excluded=excluded).conflict
    assert (found and found.alone) == alone
    used = [continuous("library", 1.0), continuous("used", 1.0), continuous("used too", 1.0)]
    assert confront("x", "liquid_density", used, excluded=excluded).conflict is None


def test_very_many_tables_are_held_against_each_other_by_their_size() -> None:
    """Of 300 measured sets the 100 with the most states are compared; the bad one is found, and names are few."""
    tables = [tabulated(f"set {i}", 1.0, [205.0 + 0.3 * k + 0.001 * i for k in range(4 + i)]) for i in range(300)]
    tables[299] = tabulated("big and bad", 1.5, [200.0 + 0.3 * k for k in range(310)])
    tables[0] = tabulated("small and bad", 1.5, [210.0, 220.0, 230.0])
    found = find_conflict("x", "liquid_density", [continuous("formula", 1.0), *tables])
    assert found is not None
    assert found.alone == ("big and bad",)
    assert len(found.others) == 100  # the formula, and 99 sets
    assert found.sentence.startswith("big and bad stands alone against formula, set 200, set 201, ")
    assert "set 210 and 88 more by +50.00 %" in found.sentence
