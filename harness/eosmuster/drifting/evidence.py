"""What differs between two manifests, and which rows each difference can have moved."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from eosmuster.drifting.changes import Change, Key
from eosmuster.drifting.sides import Side, spelled, versions
from eosmuster.report.cells import number_cell

_LIBRARY = "CoolProp"
_OF_FOLDER = {
    "parameters": "prediction:model",
    "critical_constants": "prediction:constants",
    "components.csv": "prediction:constants",
    "handbook": "reference:data",
    "uncertainty": "uncertainty",
}
"""First part of a reference file's path -> what a change of it can move; the others hold no numbers of a run."""

_SELECTING = ("components", "models", "properties", "states", "references", "constants")
"""Keys of a plan that decide what is swept and against what."""

_DECIDING = ("rule", "unfit_ratio")
_TOLD_ELSEWHERE = ("tolerances", "contested_above_pct", "coverage_factor_unstated")
"""Keys of a decision that are compared one by one, in the plan's own text, or as a file of the reference data."""
_BAND = ("property", "component", "class", "above_reduced_temperature", "below_reduced_temperature", "level")
_TOLD = ("source", "status", "note")
"""What is said about a model, and moves no number."""

_LONGEST = 80


@dataclass(frozen=True)
class Evidence:
    """The differences of two manifests."""

    changes: tuple[Change, ...]

    def of(self, cause: str, subject: str = "") -> list[Change]:
        """Give the changes that can be of a cause, and concern a component, candidate or property if one is named."""
        return [c for c in self.changes if c.cause == cause and (not subject or c.subject in ("", subject))]

    def about(self, cause: str, subject: str) -> list[Change]:
        """Give the changes of a cause that name a subject."""
        return [c for c in self.changes if c.cause == cause and c.subject == subject]

    def of_plan(self, *keys: str) -> list[Change]:
        """Give the changes of some of the plan's keys."""
        return [c for c in self.changes if c.cause == "plan" and c.subject in keys]

    def of_tolerance(self, key: Key) -> list[Change]:
        """Give the changed limits that can concern a row."""
        return self.about("tolerance", key.property)


def evidence(old: Side, new: Side) -> Evidence:
    """List what differs between two manifests: first what can move numbers, then what cannot."""
    found = [
        *_versions(old.manifest, new.manifest),
        *_constants(old.manifest, new.manifest),
        *_models(old, new),
        *_files("measured_files", old.manifest, new.manifest),
        *_files("references", old.manifest, new.manifest),
        *_decision(old.manifest["decision"], new.manifest["decision"]),
        *_plan(old.plan, new.plan),
        *_remaining(old.manifest, new.manifest),
    ]
    return Evidence(tuple(sorted(found, key=lambda change: not change.cause)))


def _versions(old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[Change]:
    causes = {_LIBRARY: "reference:library", "eosmuster": "prediction:code"}
    for name, before, now in _unequal(versions(old), versions(new)):
        yield Change(causes.get(name, ""), "", name, before, now)
    revisions = [str(content["volatile"].get("git_revision") or "") for content in (old, new)]
    if all(revisions) and revisions[0] != revisions[1]:
        yield Change("prediction:code", "", "revision of the source tree", *revisions)


def _constants(old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[Change]:
    before, now = old["constants"], new["constants"]
    for component in before:
        if component in now:
            values = [_values(content[component]) for content in (before, now)]
            for name, was, is_now in _unequal(*values):
                yield Change(
                    "prediction:constants", spelled(component), f"constants of {component}, {name}", was, is_now
                )


def _values(constants: object) -> dict[str, str]:
    """Give the values of one component's constants as text; sources and notes move no number."""
    if not isinstance(constants, dict):
        return {}
    found = {name: entry.get("value") for name, entry in constants.items() if isinstance(entry, dict)}
    return {name: _text(value) for name, value in {**found, "class": constants.get("class")}.items()}


def _models(old: Side, new: Side) -> Iterator[Change]:
    """Compare the entries of the models, and what the plans themselves say of their own models."""
    before, now = old.manifest["models"], new.manifest["models"]
    for model in before:
        if model in now:
            for name, was, is_now in _unequal(_flat({"": before[model]}), _flat({"": now[model]})):
                # a key that only one has came with another version of the code, which says of it what was so before
                moves = was and is_now and name.rpartition(".")[2] not in _TOLD
                yield _of_model(model, name, was, is_now, moves=bool(moves))
    own = [_own_models(side.plan) for side in (old, new)]
    for model in (model for model in own[0] if model in own[1]):
        for name, was, is_now in _unequal(_flat(own[0][model]), _flat(own[1][model])):
            yield _of_model(model, name, was, is_now, moves=name not in _TOLD)


def _of_model(model: str, name: str, old: str, new: str, *, moves: bool) -> Change:
    cause = "prediction:model" if moves else ""
    return Change(cause, spelled(model), f"model {model}, {name.strip('.')}", old, new)


def _own_models(plan: Mapping[str, Any]) -> dict[str, dict[str, Any]]:
    tables = plan.get("model")
    listed = tables if isinstance(tables, list) else []
    return {str(table.get("name")): table for table in listed if isinstance(table, dict)}


def _files(name: str, old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[Change]:
    measured = name == "measured_files"
    label = "measured file" if measured else "reference file"
    for path, before, now in _unequal(*({k: str(v) for k, v in content[name].items()} for content in (old, new))):
        cause = "reference:measured" if measured else _OF_FOLDER.get(path.partition("/")[0], "")
        yield Change(cause, "", f"{label} {path}", _short_hash(before), _short_hash(now))


def _short_hash(digest: str) -> str:
    return f"SHA-256 {digest[:12]}" if digest else ""


def _decision(old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[Change]:
    plain = [{k: _text(v) for k, v in content.items() if k not in _TOLD_ELSEWHERE} for content in (old, new)]
    for name, before, now in _unequal(*plain):
        subject = "decision" if name in _DECIDING else "uncertainty"
        yield Change("plan", subject, f"decision rule, {name}", before, now)
    for band, before, now in _unequal(_limits(old), _limits(new)):
        where = ", ".join(part for part in band.split("\n")[1:] if part)
        name = band.partition("\n")[0]
        yield Change("tolerance", name, f"limit of {name}{f' ({where})' if where else ''}", before, now)


def _limits(decision: Mapping[str, Any]) -> dict[str, str]:
    """Give the limits in force, by property and where they apply; of equals the last one governs."""
    listed = decision.get("tolerances")
    found = {}
    for entry in listed if isinstance(listed, list) else []:
        if isinstance(entry, dict):
            property_, component, family, above, below, _level = (entry.get(name) for name in _BAND)
            where = [str(component or ""), str(family or ""), f"T/Tc from {above:g}" if _number(above) else ""]
            where += [f"T/Tc below {below:g}" if _number(below) else ""]
            found["\n".join([str(property_), *where])] = _text(entry.get("limit"))
    return found


def _number(value: object) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool) and value != 0


def _plan(old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[Change]:
    for key in _SELECTING:
        before, now = old.get(key), new.get(key)
        if before == now:
            continue
        if isinstance(before, list) and isinstance(now, list):
            yield Change("plan", key, f"plan, {key}", *map(_cut, _list_difference(before, now)))
        else:
            flat = [_flat(value) if isinstance(value, dict) else {"": _text(value)} for value in (before, now)]
            for name, was, is_now in _unequal(*flat):
                yield Change("plan", key, f"plan, {key}{'.' if name else ''}{name}", was, is_now)
    for key, what in (("component", "components"), ("model", "models")):
        names = [{str(t.get("name")) for t in plan.get(key, []) if isinstance(t, dict)} for plan in (old, new)]
        if names[0] != names[1]:
            gone, came = map(_cut, _list_difference(sorted(names[0]), sorted(names[1])))
            yield Change("plan", what, f"plan, own {what}", gone, came)


def _list_difference(old: Sequence[object], new: Sequence[object]) -> tuple[str, str]:
    """Say what a list lost and what it gained; the whole lists where only the order changed."""
    gone, came = [x for x in old if x not in new], [x for x in new if x not in old]
    if not (gone or came):
        return _text(old), _text(new)
    return _text(gone) if gone else "", _text(came) if came else ""


def _remaining(old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[Change]:
    """Count what else differs: it moves no number by itself, or stands in the rows already."""
    titles = [str(content["plan"].get(name, "")) for name in ("name", "title") for content in (old, new)]
    for what, before, now in (("plan's name", *titles[:2]), ("plan's title", *titles[2:])):
        if before != now:
            yield Change("", "", what, *_cut_pair(before, now))
    parts = [_part(content.get("part")) for content in (old, new)]
    if parts[0] != parts[1]:
        yield Change("plan", "part", "part of the plan", *parts)
    asked = [_regions_asked(content.get("regions")) for content in (old, new)]
    if asked[0] != asked[1]:
        yield Change("plan", "regions", "regions", *asked)
    for name in ("contested", "left_out", "notes", "citations"):
        lists = [[_text(x) for x in _listed(content.get(name))] for content in (old, new)]
        for gone in (x for x in lists[0] if x not in lists[1]):
            yield Change("", "", name.replace("_", " "), _cut(gone), "")
        for came in (x for x in lists[1] if x not in lists[0]):
            yield Change("", "", name.replace("_", " "), "", _cut(came))


def _part(entry: object) -> str:
    return f"{entry.get('number')}/{entry.get('of')}" if isinstance(entry, dict) else "the whole"


def _regions_asked(entry: object) -> str:
    return "not asked for" if isinstance(entry, dict) and entry.get("asked") is False else "asked for"


def _listed(value: object) -> list[object]:
    if isinstance(value, dict):
        return [f"{key}: {item}" for key, item in value.items()]
    listed = value if isinstance(value, list) else []
    return [": ".join(str(v) for v in x.values() if v) if isinstance(x, dict) else x for x in listed]


def _unequal(old: Mapping[str, str], new: Mapping[str, str]) -> Iterator[tuple[str, str, str]]:
    """Yield key, old and new value wherever they differ, "" for none, each short enough to be shown."""
    for key in {**old, **new}:
        before, now = old.get(key, ""), new.get(key, "")
        if before != now:
            yield key, *_cut_pair(before, now)


def _flat(value: Mapping[str, Any], above: str = "") -> dict[str, str]:
    found: dict[str, str] = {}
    for key, item in value.items():
        name = f"{above}.{key}" if above else str(key)
        found |= _flat(item, name) if isinstance(item, dict) else {name: _text(item)}
    return found


def _text(value: object) -> str:
    """Write a value of a plan or a manifest for people, every digit of it: it may be the last that differs."""
    if isinstance(value, float):
        return number_cell(value)
    if isinstance(value, list):
        return ", ".join(_text(item) for item in value)
    return "" if value is None else str(value)


def _cut_pair(old: str, new: str) -> tuple[str, str]:
    """Cut two texts that differ to what can be shown, the first difference included.

    Examples
    --------
    >>> [len(text) for text in _cut_pair("x" * 200 + "a", "x" * 200 + "b")]
    [24, 24]
    """
    if max(len(old), len(new)) > _LONGEST:
        at = next((i for i, (a, b) in enumerate(zip(old, new, strict=False)) if a != b), min(len(old), len(new)))
        start = max(at - 20, 0) if at > _LONGEST // 2 else 0
        old, new = (f"...{text[start:]}" if start else text for text in (old, new))
    return _cut(old), _cut(new)


def _cut(text: str) -> str:
    return text if len(text) <= _LONGEST else f"{text[: _LONGEST - 3]}..."
