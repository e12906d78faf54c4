"""The page in a browser: its script runs under its own policy, and nothing is complained about."""

import os
import re
import shutil
import subprocess

import pytest

BROWSER = next(filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))), None)

pytestmark = pytest.mark.skipif(BROWSER is None, reason="no chromium to open the page with")


@pytest.fixture
def opened(tmp_path):
    """Open a page from disk; every request that would leave the machine fails."""

    def run(content):
        path = tmp_path / "dossier.html"
        path.write_bytes(content)
        command = [
            *(BROWSER, "--headless=new", "--no-sandbox", "--disable-gpu", "--disable-background-networking"),
            *("--proxy-server=127.0.0.1:9", "--enable-logging=stderr", f"--user-data-dir={tmp_path / 'profile'}"),
            *("--dump-dom", path.as_uri()),
        ]
        return subprocess.run(
            command, capture_output=True, text=True, timeout=60, check=True, env=os.environ | {"HOME": str(tmp_path)}
        )

    return run


def test_the_script_runs_and_the_console_stays_empty(record, written, opened):
    done = opened(written(record))
    assert "CONSOLE" not in done.stderr
    assert re.search(r'<th scope="col"[^>]*><button type="button">candidate</button>', done.stdout)


def test_another_script_does_not_run(record, written, opened):
    done = opened(written(record).replace(b"</main>", b"<p id=x></p><script>document.title='owned'</script></main>"))
    assert "Content Security Policy" in done.stderr
    assert "<title>owned" not in done.stdout
