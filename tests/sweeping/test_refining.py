"""Windows of a sweep, checked by evaluating candidates and references again from outside.

Candidates by `eosmuster.saturate`, the library by its own high-level interface, limits by the design's words.
"""

from __future__ import annotations

from collections.abc import Callable
from itertools import pairwise
from typing import Any

import numpy as np
import pandas as pd
import pytest
from numpy.typing import NDArray

import eosmuster as em
from eosmuster import components
from eosmuster.compare.verdicts import INSIDE
from eosmuster.record import WINDOW_ENDS
from eosmuster.sources import handbook, library, library_gate
from eosmuster.sources.uncertainty import uncertainty_borders, uncertainty_pct

Floats = NDArray[np.float64]
KEY = ["component", "candidate", "property", "reference_source"]
NEAR_K = 1e-6
"""How near the contract puts an end to where inside stops."""

OUTPUTS = {"saturation_pressure": "P", "liquid_density": "Dmolar", "vapor_density": "Dmolar"}


def reference(component: str, name: str, source: str, temperature: Floats) -> Floats:
    if source == "coolprop":
        from CoolProp.CoolProp import PropsSI

        quality = 1.0 if name == "vapor_density" else 0.0
        flat = PropsSI(OUTPUTS[name], "T", temperature.ravel(), "Q", quality, component)
        return np.reshape(flat, temperature.shape)
    found = handbook.correlations(components.catalogue()[component].cas, name)
    [correlation] = [c for c in found if c.source == source]
    return correlation(temperature)


def design_limit(component: str, name: str, temperature: Floats) -> Floats:
    """Design, section 4, just off its own steps."""
    fluid = components.catalogue()[component]
    reduced = temperature / fluid.critical_temperature
    psat = np.select([reduced < 0.55, reduced < 0.7], [10.0, 3.0], 1.0)
    limit = psat if name == "saturation_pressure" else np.where(reduced < 0.9, 3.0, 6.0)
    return limit * {"associating": 2.0, "quantum gas": 3.0}.get(fluid.family, 1.0)


def acceptance(component: str, name: str, source: str, temperature: Floats) -> Floats:
    limit = design_limit(component, name, temperature)
    if source != "coolprop":
        return limit
    uncertainty = uncertainty_pct(components.catalogue()[component], name, temperature, remembered=False)
    return limit - np.where(np.isnan(uncertainty), 0.0, uncertainty)


def margin(key: tuple[str, str, str, str], temperature: Floats) -> Floats:
    """How far inside the acceptance limit, in percent points; NaN is not inside."""
    component, candidate, name, source = key
    states = em.saturate(component, candidate, temperature=temperature)
    predicted = states.pressure if name == "saturation_pressure" else getattr(states, name)
    deviation = 100.0 * (predicted / reference(component, name, source, temperature) - 1.0)
    return acceptance(component, name, source, temperature) - np.abs(deviation)


# ---------------------------------------------------------------- the broad plan


@pytest.fixture(scope="module")
def ends(broad_windows: pd.DataFrame) -> pd.DataFrame:
    """Ends that a limit makes, of every third row: the margins there and 1e-6 K further out."""
    sides = []
    for side, outward in (("from", -1.0), ("to", 1.0)):
        rows = broad_windows[broad_windows[f"{side}_end"] == "limit"]
        sides.append(rows[KEY].assign(at=rows[f"{side}_K"], outward=outward))
    parts = []
    for key, rows in list(pd.concat(sides).groupby(KEY))[::3]:
        at, outward = rows["at"].to_numpy(), rows["outward"].to_numpy()
        here, beyond = margin(key, np.stack([at, at + outward * NEAR_K * (1.0 + 1e-6)]))
        parts.append([here, beyond, acceptance(key[0], key[2], key[3], at)])
    return pd.DataFrame(np.concatenate(parts, axis=1).T, columns=["here", "beyond", "acceptance"])


ROUNDING = 1e-9
"""Percent points: what rounding leaves of a deviation, 100 times 1e-11 of either value."""


def test_limits_end_windows_where_the_deviation_reaches_them(ends: pd.DataFrame) -> None:
    assert len(ends) > 2000
    assert ends["here"].min() >= -ROUNDING
    assert ends["beyond"].max() < ROUNDING


def test_at_such_an_end_the_deviation_is_the_limit_less_the_uncertainty(ends: pd.DataFrame) -> None:
    """1e-6 of the limit, or as much as it changes over the 1e-6 K within which the end is located."""
    change = (ends["here"] - ends["beyond"]).abs()
    assert (ends["here"].abs() <= np.maximum(1e-6 * ends["acceptance"], change)).all()
    assert (ends["here"].abs() <= 1e-6 * ends["acceptance"]).mean() > 0.98


def pairs(broad_summary: pd.DataFrame, count: int) -> list[tuple[str, str, str, str]]:
    """Some rows at random whose reference has a value at every temperature, edges of inside among them."""
    continuous = {"coolprop"}
    for name in handbook.CORRELATION_FILES:
        for c in (c for f in components.catalogue().values() for c in handbook.correlations(f.cas, name)):
            continuous.add(c.source)
    rows = broad_summary[broad_summary["reference_source"].isin(continuous) & (broad_summary["verdict"] == "partly")]
    chosen = np.random.default_rng(19).choice(len(rows), count, replace=False)
    return list(rows[KEY].iloc[chosen].itertuples(index=False, name=None))


def test_a_dense_scan_finds_the_same_windows(broad_summary: pd.DataFrame, broad_windows: pd.DataFrame) -> None:
    """100,000 temperatures between the first state and the last, where the sweep itself had 41."""
    rows = broad_summary.set_index(KEY)
    windows = broad_windows.groupby(KEY)
    changes = 0
    for key in pairs(broad_summary, 50):
        scan = np.linspace(rows.loc[key, "from_K"], rows.loc[key, "to_K"], 100_000)
        low, high = windows.get_group(key)[["from_K", "to_K"]].to_numpy().T
        found = ((scan[:, None] >= low) & (scan[:, None] <= high)).any(axis=1)
        inside = margin(key, scan) >= 0.0
        near = (np.abs(scan[:, None] - np.concatenate([low, high])) < 2.0 * NEAR_K).any(axis=1)
        assert (inside == found)[~near].all(), (key, scan[(inside != found) & ~near])
        changes += int((np.diff(inside.astype(int)) != 0).sum())
    assert changes > 50


def test_windows_are_disjoint_ascending_and_within_the_plan(
    broad_summary: pd.DataFrame, broad_windows: pd.DataFrame
) -> None:
    assert (broad_windows["from_K"] <= broad_windows["to_K"]).all()
    assert set(broad_windows["from_end"]) | set(broad_windows["to_end"]) <= set(WINDOW_ENDS)
    following = broad_windows.groupby(KEY, sort=False)["from_K"].shift(-1)
    assert (following.isna() | (following > broad_windows["to_K"])).all()
    for component, rows in broad_windows.groupby("component"):
        fluid = components.catalogue()[component]
        assert rows["from_K"].min() >= max(0.45 * fluid.critical_temperature, fluid.triple_temperature or 0.0)
        assert rows["to_K"].max() <= 0.99 * fluid.critical_temperature


def test_every_point_inside_lies_in_a_window_and_no_other(broad: Any) -> None:
    """Where the reference is continuous; tabulated values have no windows."""
    spans: dict[tuple[str, str, str, str], list[tuple[float, float]]] = {}
    for w in broad.record.windows:
        spans.setdefault((w.component, w.candidate, w.property, w.reference_source), []).append((w.from_K, w.to_K))
    compared = 0
    for block in broad.record.blocks:
        about = (block.property, block.reference_source)
        is_table = block.reference_source in {t.source for t in handbook.tables(block.cas, block.property)}
        for candidate, verdict in zip(block.candidates, block.verdict, strict=True):
            found = spans.get((block.component, candidate, *about), [])
            if is_table:
                assert found == []
                continue
            low, high = np.array(found).reshape(-1, 2).T
            t = block.temperature[:, None]
            covered = ((t >= low) & (t <= high)).any(axis=1)
            assert np.array_equal(covered, verdict == INSIDE), (block.component, candidate, *about)
            compared += 1
    assert compared > 5000


def test_steps_of_the_limit_end_windows_at_the_step(broad_windows: pd.DataFrame) -> None:
    for side in ("from", "to"):
        rows = broad_windows[broad_windows[f"{side}_end"] == "limit_step"]
        critical = rows["component"].map({n: c.critical_temperature for n, c in components.catalogue().items()})
        reduced = rows[f"{side}_K"] / critical
        steps = rows["property"].map({"saturation_pressure": (0.55, 0.7), "liquid_density": (0.9,)})
        assert len(rows) > 100
        assert all(min(abs(r - s) for s in some) < 1e-12 for r, some in zip(reduced, steps, strict=True))


# ---------------------------------------------------------------- why windows end

Swept = Callable[[str], Any]

WIDE_LIMIT = """
components = ["propane"]
models = ["PR", "PR-Twu91"]
properties = ["saturation_pressure"]
[tolerance]
saturation_pressure = "60 %"
"""


def windows_of(swept: Swept, text: str) -> dict[tuple[str, str], list[tuple[float, float, str, str]]]:
    found: dict[tuple[str, str], list[tuple[float, float, str, str]]] = {}
    for w in swept(text).record.windows:
        found.setdefault((w.candidate, w.reference_source), []).append((w.from_K, w.to_K, w.from_end, w.to_end))
    return found


def test_a_window_goes_on_to_the_end_of_its_reference(swept: Swept) -> None:
    """States lie at 160 and 260 K; the Antoine correlation of propane holds from 168.90 to 247.76 K."""
    text = f"{WIDE_LIMIT}[states]\ntemperature = [160.0, 200.0, 240.0, 260.0]\n"
    found = windows_of(swept, text)
    assert found["PR", "handbook:antoine-poling-2001"] == [(168.90, 247.76, "reference_limit", "reference_limit")]
    assert found["PR", "coolprop"] == [(160.0, 260.0, "plan_limit", "plan_limit")]


def test_a_window_ends_with_the_plan_where_the_reference_goes_on(swept: Swept) -> None:
    found = windows_of(swept, f"{WIDE_LIMIT}[states]\ntemperature = [200.0, 240.0]\n")
    assert found["PR", "handbook:antoine-poling-2001"] == [(200.0, 240.0, "plan_limit", "plan_limit")]


def test_pressures_beyond_a_reference_lead_to_its_end_too(swept: Swept) -> None:
    text = f"{WIDE_LIMIT}[states]\npressure = ['1 mbar', '1 bar', '60 bar']\n"
    found = windows_of(swept, text)
    assert found["PR", "handbook:antoine-poling-2001"] == [(168.90, 247.76, "reference_limit", "reference_limit")]
    [(low, high, from_end, to_end)] = found["PR-Twu91", "coolprop"]
    assert (from_end, to_end) == ("plan_limit", "reference_limit")
    assert library.at_pressure(components.find("propane"), 100.0, ["boiling_temperature"]).values[
        "boiling_temperature"
    ] == pytest.approx(low, abs=1e-9)
    assert high == pytest.approx(369.89, abs=NEAR_K)


def test_a_window_ends_at_the_critical_point_of_the_candidate_or_the_reference(swept: Swept) -> None:
    """PR has propane's Tc of 369.89 K from the library; PR-Twu91 goes 0.01 K beyond it on its own."""
    found = windows_of(swept, f"{WIDE_LIMIT}[states]\ntemperature = [300.0, 400.0]\n")
    [(_, at_pr, _, why_pr)], [(_, at_twu, _, why_twu)] = found["PR", "coolprop"], found["PR-Twu91", "coolprop"]
    assert (why_pr, why_twu) == ("critical_point", "reference_limit")
    assert at_pr == pytest.approx(369.89, abs=NEAR_K)
    assert at_twu == pytest.approx(369.89, abs=NEAR_K)


def test_a_window_starts_at_the_triple_point_of_the_library(swept: Swept) -> None:
    text = WIDE_LIMIT.replace('"propane"', '"carbon dioxide"')
    found = windows_of(swept, f"{text}[states]\ntemperature = [200.0, 230.0, 260.0]\n")
    [(low, _, from_end, _)] = found["PR", "coolprop"]
    assert (low, from_end) == (library_gate.limits(components.find("CO2")).from_K, "reference_limit")


def test_the_border_of_a_stated_uncertainty_can_end_a_window(swept: Swept) -> None:
    """Beyond 0.95 Tc the library states no uncertainty for argon's liquid density: the limit is whole again."""
    text = """
    components = ["argon"]
    models = ["PR", "SRK", "PT", "SW", "tc-PR-2018"]
    properties = ["liquid_density"]
    [states]
    temperature = { from = 90.0, to = 149.0, points = 60 }
    [references]
    use = ["coolprop"]
    [tolerance]
    """
    [border] = [t for t in uncertainty_borders(components.find("argon"), "liquid_density") if t > 100.0]
    argon = components.find("argon")
    candidate = em.saturate("argon", "tc-PR-2018", temperature=border).liquid_density
    at_border = library.saturation(argon, [border], ["liquid_density"]).values["liquid_density"][0]
    limit = abs(100.0 * (candidate / at_border - 1.0)) + 0.01  # U is 0.02 %
    record = swept(f"{text}liquid_density = '{limit:.6f} %'\n").record
    ends = {(w.from_K, w.from_end) for w in record.windows} | {(w.to_K, w.to_end) for w in record.windows}
    assert (border, "undecided") in ends


@pytest.mark.parametrize("model", ["SRK", "PR", "PT", "SW", "tc-PR-2018"])
def test_states_and_steps_that_only_rounding_keeps_apart_are_one(swept: Swept, model: str) -> None:
    """Of 11 reduced temperatures from 0.45 to 0.95 the tenth is 0.8999999999999999, a hair below the limit's step.

    Argon's uncertainty is stated up to 143.15 K, which is its 0.95 Tc but for rounding.
    """
    text = f"""
    components = ["propane", "argon", "n-decane", "n-dodecane"]
    models = ["{model}"]
    properties = ["saturation_pressure", "liquid_density"]
    [states]
    reduced_temperature = {{ from = 0.45, to = 0.95, points = 11 }}
    """
    record = swept(text).record
    assert record.windows
    assert all(w.to_K - w.from_K > 1e-6 * w.to_K for w in record.windows)
    for b in record.blocks:
        if b.reference_source in {t.source for t in handbook.tables(b.cas, b.property)}:
            continue
        mine = [
            w
            for w in record.windows
            if (w.component, w.property, w.reference_source) == (b.component, b.property, b.reference_source)
        ]
        assert all(one.to_K < following.from_K for one, following in pairwise(mine)), mine
        # a window ends on a step; the state there is judged by the limit above it and the larger uncertainty
        ends = [end for w in mine for end in ((w.from_K, w.from_end), (w.to_K, w.to_end))]
        steps = {t for t, why in ends if why in ("limit_step", "undecided")}
        for t, verdict in zip(b.temperature.tolist(), b.verdict[0], strict=True):
            if t not in steps:
                assert any(w.from_K <= t <= w.to_K for w in mine) == (verdict == INSIDE), (t, mine)


@pytest.mark.parametrize("coordinate", ["temperature = [250.0, 300.0, 350.0]", "pressure = ['2 bar', '30 bar']"])
def test_boiling_temperature_and_saturation_pressure_end_together(swept: Swept, coordinate: str) -> None:
    """Where psat of a candidate is that of the library, so is its boiling temperature: limits that meet say so."""
    text = f"""
    components = ["propane"]
    models = ["SRK"]
    properties = ["saturation_pressure", "boiling_temperature"]
    [states]
    {coordinate}
    [references]
    use = ["coolprop"]
    [tolerance]
    saturation_pressure = "1 %"
    boiling_temperature = "0.2 K"
    [decision]
    rule = "simple"
    """
    record = swept(text).record
    for w in record.windows:
        for at, why in ((w.from_K, w.from_end), (w.to_K, w.to_end)):
            if why != "limit":
                continue
            if w.property == "saturation_pressure":
                ratio = em.saturate("propane", "SRK", temperature=at).pressure / reference(
                    "n-Propane", "saturation_pressure", "coolprop", np.array([at])
                )
                assert abs(ratio[0] - 1.0) == pytest.approx(0.01, rel=1e-6)
            else:
                pressure = reference("n-Propane", "saturation_pressure", "coolprop", np.array([at]))
                boiling = em.saturate("propane", "SRK", pressure=pressure).temperature
                assert abs(boiling[0] - at) == pytest.approx(0.2, abs=2.0 * NEAR_K)
    assert {w.property for w in record.windows} == {"saturation_pressure", "boiling_temperature"}
    assert any("limit" in (w.from_end, w.to_end) for w in record.windows if w.property == "boiling_temperature")
