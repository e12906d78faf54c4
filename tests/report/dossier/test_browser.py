"""The page in a browser: its script runs under its own policy, it asks for nothing, and it prints."""

import json
import os
import re
import shutil
import subprocess

import pytest

BROWSER = next(filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))), None)

pytestmark = pytest.mark.skipif(BROWSER is None, reason="no chromium to open the page with")


@pytest.fixture
def opened(tmp_path):
    """Open a page from disk, and show its elements or print it; every request that would leave the machine fails."""

    def run(content, *asked):
        path = tmp_path / "dossier.html"
        path.write_bytes(content)
        command = [
            *(BROWSER, "--headless=new", "--no-sandbox", "--disable-gpu", "--disable-background-networking"),
            *("--no-first-run", "--disable-component-update", "--disable-sync"),
            *("--proxy-server=127.0.0.1:9", "--enable-logging=stderr", f"--user-data-dir={tmp_path / 'profile'}"),
            *(f"--log-net-log={tmp_path / 'net.json'}", *(asked or ("--dump-dom",)), path.as_uri()),
        ]
        return subprocess.run(
            command, capture_output=True, text=True, timeout=60, check=True, env=os.environ | {"HOME": str(tmp_path)}
        )

    return run


def requests(folder):
    """List what the page asked for; what the browser asks for on its own account has no origin."""
    events = json.loads((folder / "net.json").read_text(encoding="utf-8"))["events"]
    asked = [event["params"] for event in events if "initiator" in event.get("params", {})]
    return [one["url"] for one in asked if one["initiator"] != "not an origin"]


def test_the_script_runs_the_console_stays_empty_and_nothing_is_asked_for(record, written, opened, tmp_path):
    done = opened(written(record))
    assert "CONSOLE" not in done.stderr
    assert requests(tmp_path) == []
    assert re.search(r'<th scope="col"[^>]*><button type="button">candidate</button>', done.stdout)


def test_another_script_does_not_run(record, written, opened):
    done = opened(written(record).replace(b"</main>", b"<p id=x></p><script>document.title='owned'</script></main>"))
    assert "Content Security Policy" in done.stderr
    assert "<title>owned" not in done.stdout


def test_it_prints_on_landscape_pages_and_a_request_would_be_seen(record, written, opened, tmp_path):
    """Without its policy and with a foreign picture, so that the list of requests is known to be able to fail."""
    foreign = b'<img alt="" src="http://example.org/x.png"></main>'
    page = written(record).replace(b"Content-Security-Policy", b"x").replace(b"</main>", foreign)
    opened(page, f"--print-to-pdf={tmp_path / 'page.pdf'}")
    assert requests(tmp_path) == ["http://example.org/x.png"]
    paper = (tmp_path / "page.pdf").read_bytes()
    boxes = re.findall(rb"/MediaBox *\[0 0 ([\d.]+) ([\d.]+)\]", paper)
    assert 2 <= len(boxes) <= 30
    assert all(float(width) > float(height) for width, height in boxes)
