"""Reading TOML tables key by key, with messages that name the place."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass

from eosmuster.errors import InputError, suggestion
from eosmuster.quantities import shown, to_si

Finder = Callable[[str, str], str]
"""(name as written, where it is written) -> the name it stands for, or InputError."""


@dataclass(frozen=True)
class Table:
    """One TOML table and where it stands.

    Attributes
    ----------
    data : the table
    place : file (or name of a built-in plan), for messages
    path : key of the table inside the file, "" for the top level
    """

    data: Mapping[str, object]
    place: str
    path: str = ""

    def at(self, key: str = "") -> str:
        """Say where a key stands.

        Examples
        --------
        >>> Table({}, "plan.toml", "states").at("temperature")
        'plan.toml: states.temperature'
        """
        return f"{self.place}: {'.'.join(part for part in (self.path, key) if part)}"

    def check_keys(self, valid: Iterable[str]) -> None:
        """Refuse the first key that is not valid."""
        valid = tuple(valid)
        for key in self.data:
            if key not in valid:
                where = self.at() if self.path else self.place
                raise InputError(f"{where}: unknown key {shown(key)}; {suggestion(key[:60], valid, most=16)}")

    def text(self, key: str, default: str | None = None) -> str:
        """Return a text; without a default it must be there and say something."""
        value = self.data.get(key, default)
        if not isinstance(value, str):
            raise InputError(f"{self.at(key)}: {_missing_or(value)}; write a text in quotes")
        if default is None and not value.strip():
            raise InputError(f"{self.at(key)}: empty; write a text in quotes")
        return value.strip()

    def texts(self, key: str, default: tuple[str, ...] = ()) -> tuple[str, ...]:
        """Return a list of texts, each given once; a single text stands for a list of one."""
        value = self.data.get(key, list(default))
        items = [value] if isinstance(value, str) else value
        if not isinstance(items, list) or not all(isinstance(i, str) for i in items):
            wrong = next((i for i in items if not isinstance(i, str)), value) if isinstance(items, list) else value
            raise InputError(f"{self.at(key)}: {shown(wrong)} is not a text; write a list of texts in quotes")
        found = tuple(i.strip() for i in items)
        _refuse_twice(found, self.at(key))
        return found

    def chosen(self, key: str, valid: Iterable[str], default: tuple[str, ...]) -> tuple[str, ...]:
        """Return a list of texts out of the valid ones."""
        valid = tuple(valid)
        return tuple(self.known(text, key, valid) for text in self.texts(key, default))

    def one_of(self, key: str, valid: Iterable[str], default: str) -> str:
        """Return one text out of the valid ones."""
        return self.known(self.text(key, default), key, valid)

    def known(self, text: str, key: str, valid: Iterable[str]) -> str:
        """Return the text if it is valid."""
        valid = tuple(valid)
        if text not in valid:
            raise InputError(f"{self.at(key)}: unknown {shown(text)}; {suggestion(text[:60], valid, most=20)}")
        return text

    def table(self, key: str) -> Table:
        """Return a table, empty where the key is missing."""
        value = self.data.get(key, {})
        if not isinstance(value, dict):
            raise InputError(f"{self.at(key)}: {shown(value)} is not a table; write [{key}] and its keys below it")
        return Table(value, self.place, self.at(key).removeprefix(f"{self.place}: "))

    def tables(self, key: str) -> tuple[Table, ...]:
        """Return the tables of an array ``[[key]]``, numbered from 1 in their messages."""
        value = self.data.get(key, [])
        path = self.at(key).removeprefix(f"{self.place}: ")
        if not isinstance(value, list) or not all(isinstance(v, dict) for v in value):
            raise InputError(f"{self.at(key)}: not an array of tables; write [[{path}]] and its keys below it")
        return tuple(Table(v, self.place, f"{path} no. {i}") for i, v in enumerate(value, start=1))

    def number(
        self, key: str, default: float | None = None, *, above: float = -math.inf, to: float = math.inf
    ) -> float:
        """Return a finite bare number with ``above < number <= to``."""
        value = self.data.get(key, default)
        if isinstance(value, bool) or not isinstance(value, (int, float)):
            raise InputError(f"{self.at(key)}: {_missing_or(value)}; write a bare number")
        number = to_si(value, "fraction", self.at(key))
        if not above < number <= to:
            raise InputError(f"{self.at(key)}: {shown(value)} is out of range; {_range(above, to)}")
        return number

    def quantity(self, key: str, dimension: str, *, above: float, to: float) -> float:
        """Return a quantity in SI with ``above < quantity <= to`` (SI)."""
        if key not in self.data:
            raise InputError(f"{self.at(key)}: missing; write a number or a quantity in quotes")
        value = to_si(self.data[key], dimension, self.at(key))
        if not above < value <= to:
            raise InputError(f"{self.at(key)}: {shown(self.data[key])} is {value:g} in SI; {_range(above, to)}")
        return value


def _missing_or(value: object) -> str:
    return "missing" if value is None else f"unexpected {shown(value)}"


def _range(above: float, to: float) -> str:
    parts = [f"above {above:g}"] if above > -math.inf else []
    parts += [f"at most {to:g}"] if to < math.inf else []
    return "it must be " + " and ".join(parts)


def _refuse_twice(found: tuple[str, ...], where: str) -> None:
    seen: set[str] = set()
    for text in found:
        if text.casefold() in seen:
            raise InputError(f"{where}: {shown(text)} is given twice; name it once")
        seen.add(text.casefold())
