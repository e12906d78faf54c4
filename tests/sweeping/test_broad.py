"""What the broad plan promises, checked on its files the way somebody else's script would read them.

Deviations, limits, verdicts and statistics are computed here a second time, from the columns of points.csv
and the decision rule of manifest.json alone.
"""

from __future__ import annotations

import csv
import json
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from scipy.stats import norm

from eosmuster import components
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.report.terminal import terminal_summary
from eosmuster.sources import handbook

# fmt: off
POINTS = [
    "component", "cas", "candidate", "property", "temperature_K", "pressure_Pa", "phase", "reduced_temperature",
    "predicted", "reference", "unit", "reference_source", "reference_uncertainty_pct", "deviation_pct", "limit_pct",
    "probability_inside", "verdict", "contested", "independence", "note",
]
SUMMARY = [
    "component", "candidate", "property", "reference_source", "points", "from_K", "to_K", "aad_pct", "bias_pct",
    "rms_pct", "median_pct", "p95_pct", "max_pct", "max_at_K", "inside", "undecided", "outside", "unsolved",
    "share_inside", "passing_limit_pct", "false_acceptance_pct", "contested", "independence", "verdict",
]
WINDOWS = ["component", "candidate", "property", "reference_source", "from_K", "to_K", "from_end", "to_end"]
# fmt: on

BEYOND_THE_CONTRACT = {
    *("no_reference", "note", "surely_passing_limit_pct", "max_at_Pa"),
    *("mean_predicted", "mean_reference", "mean_limit_pct", "mean_uncertainty_pct"),
}
"""Columns of summary.csv that the contract does not name: states without a reference, reasons, and the means by which
two runs are told apart."""

ROW = ["component", "candidate", "property", "reference_source"]
JUDGED = ("inside", "outside", "undecided", "unfit_reference")
LEVELS = ("default", "property", "property_range", "class", "class_range", "component", "component_range")


@pytest.fixture(scope="module")
def manifest(broad_folder: Path) -> dict[str, Any]:
    content: dict[str, Any] = json.loads((broad_folder / "manifest.json").read_text(encoding="utf-8"))
    return content


@pytest.fixture(scope="module")
def by_library(broad_points: pd.DataFrame) -> pd.DataFrame:
    return broad_points[broad_points["reference_source"] == "coolprop"]


# ---------------------------------------------------------------- the files


def test_points_have_the_columns_of_the_contract(broad_points: pd.DataFrame) -> None:
    assert list(broad_points) == POINTS


def test_summary_has_the_columns_of_the_contract(broad_summary: pd.DataFrame) -> None:
    assert [name for name in broad_summary if name not in BEYOND_THE_CONTRACT] == SUMMARY
    assert set(broad_summary) - set(SUMMARY) == BEYOND_THE_CONTRACT


def test_windows_have_the_columns_of_the_contract(broad_windows: pd.DataFrame) -> None:
    assert list(broad_windows) == WINDOWS


def test_numbers_of_the_points_read_back_to_the_same_bits(broad: Any, broad_points: pd.DataFrame) -> None:
    table = broad.points
    assert list(table) == POINTS
    for name in POINTS:
        mine, theirs = table[name], broad_points[name]
        if theirs.dtype.kind == "f":
            assert np.array_equal(mine.to_numpy(float), theirs.to_numpy(), equal_nan=True), name
        else:
            assert (mine == theirs).all(), name


# ---------------------------------------------------------------- how much


def test_fluids_models_and_points_against_the_library(by_library: pd.DataFrame) -> None:
    assert by_library["component"].nunique() >= 30
    assert by_library["candidate"].nunique() >= 20
    assert by_library["verdict"].isin(JUDGED).sum() >= 40_000
    assert set(by_library["property"]) == {"saturation_pressure", "liquid_density"}
    states = by_library.groupby(["component", "candidate", "property"])["temperature_K"].nunique()
    assert set(states) == {41}


def test_fluids_of_all_classes(manifest: dict[str, Any]) -> None:
    classes = {constants["class"] for constants in manifest["constants"].values()}
    assert {"n-alkane", "aromatic", "refrigerant", "quantum gas", "associating", "siloxane", "acid gas"} <= classes


TABLES = {"PRSV": "prsv_kappa1.csv", "PR-Twu91": "twu91_bell2018.csv", "PR+Jhaveri-Youngren": "jhaveri_youngren.csv"}
"""Models that have a fluid only if a file of references/parameters has it."""

RKPR_LARGEST_ZC = 0.28975
"""Cismondi and Mollerup's correlation of delta1 has no real value above it (1.168 Zc > 0.33843)."""


def _has(model: str, component: components.Component, root: Path) -> bool:
    if model == "RKPR":
        zc = component.critical_pressure / (component.critical_density or 0.0)
        return zc / (8.31446261815324 * component.critical_temperature) < RKPR_LARGEST_ZC
    if model not in TABLES:
        return True
    lines = (root / "references" / "parameters" / TABLES[model]).read_text(encoding="utf-8").splitlines()
    rows = csv.DictReader(line for line in lines if not line.startswith("#"))
    return component.cas in {row["cas"] for row in rows}


def test_coverage_of_each_model(broad_points: pd.DataFrame, broad_summary: pd.DataFrame, root: Path) -> None:
    fluids = [components.catalogue()[name] for name in dict.fromkeys(broad_points["component"])]
    expected = {(f.name, model) for model in CATALOGUE for f in fluids if _has(model, f, root)}
    everything = {(f.name, model) for model in CATALOGUE for f in fluids}
    assert set(zip(broad_points["component"], broad_points["candidate"], strict=True)) == expected
    missing = broad_summary[broad_summary["verdict"] == "unavailable"]
    assert set(zip(missing["component"], missing["candidate"], strict=True)) == everything - expected
    assert (missing["note"] != "").all()


def test_coverage_is_printed(broad: Any, broad_summary: pd.DataFrame) -> None:
    shown = terminal_summary(broad.record, None, 100)
    missing = broad_summary[broad_summary["verdict"] == "unavailable"]
    for model, rows in missing.groupby("candidate"):
        count = rows["component"].nunique()
        assert f"{model}: {count} fluid" in shown


def test_what_is_unavailable_is_said_once_and_has_no_points(
    broad_points: pd.DataFrame, broad_summary: pd.DataFrame
) -> None:
    missing = broad_summary[broad_summary["verdict"] == "unavailable"]
    key = ["component", "candidate", "property"]
    assert not missing.duplicated(key).any()
    assert set(missing["reference_source"]) == {""}
    assert (missing[["points", "inside", "outside", "undecided", "unsolved"]] == 0).all(axis=None)
    both = missing.merge(broad_points[key].drop_duplicates(), on=key)
    assert both.empty


def test_no_point_below_a_models_own_critical_point_is_unsolved(broad_points: pd.DataFrame, root: Path) -> None:
    text = (root / "references" / "parameters" / "twu91_bell2018.csv").read_text(encoding="utf-8").splitlines()
    twu = {row["cas"]: float(row["critical_temperature_K"]) for row in csv.DictReader(text)}
    unsolved = broad_points[broad_points["verdict"] == "unsolved"]
    assert unsolved["predicted"].isna().all()
    for row in unsolved.itertuples():
        own = components.catalogue()[row.component].critical_temperature
        critical = twu[row.cas] if row.candidate == "PR-Twu91" else own
        assert row.temperature_K >= critical, row
        assert row.note == "above the candidate's own critical point"


def test_every_point_has_a_reference_here(broad_points: pd.DataFrame) -> None:
    assert (broad_points["verdict"] != "no_reference").all()
    assert (broad_points["reference"] > 0).all()


# ---------------------------------------------------------------- where references may be asked


def test_the_library_never_answers_below_the_triple_point(by_library: pd.DataFrame) -> None:
    lowest = by_library.groupby("component")["temperature_K"].min()
    for name, temperature in lowest.items():
        assert temperature >= components.catalogue()[name].triple_temperature, name


def test_no_blend_is_swept(broad_points: pd.DataFrame) -> None:
    assert not set(broad_points["component"]) & set(components.left_out())


def _ranges() -> dict[tuple[str, str, str], list[tuple[float, float]]]:
    found: dict[tuple[str, str, str], list[tuple[float, float]]] = {}
    for name in handbook.CORRELATION_FILES:
        for component in components.catalogue().values():
            for c in handbook.correlations(component.cas, name):
                found.setdefault((component.name, name, c.source), []).append((c.from_K, c.to_K))
    return found


def test_correlations_are_never_extrapolated(broad_points: pd.DataFrame, broad_windows: pd.DataFrame) -> None:
    ranges, checked = _ranges(), 0
    key = ["component", "property", "reference_source"]
    points = broad_points.groupby(key)["temperature_K"].agg(["min", "max"])
    windows = broad_windows.groupby(key).agg({"from_K": "min", "to_K": "max"})
    for spans in (points, windows):
        for which, (low, high) in zip(spans.index, spans.to_numpy(), strict=True):
            if which in ranges:
                checked += 1
                assert any(a <= low and high <= b for a, b in ranges[which]), which
    assert checked > 300


def test_an_excluded_correlation_judges_nothing(broad_points: pd.DataFrame) -> None:
    pairs = set(
        zip(broad_points["component"], broad_points["property"], broad_points["reference_source"], strict=True)
    )
    for name in handbook.CORRELATION_FILES:
        for component in components.catalogue().values():
            every = handbook.correlations(component.cas, name, include_excluded=True)
            good = {c.source for c in every if not c.excluded}
            bad = {(component.name, name, c.source) for c in every if c.excluded and c.source not in good}
            assert not bad & pairs


def test_the_contradiction_of_propylene_glycol_is_said(manifest: dict[str, Any], broad: Any) -> None:
    constants = manifest["constants"]["PropyleneGlycol"]
    assert constants["acentric_factor"]["value"] == pytest.approx(0.720, abs=5e-4)  # the equation's own psat(0.7 Tc)
    assert "psat(0.7 Tc)" in constants["acentric_factor"]["source"]
    assert any("0.32684" in note and "0.71956" in note for note in constants["notes"])


# ---------------------------------------------------------------- everything once more from the columns


def test_deviations_can_be_recomputed(broad_points: pd.DataFrame) -> None:
    again = 100.0 * (broad_points["predicted"] / broad_points["reference"] - 1.0)
    assert np.allclose(again, broad_points["deviation_pct"], rtol=0.0, atol=1e-12, equal_nan=True)


def test_reduced_temperatures_can_be_recomputed(broad_points: pd.DataFrame, manifest: dict[str, Any]) -> None:
    critical = {name: c["critical_temperature"]["value"] for name, c in manifest["constants"].items()}
    again = broad_points["temperature_K"] / broad_points["component"].map(critical)
    assert (again == broad_points["reduced_temperature"]).all()


def limits_again(points: pd.DataFrame, manifest: Mapping[str, Any]) -> np.ndarray:
    """Limits from the manifest's tolerances: the most specific rule governs, of equals the later one."""
    family = points["component"].map({name: c["class"] for name, c in manifest["constants"].items()})
    result = np.full(len(points), np.nan)
    for rule in sorted(manifest["decision"]["tolerances"], key=lambda rule: LEVELS.index(rule["level"])):
        reduced = points["reduced_temperature"] * (1.0 + 1e-12)  # 0.7 Tc / Tc need not be 0.7
        above, below = rule["above_reduced_temperature"], rule["below_reduced_temperature"]
        here = (points["property"] == rule["property"]) & (reduced >= above)
        here &= reduced < (np.inf if below is None else below)
        here &= (family == rule["class"]) | (rule["class"] == "")
        here &= (points["component"] == rule["component"]) | (rule["component"] == "")
        number, unit = rule["limit"].split()
        value = np.full(len(points), float(number))
        if unit != "%":
            value = 100.0 * value / points["reference"].to_numpy()
        result[here] = value[here]
    return result


def test_limits_can_be_recomputed(broad_points: pd.DataFrame, manifest: dict[str, Any]) -> None:
    assert (limits_again(broad_points, manifest) == broad_points["limit_pct"]).all()


def test_limits_are_those_of_the_design(broad_points: pd.DataFrame, manifest: dict[str, Any]) -> None:
    """Design, section 4: psat 10, 3, 1 % by Tr 0.55 and 0.7; liquid 3, 6 % by 0.9; associating x 2, quantum x 3."""
    reduced = broad_points["reduced_temperature"] * (1.0 + 1e-12)
    psat = np.select([reduced < 0.55, reduced < 0.7], [10.0, 3.0], 1.0)
    liquid = np.where(reduced < 0.9, 3.0, 6.0)
    families = {name: c["class"] for name, c in manifest["constants"].items()}
    factor = broad_points["component"].map(families).map({"associating": 2.0, "quantum gas": 3.0}).fillna(1.0)
    expected = np.where(broad_points["property"] == "saturation_pressure", psat, liquid) * factor
    assert (expected == broad_points["limit_pct"]).all()


def verdicts_again(points: pd.DataFrame, rule: Mapping[str, Any]) -> np.ndarray:
    """JCGM 106 guarded acceptance with w = U, as the design words it."""
    size, limit = points["deviation_pct"].abs(), points["limit_pct"]
    known = points["reference_uncertainty_pct"].notna() & (rule["rule"] == "guarded")
    guard = points["reference_uncertainty_pct"].where(known, 0.0)
    verdict = np.select([size <= limit - guard, size > limit + guard], ["inside", "outside"], "undecided")
    verdict = verdict.astype(object)
    verdict[(verdict == "undecided") & (guard > rule["unfit_ratio"] * limit)] = "unfit_reference"
    verdict[points["predicted"].isna()] = "unsolved"
    verdict[points["reference"].isna()] = "no_reference"
    return verdict


def test_verdicts_can_be_recomputed(broad_points: pd.DataFrame, manifest: dict[str, Any]) -> None:
    again = verdicts_again(broad_points, manifest["decision"])
    assert (again == broad_points["verdict"]).all()
    assert {"inside", "outside", "undecided", "unsolved"} <= set(again)


def test_probabilities_can_be_recomputed(broad_points: pd.DataFrame, manifest: dict[str, Any]) -> None:
    u = broad_points["reference_uncertainty_pct"] / manifest["decision"]["coverage_factor"]
    known = u.notna() & broad_points["deviation_pct"].notna()
    assert known.sum() > 10_000
    assert (broad_points["probability_inside"].notna() == known).all()
    some = broad_points[known]
    y, limit, u = some["deviation_pct"], some["limit_pct"], u[known]
    again = norm.cdf((limit - y) / u) - norm.cdf((-limit - y) / u)
    # the tails are written as exactly 0 and 1 beyond 8.3 standard uncertainties
    assert np.abs(again - some["probability_inside"]).max() < 1e-14


def test_notes_say_where_the_simple_rule_had_to_do(broad_points: pd.DataFrame) -> None:
    unknown = broad_points["reference_uncertainty_pct"].isna() & (broad_points["verdict"] != "unsolved")
    simple = broad_points["note"].str.startswith("simple rule")
    assert (simple == unknown).all()
    assert broad_points.loc[simple, "verdict"].isin(("inside", "outside")).all()


@pytest.fixture(scope="module")
def together(broad_points: pd.DataFrame, broad_summary: pd.DataFrame) -> tuple[pd.DataFrame, Any]:
    """Summary rows that have points, and the points in the same order of rows."""
    judged = broad_summary[broad_summary["verdict"] != "unavailable"].set_index(ROW)
    groups = broad_points.groupby(ROW, sort=False)
    assert list(groups.size().index) == list(judged.index)
    return judged, groups


def test_statistics_can_be_recomputed(together: tuple[pd.DataFrame, Any], broad_points: pd.DataFrame) -> None:
    summary, groups = together
    points = broad_points.assign(size=broad_points["deviation_pct"].abs(), square=broad_points["deviation_pct"] ** 2)
    sizes = points.groupby(ROW, sort=False)["size"]
    again = pd.DataFrame(
        {
            "points": groups.size(),
            "from_K": groups["temperature_K"].min(),
            "to_K": groups["temperature_K"].max(),
            "aad_pct": sizes.mean(),
            "bias_pct": groups["deviation_pct"].mean(),
            "rms_pct": np.sqrt(points.groupby(ROW, sort=False)["square"].mean()),
            "median_pct": sizes.median(),
            "p95_pct": sizes.quantile(0.95),
            "max_pct": sizes.max(),
        }
    ).loc[summary.index]
    for name, values in again.items():
        # the order of summation differs; a bias near zero keeps only its absolute digits
        assert np.allclose(values, summary[name], rtol=1e-12, atol=1e-12, equal_nan=True), name
    worst = points.loc[sizes.idxmax().loc[summary.index], "temperature_K"].to_numpy()
    assert np.array_equal(worst, summary["max_at_K"])


def test_counts_and_verdicts_of_rows_can_be_recomputed(
    together: tuple[pd.DataFrame, Any], broad_points: pd.DataFrame
) -> None:
    summary, _ = together
    counts = broad_points.groupby([*ROW, "verdict"], sort=False).size().unstack(fill_value=0).loc[summary.index]
    counts = counts.reindex(columns=[*JUDGED, "unsolved", "no_reference"], fill_value=0)
    undecided = counts["undecided"] + counts["unfit_reference"]
    for name in ("inside", "outside", "unsolved", "no_reference"):
        assert (counts[name] == summary[name]).all()
    assert (undecided == summary["undecided"]).all()
    judged = counts.drop(columns="no_reference").sum(axis=1)
    assert np.allclose(counts["inside"] / judged, summary["share_inside"], rtol=1e-15)
    verdict = np.select(
        [counts["inside"] == judged, counts["outside"] + counts["unsolved"] == 0, counts["inside"] == 0],
        ["inside", "undecided", "outside"],
        "partly",
    )
    assert (verdict == summary["verdict"]).all()


def test_passing_limits_and_risks_can_be_recomputed(
    together: tuple[pd.DataFrame, Any], broad_points: pd.DataFrame
) -> None:
    summary, _ = together
    guard = broad_points["reference_uncertainty_pct"].fillna(0.0)
    needed = (broad_points["deviation_pct"].abs() + guard).where(broad_points["verdict"] != "unsolved", np.inf)
    passing = (
        needed.groupby([broad_points[n] for n in ROW], sort=False).max().loc[summary.index].replace(np.inf, np.nan)
    )
    assert np.allclose(passing, summary["passing_limit_pct"], rtol=1e-15, equal_nan=True)
    risk = (100.0 * (1.0 - broad_points["probability_inside"])).where(broad_points["verdict"] == "inside")
    mean = risk.groupby([broad_points[n] for n in ROW], sort=False).mean().loc[summary.index]
    assert np.allclose(mean, summary["false_acceptance_pct"], rtol=1e-9, atol=1e-12, equal_nan=True)


# ---------------------------------------------------------------- contested references


def _equation(source: str, component: str) -> str:
    """Give what a source is computed from, as far as that is known: the library, or the source itself."""
    shared = handbook.shares_library_equation(components.catalogue()[component].cas, source)
    return "coolprop" if shared else source


def test_contested_is_a_matter_of_the_references_of_a_fluid(
    broad_points: pd.DataFrame, broad_summary: pd.DataFrame
) -> None:
    """One word for all sources of a component and property, and none where a single equation speaks."""
    about = broad_points.groupby(["component", "property"])[["contested", "reference_source"]].agg(set)
    assert (about["contested"].map(len) == 1).all()
    word = about["contested"].map(min)
    assert set(word) == {"yes", "no", ""}
    sources = about["reference_source"].items()
    alone = np.array([len({_equation(source, name) for source in each}) == 1 for (name, _), each in sources])
    assert (word[~alone] != "").all()
    # what is excluded by its deviation from the library speaks against it where it stands alone
    assert word[alone & (word != "")].to_dict() == {("PropyleneGlycol", "saturation_pressure"): "yes"}
    rows = broad_summary[broad_summary["verdict"] != "unavailable"]
    assert [word[key] for key in zip(rows["component"], rows["property"], strict=True)] == rows["contested"].to_list()


# ---------------------------------------------------------------- independence


def test_independence(broad_points: pd.DataFrame) -> None:
    kinds = broad_points.drop_duplicates([*ROW, "independence"])[[*ROW, "independence"]]
    assert not kinds.duplicated(ROW).any()
    library = kinds["reference_source"] == "coolprop"
    named = zip(kinds["reference_source"], kinds["component"], strict=True)
    owed = np.array([_equation(*one) == "coolprop" for one in named]) & ~library
    assert set(kinds.loc[~library & ~owed, "independence"]) == {"independent"}
    # what a table computed from the library's equation says of a candidate is what the library says
    columns = ["component", "candidate", "property", "independence"]
    by_table, by_library = (set(kinds.loc[which, columns].itertuples(index=False)) for which in (owed, library))
    assert by_table
    assert by_table <= by_library
    of = kinds[library].groupby(["candidate", "property"])["independence"].agg(set)
    # its own constants, and parameters from evaluated measurements: Bell, Satyro and Lemmon (2018)
    assert of["PR-Twu91", "saturation_pressure"] == of["PR-Twu91", "liquid_density"] == {"independent"}
    # translated to the library's liquid density at Tr = 0.8; the vapour pressure knows nothing of a translation
    assert of["tc-PR-2018", "liquid_density"] == of["tc-RK-2018", "liquid_density"] == {"fitted"}
    for model in set(CATALOGUE) - {"PR-Twu91"}:
        assert of[model, "saturation_pressure"] == {"constants"}, model
    for model in set(CATALOGUE) - {"PR-Twu91", "tc-PR-2018", "tc-RK-2018"}:
        assert of[model, "liquid_density"] == {"constants"}, model
