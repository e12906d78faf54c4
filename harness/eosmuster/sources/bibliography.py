"""The bibliography of the reference data, read from the BibTeX we write ourselves."""

from __future__ import annotations

import re
from collections.abc import Mapping
from functools import cache
from types import MappingProxyType

from eosmuster.paths import references_folder


@cache
def bibliography() -> Mapping[str, str]:
    """Give the full reference, on one line, of every key in ``references/bibliography.bib``.

    Examples
    --------
    >>> print(bibliography()["crc-95"])
    W. M. Haynes: CRC Handbook of Chemistry and Physics. 95th edition, CRC Press, Boca Raton (2014).
    """
    text = (references_folder() / "bibliography.bib").read_text(encoding="utf-8")
    entries = re.finditer(r"^@\w+\{([^,\s]+),\n(.*?)^\}", text, re.MULTILINE | re.DOTALL)
    return MappingProxyType({key: _one_line(_fields(body)) for key, body in (e.groups() for e in entries)})


def _fields(body: str) -> dict[str, str]:
    """Read the ``name = {value},`` lines of one entry: the subset of BibTeX the file is written in."""
    pairs = re.findall(r"^\s*(\w+)\s*=\s*\{(.*)\},?\s*$", body, re.MULTILINE)
    return {name: re.sub(r"[{}]", "", value).replace(r"\&", "&").replace("--", "–") for name, value in pairs}


def _one_line(fields: Mapping[str, str]) -> str:
    people = fields.get("author") or fields.get("editor")
    author = people.replace(" and ", ", ") if people else fields["institution"]
    journal = " ".join(fields[k] for k in ("journal", "volume") if k in fields)
    where = journal or ", ".join(fields[k] for k in ("edition", "publisher", "number") if k in fields)
    pages = f" {fields['pages']}" if "pages" in fields else ""
    link = f" doi:{fields['doi']}" if "doi" in fields else f" {fields['url']}" if "url" in fields else ""
    return f"{author}: {fields['title']}. {where} ({fields['year']}){pages}.{link}"
