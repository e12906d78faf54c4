"""Judging: rows of the summary, notes, and to whom a candidate owes what it knows."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

import eosmuster as em
from eosmuster.components import Component, find
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.quantities import PROPERTIES
from eosmuster.record import POINT_VERDICTS
from eosmuster.saturation import solver
from eosmuster.singlephase import solver as single_phase
from eosmuster.sources import library
from eosmuster.sweeping.judging import NOTES, SATURATION_NOTES, independence, summarise, unavailable_row
from eosmuster.sweeping.planes import SINGLE_PHASE_NOTES
from eosmuster.sweeping.series import Nodes, Series


def unknown(temperature: np.ndarray) -> np.ndarray:
    return np.full(np.shape(temperature), np.nan)


Swept = Callable[[str], Any]


def series_of(component: Component, name: str, *, by_library: bool) -> Series:
    none = np.empty(0)
    nodes = Nodes(none, none, np.empty(0, np.intp))
    return Series(component, 0, name, "s", "", nodes, none, unknown, None, independent_of_library=not by_library)


OWN_FLUID = Component("x", critical_temperature=400.0, critical_pressure=4e6, acentric_factor=0.1)


@pytest.mark.parametrize(
    ("model", "component", "name", "by_library", "expected"),
    [
        ("PR", find("propane"), "saturation_pressure", True, "constants"),
        ("PR", find("propane"), "saturation_pressure", False, "independent"),
        ("PR", OWN_FLUID, "saturation_pressure", True, "independent"),
        ("PR-Twu91", find("propane"), "saturation_pressure", True, "independent"),
        ("tc-PR-2018", find("propane"), "liquid_density", True, "fitted"),
        ("tc-PR-2018", find("propane"), "vapor_density", True, "constants"),
        ("tc-PR-2018", find("propane"), "liquid_density", False, "independent"),
    ],
)
def test_independence(model: str, component: Component, name: str, by_library: bool, expected: str) -> None:
    bound = bind(CATALOGUE[model], [component])
    assert independence(bound, component, series_of(component, name, by_library=by_library)) == expected


@pytest.mark.parametrize("name", PROPERTIES)
def test_an_unavailable_row_counts_nothing(name: str) -> None:
    row = unavailable_row(find("helium"), "PR-Twu91", name, "no parameters")
    assert (row.component, row.candidate, row.property, row.reference_source) == ("Helium", "PR-Twu91", name, "")
    assert (row.verdict, row.note, row.points, row.inside, row.no_reference) == (
        "unavailable",
        "no parameters",
        0,
        0,
        0,
    )
    assert np.isnan([row.from_K, row.aad_pct, row.share_inside, row.false_acceptance_pct]).all()


def test_every_status_of_the_solver_has_a_note() -> None:
    """Notes 2 to 5 stand for statuses in the solver's own order; `unavailable` never gets as far as a point."""
    said = {status: NOTES[SATURATION_NOTES[i]] for i, status in enumerate(solver.STATUSES)}
    assert said["solved"] == ""
    assert said["above_critical"] == "above the candidate's own critical point"
    assert said["no_two_phase"] == "the candidate has no two phases here"
    assert said["too_cold"] == "colder than the candidate's tabulated curve"
    assert said["invalid"] == "no value could be computed"


def test_every_status_of_the_single_phase_solver_has_a_note() -> None:
    said = {status: NOTES[SINGLE_PHASE_NOTES[i]] for i, status in enumerate(single_phase.STATUSES)}
    assert said == {
        "solved": "",
        "no_such_phase": "the candidate has no root of the stated phase there",
        "invalid": "no value could be computed",
        "unavailable": "no value could be computed",
        "no_volume": "the volume translation takes off more than the volume",
    }


STEAM = """
components = ["water"]
models = ["vdW", "PR"]
properties = ["liquid_heat_capacity", "entropy_of_vaporization"]
[states]
pressure = ["PRESSURE", "100 bar"]
[references]
use = ["coolprop"]
"""


def test_what_the_reference_owes_is_no_failure_of_the_candidate(swept: Swept) -> None:
    """At 1 bar vdW boils at 254.8 K; the reference equation, and its ideal gas, begin at the triple point."""
    heat, entropy = swept(STEAM.replace("PRESSURE", "1 bar")).record.blocks
    said = [(POINT_VERDICTS[v], heat.notes[n]) for v, n in zip(heat.verdict[:, 0], heat.note[:, 0], strict=True)]
    assert said[0] == (
        "no_reference",
        "the ideal gas's heat capacity is not known at the candidate's own temperature",
    )
    assert said[1][0] != "no_reference"
    assert np.isfinite(heat.reference).all()
    assert np.isfinite(entropy.deviation_pct).all()  # no ideal gas is in it


def test_what_the_reference_owes_is_counted_and_noted_in_the_summary(swept: Swept) -> None:
    results = swept(STEAM.replace("PRESSURE", "1 bar"))
    rows = {(r.candidate, r.property): r for r in results.record.summary}
    cold = rows["vdW", "liquid_heat_capacity"]
    assert (cold.points, cold.unsolved, cold.no_reference) == (2, 0, 1)
    assert cold.note.startswith("1 point: the ideal gas's heat capacity is not known")
    assert np.isfinite(cold.passing_limit_pct)
    assert rows["PR", "liquid_heat_capacity"].note == ""


def test_a_window_ends_where_the_reference_owes_a_value(swept: Swept) -> None:
    wide = STEAM.replace("PRESSURE", "1 bar") + '[tolerance]\nliquid_heat_capacity = "99 %"\n'
    [window] = [w for w in swept(wide).record.windows if (w.candidate, w.property) == ("vdW", "liquid_heat_capacity")]
    assert (window.from_end, window.to_end) == ("no_reference", "plan_limit")
    # it begins where vdW boils at the triple point: at the pressure that the reference has at that end
    pressure = library.saturation(find("water"), [window.from_K], ["saturation_pressure"])
    boiling = em.saturate("water", "vdW", pressure=pressure.values["saturation_pressure"]).temperature
    assert boiling == pytest.approx(273.16, abs=1e-4)


def test_points_above_a_candidate_s_own_critical_point_are_unsolved(swept: Swept) -> None:
    """PR-Twu91 has Tc = 697.1 K for methyl palmitate where the library has 755 K (references/parameters)."""
    results = swept(
        'components = ["methyl palmitate"]\nmodels = ["PR", "PR-Twu91"]\nproperties = ["liquid_density"]\n'
        '[states]\ntemperature = [500.0, 735.0, 745.0]\n[references]\nuse = ["coolprop"]\n'
        '[tolerance]\nliquid_density = "40 %"\n'
    )
    [block] = results.record.blocks
    twu = block.candidates.index("PR-Twu91")
    assert [POINT_VERDICTS[v] for v in block.verdict[twu]] == ["inside", "unsolved", "unsolved"]
    assert [block.notes[n] for n in block.note[twu]][1:] == ["above the candidate's own critical point"] * 2
    rows = {r.candidate: r for r in results.record.summary}
    assert rows["PR-Twu91"].note == "above the candidate's own critical point"
    assert (rows["PR-Twu91"].unsolved, rows["PR-Twu91"].verdict) == (2, "partly")
    assert rows["PR-Twu91"].share_inside == pytest.approx(1.0 / 3.0)  # a failure counts, it is never dropped
    assert np.isnan(rows["PR-Twu91"].passing_limit_pct)
    assert np.isfinite(rows["PR-Twu91"].aad_pct)
    assert (rows["PR"].unsolved, rows["PR"].note) == (0, "")


def test_a_reference_too_uncertain_to_decide_is_said(swept: Swept) -> None:
    """U is 0.02 % for propane's psat at 300 K; a limit of 0.05 % is less than three times that."""
    text = (
        'components = ["propane"]\nmodels = ["PR"]\nproperties = ["saturation_pressure"]\n'
        '[states]\ntemperature = [300.0]\n[references]\nuse = ["coolprop"]\n'
        '[tolerance]\nsaturation_pressure = "{:.5f} %"\n'
    )
    deviation = abs(float(swept(text.format(1.0)).points["deviation_pct"].iloc[0]))
    assert 0.02 < deviation < 0.06
    results = swept(text.format(deviation))
    assert results.points["verdict"].tolist() == ["unfit_reference"]
    [row] = results.record.summary
    assert (row.undecided, row.verdict) == (1, "undecided")
    assert row.note == "1 undecided because the reference is too uncertain"


def test_summary_rows_follow_the_candidates_of_their_block(swept: Swept) -> None:
    results = swept('components = ["propane"]\nmodels = ["SRK", "PR"]\nproperties = ["liquid_density"]\n')
    for block in results.record.blocks:
        rows = list(summarise(block, "guarded"))
        assert [row.candidate for row in rows] == ["SRK", "PR"]
        assert {(row.component, row.property, row.reference_source) for row in rows} == {
            (block.component, block.property, block.reference_source)
        }
        for row, deviation in zip(rows, block.deviation_pct, strict=True):
            assert row.points == deviation.size
            assert row.max_pct == np.abs(deviation).max()
            assert row.max_at_K == block.temperature[np.abs(deviation).argmax()]
            assert row.bias_pct == pytest.approx(deviation.mean(), rel=1e-12)
