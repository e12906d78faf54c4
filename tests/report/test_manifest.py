import hashlib
import json
import subprocess
from dataclasses import replace
from datetime import UTC, datetime, timedelta
from pathlib import Path

import numpy as np
import pytest

from eosmuster.report import manifest as module
from eosmuster.report.manifest import FORMAT, file_hash, manifest, manifest_text, read_manifest


def test_says_what_the_results_were_made_from(record):
    content = json.loads(manifest_text(manifest(record, {"summary.csv": "b", "points.csv": "a"})))
    assert content["plan"] == {"name": "invented", "title": "An invented run", "text": record.plan_text}
    assert content["decision"]["rule"] == "guarded"
    assert content["constants"]["alphane"]["critical_temperature"] == {
        "value": 375.0,
        "unit": "K",
        "source": "invented",
    }
    assert content["models"] == {"PR": {"source": "invented"}}
    assert content["citations"] == {"invented": "nobody, nowhere"}
    assert content["left_out"][0]["what"] == "Air"
    assert content["constants"]["alphane"]["notes"] == ["acentric factor replaced: invented"]
    assert list(content["outputs"]) == ["points.csv", "summary.csv"]
    assert content["record_version"] == record.version
    assert content["points"] == {"rows": 216, "written": True}


def test_hashes_the_reference_data_by_its_place_in_the_folder(record):
    digest = hashlib.sha256(b"invented\n").hexdigest()
    assert manifest(record, {})["references"] == {"handbook/points.csv": digest}


def test_volatile_says_when_and_with_what(record):
    volatile = manifest(record, {}, started=datetime.now(UTC) - timedelta(seconds=3))["volatile"]
    assert 3.0 <= volatile["duration_s"] < 60.0
    assert datetime.fromisoformat(volatile["finished"]).tzinfo is not None
    assert volatile["versions"]["numpy"] == np.__version__
    assert volatile["versions"]["CoolProp"].startswith("8.")
    assert set(volatile["versions"]) == {"eosmuster", "python", "numpy", "CoolProp"}
    assert manifest(record, {})["volatile"]["duration_s"] is None


def test_numbers_json_cannot_hold_are_null(record):
    odd = {
        "nan": np.float64("nan"),
        "inf": float("inf"),
        "array": np.arange(2),
        "tuple": (1, True, None),
        "path": Path("x"),
    }
    content = json.loads(manifest_text(manifest(replace(record, decision=odd), {})))
    assert content["decision"] == {"nan": None, "inf": None, "array": [0, 1], "tuple": [1, True, None], "path": "x"}


def test_names_are_written_in_unicode_and_stay_data(record, nasty_names):
    content = manifest(replace(record, citations={name: name for name in nasty_names}), {})
    assert "水とアンモニア" in manifest_text(content)
    assert json.loads(manifest_text(content))["citations"] == {name: name for name in nasty_names}


@pytest.mark.parametrize("text", ["", "{", "[1]", '{"format": "x"}', "\xff"])
def test_only_a_manifest_of_ours_is_read(tmp_path, text):
    (tmp_path / "manifest.json").write_bytes(text.encode("latin-1"))
    assert read_manifest(tmp_path) is None
    (tmp_path / "manifest.json").write_text(json.dumps({"format": FORMAT}))
    assert read_manifest(tmp_path) == {"format": FORMAT}


def test_no_manifest_and_one_too_large_are_not_ours(tmp_path, monkeypatch):
    assert read_manifest(tmp_path) is None
    (tmp_path / "manifest.json").write_text(json.dumps({"format": FORMAT}))
    monkeypatch.setattr(module, "_LARGEST", 5)
    assert read_manifest(tmp_path) is None


def test_file_hash_is_sha_256_of_the_bytes(tmp_path):
    (tmp_path / "f").write_bytes(b"abc")
    # FIPS 180-4, the example message "abc"
    assert file_hash(tmp_path / "f") == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"


class TestRevision:
    def git(self, place, *arguments):
        identity = ("-c", "user.name=t", "-c", "user.email=t@example.org", "-c", "commit.gpgsign=false")
        subprocess.run(["git", "-C", str(place), *identity, *arguments], check=True, capture_output=True)

    def test_is_that_of_the_checkout_with_a_mark_if_it_was_changed(self, tmp_path):
        self.git(tmp_path, "init")
        (tmp_path / "f").write_text("1")
        self.git(tmp_path, "add", "f")
        self.git(tmp_path, "commit", "-m", "one")
        self.git(tmp_path, "tag", "-a", "v1", "-m", "v1")
        revision = module._git_revision(tmp_path)
        assert revision is not None
        assert len(revision) == 40
        (tmp_path / "f").write_text("two")
        assert module._git_revision(tmp_path) == revision + "-dirty"

    def test_is_none_without_a_checkout_a_commit_or_git(self, tmp_path, monkeypatch):
        assert module._git_revision(tmp_path) is None
        self.git(tmp_path, "init")
        assert module._git_revision(tmp_path) is None
        monkeypatch.setenv("PATH", "")
        assert module._git_revision(tmp_path) is None

    def test_an_unknown_distribution_has_no_version(self):
        assert module._version("no such distribution") == "unknown"


def test_notes_on_measured_files_are_no_losses(record):
    content = manifest(replace(record, notes=(("lab.csv", "read as text"),)), {})
    assert content["notes"] == [{"what": "lab.csv", "note": "read as text"}]
    assert "notes" not in manifest(record, {})
