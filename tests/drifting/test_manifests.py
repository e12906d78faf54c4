"""Two manifests held against each other: every difference is named, on one short line, whatever they hold."""

from __future__ import annotations

import json
from typing import Any

import pytest

from eosmuster.drifting.manifests import ELSEWHERE, differences


def told(old: dict[str, Any], new: dict[str, Any]) -> list[str]:
    return [str(one) for one in differences(old, new)]


def test_the_same_is_the_same_in_any_order_of_keys() -> None:
    content = {"plan": {"name": "a", "text": "b"}, "left_out": [{"what": "x", "why": "y"}], "summary": {"rows": 3}}
    assert told(content, dict(reversed(content.items()))) == []
    assert told(content | dict.fromkeys(ELSEWHERE, 1), content) == []


@pytest.mark.parametrize(
    ("old", "new", "sentences"),
    [
        ({"rows": 1}, {"rows": 1.0}, ["rows: 1 -> 1.0"]),
        ({"rows": True}, {"rows": 1}, ["rows: true -> 1"]),
        ({"rows": None}, {}, ["rows has gone"]),
        ({"models": {"PR": {}}}, {"models": []}, ['models: {"PR": {}} -> []']),
        ({"notes": ["a", "b"]}, {"notes": ["b", "a"]}, ['notes: "a", "b" -> "b", "a"']),
        ({"notes": ["a", "a"]}, {"notes": ["a"]}, ['notes: "a", "a" -> "a"']),
        ({"notes": ["a", "b"]}, {"notes": ["b", "c"]}, ['notes, "a" has gone', 'notes, "c" is new']),
    ],
)
def test_differences(old: dict[str, Any], new: dict[str, Any], sentences: list[str]) -> None:
    assert told(old, new) == sentences


def test_what_follows_from_the_plan_whatever_version_runs_it() -> None:
    old = {"points": {"rows": 1}, "models": {"PR": {"note": ""}, "SRK": {}}, "constants": {}, "citations": {"a": "b"}}
    new = {"points": {"rows": 2}, "models": {"PR": {"note": "x"}}, "constants": {"propane": {}}, "citations": {}}
    assert [one.path for one in differences(old, new) if one.of_the_plan] == [
        ("points", "rows"),
        ("models", "SRK"),
        ("constants", "propane"),
    ]


def test_whatever_a_manifest_holds_is_named_on_one_short_line(nasty_names: tuple[str, ...]) -> None:
    old = {"models": {name: {} for name in nasty_names}, "left_out": list(nasty_names)}
    for sentence in told(old, {"models": {}, "left_out": []}) + told(json.loads(json.dumps(old)), {}):
        assert "\n" not in sentence
        assert "\x1b" not in sentence
        assert len(sentence) < 300
