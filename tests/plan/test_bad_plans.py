"""Every way a plan can be wrong: one sentence that names the file, the place, the value and what is valid."""

from __future__ import annotations

import time

import pytest

from eosmuster.errors import InputError
from eosmuster.plan.reading import parse_plan

BASE = 'components = ["propane"]\nproperties = ["saturation_pressure"]\n'
OWN = """
[[component]]
name = "cut"
critical_temperature = "540.2 K"
critical_pressure = "27.4 bar"
acentric_factor = 0.35
molar_mass = "100.2 g/mol"
source = "invented"
"""
MODEL = """
[[model]]
name = "house PR"
form = "Peng-Robinson"
alpha = "Soave"
source = "invented"
[model.parameters]
m = [0.4, 1.5]
"""
EXCEPTION = '[[tolerance.exception]]\nproperty = "saturation_pressure"\nlimit = "2 %"\n'


def states(line: str) -> str:
    return f"{BASE}[states]\n{line}\n"


def own(old: str, new: str) -> str:
    assert old in OWN
    return BASE + OWN.replace(old, new)


BAD: dict[str, tuple[str, str]] = {
    # the file as a whole
    "empty": ("", "is empty"),
    "blank": (" \n\t\n", "is empty"),
    "only a comment": ("# nothing", "components: an empty sweep: no component"),
    "toml syntax": ('title = "a"\nb b\n', r"not valid TOML: .*line 2"),
    "toml cut off": ('title = "a', r"not valid TOML: .*at the end, line 1"),
    "key given twice": ('title = "a"\ntitle = "b"\n', r"not valid TOML: .*line 2"),
    "nested without end": ("a = " + "[" * 5000, "nested too deeply"),
    "endless integer": ("a = " + "1" * 5000, "not valid TOML"),
    "unknown key": (BASE + "[tolerances]\n", "unknown key 'tolerances'; nearest: tolerance.*; valid: title"),
    "title no text": ("title = 5\n" + BASE, r"title: unexpected 5; write a text"),
    "table no table": ("decision = 5\n" + BASE, r"decision: 5 is not a table; write \[decision\]"),
    "components in a table": ("[components]\na = 1\n", "components: a table is not a text"),
    # empty sweeps
    "no component": ('properties = ["saturation_pressure"]', "components: an empty sweep: no component"),
    "components []": ('components = []\nproperties = ["saturation_pressure"]', "components: an empty sweep"),
    "no property": ('components = ["propane"]', "properties: an empty sweep: no property; .*saturation_pressure"),
    "properties []": ('components = ["propane"]\nproperties = []', "properties: an empty sweep"),
    "models []": ("models = []\n" + BASE, "models: an empty sweep: no model"),
    # names
    "unknown component": (BASE.replace("propane", "propanne"), "components: .*propanne.*nearest: .*[Pp]ropane"),
    "unknown family": (BASE.replace("propane", "family:n-alkanoids"), "components: .*n-alkanoids"),
    "component a number": (BASE.replace('"propane"', "5"), "components: 5 is not a text"),
    "component twice": (BASE.replace('"propane"', '"propane", "Propane"'), "components: 'Propane' is given twice"),
    "component by two names": (
        BASE.replace('"propane"', '"propane", "74-98-6"'),
        "components: 'propane' and '74-98-6' are both .*; name each substance once",
    ),
    "unknown model": ('models = ["PR87"]\n' + BASE, "models: unknown model 'PR87'; nearest: .*PR78"),
    "model twice": ('models = ["PR", "pr"]\n' + BASE, "models: 'pr' is given twice"),
    "unknown property": (
        BASE.replace("saturation_", "vapour_"),
        "properties: unknown 'vapour_pressure'; .*valid: saturation_pressure",
    ),
    # states
    "states empty": (states(""), r"states: no coordinate is given, and .*phase rule.*give exactly one of"),
    "temperature and pressure": (
        states("temperature = [300]\npressure = [1e5]"),
        "states: temperature and pressure are both given, but a saturated pure substance has one degree of freedom",
    ),
    "one coordinate for a single phase": (
        states("[states.single_phase]\ntemperature = [300]"),
        r"states.single_phase.pressure: missing; a single phase .* two degrees of freedom \(phase rule\)",
    ),
    "saturation property without saturated states": (
        states("[states.single_phase]\ntemperature = [300]\npressure = [1e5]"),
        r"properties: saturation_pressure belongs to saturated states, .* one degree of freedom",
    ),
    "single-phase property without single-phase states": (
        BASE.replace("saturation_pressure", "density"),
        r"properties: density belongs to single-phase states, .* two degrees of freedom \(phase rule\)",
    ),
    "single-phase states without a property": (
        states("temperature = [300]\n[states.single_phase]\ntemperature = [300]\npressure = [1e5]"),
        r"\[states.single_phase\] has no property to judge; name some out of density, ",
    ),
    "unknown phase": (
        states("[states.single_phase]\ntemperature = [300]\npressure = [1e5]\nphase = 'solid'"),
        "states.single_phase.phase: unknown 'solid'",
    ),
    "too many single-phase states": (
        states(
            "[states.single_phase]\ntemperature = {from = 200, to = 300, points = 999}\n"
            "pressure = {from = 1e5, to = 2e5, points = 999}"
        ),
        "states.single_phase: 998001 states",
    ),
    "unknown coordinate": (states("temprature = [300]"), "states: unknown key 'temprature'; nearest: temperature"),
    "no state": (states("temperature = []"), "states.temperature: 0 states"),
    "temperature unit": (states('temperature = ["20 C"]'), r"states.temperature: '20 C' has an unknown unit 'C'"),
    "temperature NaN": (states("temperature = [nan]"), "states.temperature: nan is not a finite number"),
    "temperature infinite": (states("temperature = [inf]"), "states.temperature: inf is not a finite number"),
    "temperature zero": (states("temperature = [0]"), "states.temperature: 0 is not above absolute zero"),
    "temperature negative": (
        states("temperature = [-40]"),
        r"-40 is not above absolute zero \(a bare number is in K\)",
    ),
    "below absolute zero": (states('temperature = ["-300 degC"]'), "'-300 degC' is not above absolute zero"),
    "temperature a date": (states("temperature = [2031-04-01]"), "is not a temperature"),
    "temperature true": (states("temperature = true"), "True is not a temperature"),
    "temperature twice": (states('temperature = ["300 K", 300]'), "states.temperature: 300 K is given twice"),
    "pressure zero": (states("pressure = [0]"), "states.pressure: 0 is not above 0 Pa"),
    "pressure negative": (states('pressure = ["-1 bar"]'), "states.pressure: '-1 bar' is not above 0 Pa"),
    "pressure NaN": (states("pressure = [nan]"), "states.pressure: nan is not a finite number"),
    "pressure gauge": (states('pressure = ["3 barg"]'), "states.pressure: '3 barg' is a gauge pressure"),
    "reduced 0": (states("reduced_temperature = [0.0]"), "0.0 is not a reduced temperature; .*between 0 and 1"),
    "reduced 1": (states("reduced_temperature = [1.0]"), "1.0 is not a reduced temperature"),
    "reduced NaN": (states("reduced_temperature = [nan]"), "nan is not a reduced temperature"),
    "reduced text": (states('reduced_temperature = ["0.7"]'), "'0.7' is not a reduced temperature"),
    "reduced true": (states("reduced_temperature = [true]"), "True is not a reduced temperature"),
    "range from = to": (
        states('temperature = { from = 300, to = "300 K", points = 3 }'),
        "from = 300 is not below to = '300 K'",
    ),
    "range descends": (states("pressure = { from = 2e5, to = 1e5, points = 3 }"), "from = 200000.0 is not below"),
    "range without to": (states("temperature = { from = 250, points = 3 }"), "states.temperature.to: missing"),
    "range without ends": (states("temperature = { points = 3 }"), "states.temperature.from: missing"),
    "range without points": (states("temperature = { from = 250, to = 300 }"), "temperature.points: missing"),
    "one point": (states("temperature = { from = 250, to = 300, points = 1 }"), "points: 1 states; .* 2 to 100000"),
    "no points": (states("reduced_temperature = { points = 0 }"), "points: 0 states"),
    "minus points": (states("temperature = { from = 250, to = 300, points = -5 }"), "points: -5 states"),
    "points 41.0": (states("temperature = { from = 250, to = 300, points = 41.0 }"), "41.0 is not a whole number"),
    "points true": (states("temperature = { from = 250, to = 300, points = true }"), "True is not a whole number"),
    "too many states": (states("temperature = { from = 250, to = 300, points = 100001 }"), "points: 100001 states"),
    "googols of states": (states(f"reduced_temperature = {{ points = 1{'0' * 400} }}"), "integer of more than"),
    "points too dense": (
        states("temperature = { from = 300, to = 300.00000000000006, points = 9 }"),
        "states.temperature: 300 K is given twice",
    ),
    "range key": (states("temperature = { from = 250, to = 300, step = 5 }"), "temperature: unknown key 'step'"),
    "range NaN": (
        states("temperature = { from = nan, to = 300, points = 3 }"),
        "temperature.from: nan is not a finite",
    ),
    "spacing": (
        states('pressure = { from = 1e5, to = 2e5, points = 3, spacing = "log" }'),
        "spacing: 'log' is unknown for a pressure; valid: linear, logarithmic",
    ),
    "log temperature": (
        states('temperature = { from = 250, to = 300, points = 3, spacing = "logarithmic" }'),
        "spacing: 'logarithmic' is unknown for a temperature; valid: linear",
    ),
    "too many points": (
        BASE.replace('["propane"]', '"all"').replace('["saturation_pressure"]', '"all"')
        + "[states]\nreduced_temperature = { points = 100000 }",
        r"asks for \d+ components x \d+ models x 8 properties x 100000 states = \d+ points; the most is 20000000",
    ),
    # tolerances
    "limit zero": (BASE + '[tolerance]\nsaturation_pressure = "0 %"', "tolerance.saturation_pressure: .*not above 0"),
    "limit negative": (BASE + '[tolerance]\nsaturation_pressure = "-2 %"', "'-2 %' is not above 0"),
    "limit infinite": (BASE + '[tolerance]\nsaturation_pressure = "1e999 %"', "not above 0 and finite"),
    "limit NaN": (BASE + "[tolerance]\nsaturation_pressure = nan", "limit nan has no unit"),
    "limit 'nan %'": (BASE + '[tolerance]\nsaturation_pressure = "nan %"', "'nan %' is not a"),
    "limit without unit": (BASE + "[tolerance]\nsaturation_pressure = 2", 'limit 2 has no unit; .*"2 %"'),
    "limit text without unit": (BASE + '[tolerance]\nsaturation_pressure = "2"', "limit '2' has no unit"),
    "limit in another unit": (
        BASE + '[tolerance]\nsaturation_pressure = "2 K"',
        "'2 K' has an unknown unit 'K'; .*valid: %, Pa",
    ),
    "limit per cent": (BASE + '[tolerance]\nsaturation_pressure = "2 percent"', "unknown unit 'percent'"),
    "limit of nothing": (
        BASE + '[tolerance]\npressure = "2 %"',
        "tolerance: unknown key 'pressure'; nearest: .*pressure",
    ),
    "tolerance no table": ("tolerance = 5\n" + BASE, "tolerance: 5 is not a table"),
    "exception no array": (
        BASE + "[tolerance.exception]\n",
        r"not an array of tables; write \[\[tolerance.exception\]\]",
    ),
    "exception to nothing": (BASE + EXCEPTION, "tolerance.exception no. 1: an exception to nothing"),
    "exception no property": (
        BASE + EXCEPTION.replace('property = "saturation_pressure"\n', ""),
        "property: missing",
    ),
    "exception no limit": (
        BASE + EXCEPTION.replace('limit = "2 %"', 'class = "refrigerant"'),
        "exception no. 1.limit: None is not a",
    ),
    "exception key": (
        BASE + EXCEPTION + 'klass = "refrigerant"',
        "exception no. 1: unknown key 'klass'; nearest: class",
    ),
    "exception class": (
        BASE + EXCEPTION + 'class = "refrigerent"',
        "class: .*refrigerent.*nearest: refrigerant",
    ),
    "exception component": (BASE + EXCEPTION + 'component = "propanne"', "exception no. 1.component: .*propanne"),
    "exception group": (BASE + EXCEPTION + 'component = "all"', "component: 'all' is a group"),
    "exception both": (
        BASE + EXCEPTION + 'component = "propane"\nclass = "refrigerant"',
        "names a class and a component; give one of them",
    ),
    "exception range": (
        BASE + EXCEPTION + "above_reduced_temperature = 0.9\nbelow_reduced_temperature = 0.5",
        "above_reduced_temperature = 0.9 is not below below_reduced_temperature = 0.5",
    ),
    "exception above 2": (BASE + EXCEPTION + "above_reduced_temperature = 2.0", "2.0 is out of range"),
    "exception below 1.3, saturated": (
        BASE + EXCEPTION + "below_reduced_temperature = 1.3",
        "it must be .*at most 1$",
    ),
    "exception above 0, single phase": (
        BASE + EXCEPTION.replace("saturation_pressure", "density") + "above_reduced_temperature = 0.0",
        "0.0 is out of range; it must be above 0$",
    ),
    "exception range, single phase": (
        BASE
        + EXCEPTION.replace("saturation_pressure", "density")
        + "above_reduced_temperature = 1.5\nbelow_reduced_temperature = 1.2",
        "above_reduced_temperature = 1.5 is not below below_reduced_temperature = 1.2",
    ),
    "exception above NaN": (BASE + EXCEPTION + "above_reduced_temperature = nan", "nan is not a finite number"),
    "exception above text": (
        BASE + EXCEPTION + 'above_reduced_temperature = "0.9"',
        "unexpected '0.9'; write a bare",
    ),
    "second exception": (
        BASE + 2 * EXCEPTION.replace("limit", 'class = "refrigerant"\nlimit', 1) + "x = 1",
        "no. 2: unknown",
    ),
    # settings
    "decision rule": (BASE + '[decision]\nrule = "gaurded"', "decision.rule: unknown 'gaurded'; nearest: guarded"),
    "decision key": (BASE + "[decision]\nk = 2", "decision: unknown key 'k'"),
    "coverage zero": (BASE + "[decision]\ncoverage_factor = 0", "coverage_factor: 0 is out of range; .*above 0"),
    "coverage NaN": (BASE + "[decision]\ncoverage_factor = nan", "coverage_factor: nan is not a finite"),
    "coverage text": (BASE + '[decision]\ncoverage_factor = "2"', "coverage_factor: unexpected '2'"),
    "coverage a table": (BASE + "[decision]\ncoverage_factor.a = 1", "coverage_factor: unexpected a table"),
    "nested keys": (
        BASE + "[decision]\ncoverage_factor" + ".a" * 3000 + " = 1",
        "nested too deeply; .*at most 8 levels",
    ),
    "unfit ratio": (BASE + "[decision]\nunfit_ratio = 1.5", "unfit_ratio: 1.5 is out of range; .*at most 1"),
    "reference": (
        BASE + '[references]\nuse = ["coolprops"]',
        "references.use: unknown 'coolprops'; nearest: coolprop",
    ),
    "no reference": (BASE + "[references]\nuse = []", "references.use: no reference, so nothing can be judged"),
    "reference files": (
        BASE + "[references]\nfiles = [5]",
        "references.files: 5 is not a text",
    ),
    "gate": (BASE + '[gate]\nfail_on = ["inside"]', "gate.fail_on: unknown 'inside'; .*valid: outside"),
    "gate empty": (BASE + "[gate]\nfail_on = []", "gate.fail_on: a gate that cannot fail"),
    "display unit": (BASE + '[display]\npressure = "barg"', "display.pressure: unknown 'barg'; nearest: .*bar"),
    "display key": (BASE + '[display]\nvolume = "L"', "display: unknown key 'volume'; .*valid: temperature"),
    # own components
    "own no array": (BASE + "[component]\nname = 'x'", r"component: not an array of tables; write \[\[component\]\]"),
    "own without a name": (own('name = "cut"', ""), "component no. 1.name: missing"),
    "own with a blank name": (own('"cut"', '" "'), "component no. 1.name: empty"),
    "own with two lines": (own('"cut"', '"a\\nb"'), "name: .* write one line"),
    "own named all": (own('"cut"', '"all"'), "name: 'all' selects from the catalogue"),
    "own in the catalogue": (
        own('"cut"', '"Propane"'),
        "component no. 1.name: 'Propane' is already .* the catalogue",
    ),
    "own by an alias": (own('"cut"', '"74-98-6"'), "name: '74-98-6' is already the name of one in the catalogue"),
    "own twice": (BASE + OWN + OWN.replace("cut", "CUT"), "component no. 2.name: 'CUT' is already .* of this plan"),
    "own key": (own("source", "sauce"), "component no. 1: unknown key 'sauce'; nearest: source"),
    "own without source": (own('source = "invented"', ""), "component no. 1.source: missing"),
    "own with a blank source": (own('"invented"', '""'), "component no. 1.source: empty"),
    "own without Tc": (own('critical_temperature = "540.2 K"', ""), "critical_temperature: missing"),
    "own Tc negative": (own('"540.2 K"', "-540.2"), "critical_temperature: -540.2 is -540.2 in SI; .*above 1"),
    "own Tc NaN": (own('"540.2 K"', "nan"), "critical_temperature: nan is not a finite"),
    "own Tc in bar": (own('"540.2 K"', '"540.2 bar"'), "critical_temperature: .*unknown unit 'bar'"),
    "own pc without unit": (
        own('"27.4 bar"', "27.4"),
        "critical_pressure: 27.4 is 27.4 in SI; it must be above 10000",
    ),
    "own pc gauge": (own('"27.4 bar"', '"27.4 barg"'), "critical_pressure: .*gauge"),
    "own M without unit": (own('"100.2 g/mol"', "100.2"), "molar_mass: 100.2 is 100.2 in SI; .*at most 2"),
    "own omega": (own("0.35", "35"), "acentric_factor: 35 is out of range; .*above -0.6 and at most 2.5"),
    "own omega text": (own("0.35", '"0.35"'), "acentric_factor: unexpected '0.35'"),
    "own density": (own("source", "critical_density = 0\nsource"), "critical_density: 0 is 0 mol/m3; .*between 10"),
    "own triple above Tc": (
        own("source", 'triple_temperature = "600 K"\nsource'),
        "triple_temperature: .*at most 534",
    ),
    "own family": (own("source", 'family = "n-alkan"\nsource'), "family: .*n-alkan.*nearest: n-alkane"),
    "own class": (own("source", 'class = "n-alkan"\nsource'), "class: .*n-alkan.*nearest: n-alkane"),
    "own family and class": (
        own("source", 'class = "n-alkane"\nfamily = "n-alkane"\nsource'),
        "family and class mean the same",
    ),
    # own models
    "own model empty": (BASE + "[[model]]\n", "model no. 1.name: missing"),
    "own model in the catalogue": (BASE + MODEL.replace("house PR", "pr78"), "'pr78' is already .* the catalogue"),
    "own model twice": (BASE + MODEL + MODEL, "model no. 2.name: 'house PR' is already .* this plan"),
    "own model named all": (BASE + MODEL.replace("house PR", "all"), "name: 'all' selects from the catalogue"),
    "own model form": (
        BASE + MODEL.replace("Peng-R", "Pong-R"),
        "model no. 1.*'Pong-Robinson'.*nearest: Peng-Robinson",
    ),
    "own model alpha": (BASE + MODEL.replace("Soave", "Saove"), "model no. 1.*'Saove'.*nearest: Soave"),
    "own model without source": (BASE + MODEL.replace('source = "invented"', ""), "model no. 1.*source"),
    "own model parameter": (BASE + MODEL + "kappa = 1", "model no. 1.*'kappa'"),
    "own model component": (BASE + MODEL.replace("[0.4, 1.5]", "{ propanne = 0.6 }"), "parameters.m: .*propanne"),
    "own model component twice": (
        BASE + MODEL.replace("[0.4, 1.5]", "{ propane = 0.6, R290 = 0.7 }"),
        "parameters.m: 'R290' is n-Propane, which is given twice",
    ),
    "own model no array": (BASE + "[model]\n", r"model: not an array of tables; write \[\[model\]\]"),
}


@pytest.mark.parametrize("case", BAD)
def test_bad_plan(case: str) -> None:
    text, said = BAD[case]
    begin = time.perf_counter()
    with pytest.raises(InputError, match=said) as caught:
        parse_plan(text, "bad", "bad.toml")
    message = str(caught.value)
    assert message.startswith("bad.toml: ")
    assert "\n" not in message
    assert len(message) < 600
    assert caught.value.exit_status == 2
    assert time.perf_counter() - begin < 2.0


def test_the_table_of_bad_plans_starts_from_a_good_one() -> None:
    """Else a case could fail for a reason that is not its own."""
    assert parse_plan(BASE + OWN + MODEL + EXCEPTION + 'component = "cut"', "good", "good.toml").left_out == ()
