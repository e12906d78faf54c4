"""Text of plans and files in Markdown: nothing of it becomes an address or a mention."""

import re

import pytest

from eosmuster.report.mdtable import escaped

# what GitHub turns into a link or a mention in plain text (GFM 6.9 and its own)
LIVE = re.compile(r"(?i)\b(?:https?|ftp)://|\bwww\.|@[a-z0-9]")


@pytest.mark.parametrize(
    "text",
    ["https://example.org/x", "see HTTP://example.org", "www.example.org", "@somebody", "a@example.org", "@@all"],
)
def test_addresses_and_mentions_are_inert(text):
    assert LIVE.search(text)
    written = escaped(text)
    assert not LIVE.search(written)
    assert written.replace("&#8203;", "") == text  # nothing is seen of it


def test_what_is_no_address_stays_readable():
    assert escaped("T/Tc 0.5: 1 // 2") == "T/Tc 0.5: 1 // 2"
    assert escaped("liquid_density, 5 %") == "liquid_density, 5 %"
