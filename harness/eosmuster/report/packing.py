"""Dataclasses as flat arrays and JSON: taken apart field by field, put together again by the types of the fields.

A column of numbers becomes a stretch of the one array of its kind, a column of anything else a list of its distinct
values and the number of each row's. What is put together has exactly the types that the dataclass declares.
"""

from __future__ import annotations

import json
import types
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, fields, is_dataclass
from functools import cache
from itertools import pairwise
from typing import Any, TypeVar, Union, get_args, get_origin, get_type_hints

import numpy as np
from numpy.typing import NDArray

T = TypeVar("T")

KINDS: Mapping[str, np.dtype[Any]] = {
    "numbers": np.dtype("<f8"),
    "counts": np.dtype("<i8"),
    "notes": np.dtype("<i2"),
    "codes": np.dtype("<i1"),
}
"""Arrays that things are taken apart into, and what they hold."""

_SCALARS: Mapping[type, str] = {float: "numbers", int: "counts"}


@dataclass(frozen=True)
class Packed:
    """What was taken apart.

    Attributes
    ----------
    content : what JSON can hold: everything but the numbers
    arrays : one flat array for each of `KINDS`
    """

    content: Any
    arrays: Mapping[str, NDArray[Any]]


def pack(thing: object) -> Packed:
    """Take a dataclass apart.

    Examples
    --------
    >>> from eosmuster.record import WindowRow
    >>> row = WindowRow("x", "PR", "liquid_density", "own", 200.0, 300.5, "limit", "plan_limit")
    >>> unpack(WindowRow, pack(row)) == row
    True
    """
    packer = _Packer()
    content = packer.table(type(thing), [thing])
    return Packed(content, packer.arrays())


def unpack(kind: type[T], packed: Packed) -> T:
    """Put a dataclass together.

    Raises
    ------
    ValueError, TypeError, KeyError : it is none of that kind
    """
    unpacker = _Unpacker(packed.arrays)
    thing: T
    [thing] = unpacker.table(kind, packed.content, 1)
    unpacker.finish()
    return thing


@cache
def _hints(kind: Any) -> tuple[tuple[str, Any], ...]:
    """Fields of a dataclass with their types, in order."""
    hints = get_type_hints(kind)
    return tuple((field.name, hints[field.name]) for field in fields(kind))


def _array_kind(hint: Any) -> str | None:
    """Name the array that holds the numbers of an array field; None if it is no such field."""
    if get_origin(hint) is not np.ndarray:
        return None
    [scalar] = get_args(get_args(hint)[1])
    return next(kind for kind, dtype in KINDS.items() if dtype == np.dtype(scalar))


def _row_kind(hint: Any) -> type | None:
    """Name the dataclass of ``tuple[Dataclass, ...]``; None if it is anything else."""
    arguments = get_args(hint)
    if get_origin(hint) is tuple and len(arguments) == 2 and arguments[1] is Ellipsis and is_dataclass(arguments[0]):
        return arguments[0]  # type: ignore[return-value]
    return None


class _Packer:
    """Takes things apart, column by column."""

    def __init__(self) -> None:
        self._pieces: dict[str, list[NDArray[Any]]] = {kind: [] for kind in KINDS}

    def arrays(self) -> dict[str, NDArray[Any]]:
        return {k: np.concatenate([np.empty(0, KINDS[k]), *pieces]) for k, pieces in self._pieces.items()}

    def table(self, kind: type, rows: Sequence[Any]) -> dict[str, Any]:
        return {name: self._column(hint, [getattr(row, name) for row in rows]) for name, hint in _hints(kind)}

    def _keep(self, kind: str, values: Any) -> None:
        self._pieces[kind].append(np.ascontiguousarray(values, KINDS[kind]).ravel())

    def _column(self, hint: Any, values: list[Any]) -> Any:
        if (kind := _array_kind(hint)) is not None:
            for value in values:
                self._keep(kind, value)
            return [list(np.shape(value)) for value in values]
        if (row_kind := _row_kind(hint)) is not None:
            self._keep("counts", [len(value) for value in values])
            return self.table(row_kind, [row for value in values for row in value])
        if hint in _SCALARS:
            self._keep(_SCALARS[hint], values)
            return None
        if is_dataclass(hint):
            return self.table(hint, values)  # type: ignore[arg-type]
        texts = [json.dumps(value, default=_plain) for value in values]
        distinct = {text: number for number, text in enumerate(dict.fromkeys(texts))}
        self._keep("counts", [distinct[text] for text in texts])
        return [json.loads(text) for text in distinct]


def _plain(value: object) -> Any:
    """Give what JSON can hold for a NumPy value or a mapping of any kind."""
    if isinstance(value, np.ndarray | np.generic):
        return value.tolist()
    if isinstance(value, Mapping):
        return dict(value)
    raise TypeError(f"{type(value).__name__} cannot be saved")


class _Unpacker:
    """Puts things together, in the order in which they were taken apart."""

    def __init__(self, arrays: Mapping[str, NDArray[Any]]) -> None:
        self._arrays = arrays
        self._next = dict.fromkeys(KINDS, 0)

    def finish(self) -> None:
        """Hold that nothing is left over."""
        if any(self._arrays[kind].size != at for kind, at in self._next.items()):
            raise ValueError("more numbers than anything asks for")

    def table(self, kind: Any, content: Any, rows: int) -> list[Any]:
        names = [name for name, _ in _hints(kind)]
        if not isinstance(content, dict) or sorted(content) != sorted(names):
            raise ValueError(f"not the fields of a {kind.__name__}")
        columns = [self._column(hint, content[name], rows) for name, hint in _hints(kind)]
        return [kind(**dict(zip(names, row, strict=True))) for row in zip(*columns, strict=True)]

    def _take(self, kind: str, count: int) -> NDArray[Any]:
        start = self._next[kind]
        if not 0 <= count <= self._arrays[kind].size - start:
            raise ValueError(f"fewer {kind} than there have to be")
        self._next[kind] = start + count
        return self._arrays[kind][start : start + count]

    def _column(self, hint: Any, content: Any, rows: int) -> list[Any]:
        if (kind := _array_kind(hint)) is not None:
            return list(self._shaped(kind, content, rows))
        if (row_kind := _row_kind(hint)) is not None:
            return self._nested(row_kind, content, rows)
        if hint in _SCALARS:
            if content is not None:
                raise ValueError("words where there are only numbers")
            values: list[Any] = self._take(_SCALARS[hint], rows).tolist()
            return values
        if is_dataclass(hint):
            return self.table(hint, content, rows)
        number = self._take("counts", rows)
        distinct = [_typed(hint, value) for value in _list(content)]
        if rows and not 0 <= number.min() <= number.max() < len(distinct):
            raise ValueError("a text that there is not")
        return [distinct[i] for i in number.tolist()]

    def _shaped(self, kind: str, content: Any, rows: int) -> Iterator[NDArray[Any]]:
        shapes = _list(content)
        if len(shapes) != rows:
            raise ValueError("not one array a row")
        for shape in shapes:
            if not 1 <= len(_list(shape)) <= 2 or not all(type(n) is int and n >= 0 for n in shape):
                raise ValueError("no shape of an array")
            yield self._take(kind, shape[0] * (shape[1] if len(shape) == 2 else 1)).reshape(shape)

    def _nested(self, kind: type, content: Any, rows: int) -> list[Any]:
        counts = self._take("counts", rows).tolist()
        if any(count < 0 for count in counts):
            raise ValueError("a negative number of rows")
        inner: list[Any] = self.table(kind, content, sum(counts))
        ends = np.cumsum([0, *counts]).tolist()
        return [tuple(inner[start:end]) for start, end in pairwise(ends)]


def _list(value: Any) -> list[Any]:
    if not isinstance(value, list):
        raise TypeError("no list where there has to be one")
    return value


def _typed(hint: Any, value: Any) -> Any:
    """Hold a JSON value against a type, and give it as that type.

    Examples
    --------
    >>> _typed(tuple[str, ...], ["PR", "SRK"]), _typed(tuple[int, int] | None, None)
    (('PR', 'SRK'), None)
    >>> _typed(str, 1)
    Traceback (most recent call last):
    TypeError: 1 is no str
    """
    if hint is Any:
        return value
    origin, arguments = get_origin(hint), get_args(hint)
    if origin in (Union, types.UnionType):
        [inner] = [a for a in arguments if a is not type(None)]
        return None if value is None else _typed(inner, value)
    reader = _READERS.get(origin)
    if reader is not None:
        return reader(arguments, value)
    if type(value) is not hint:
        raise TypeError(f"{str(value)[:60]} is no {getattr(hint, '__name__', hint)}")
    return value


def _tuple(arguments: tuple[Any, ...], value: Any) -> tuple[Any, ...]:
    items = _list(value)
    wanted = arguments[:1] * len(items) if arguments[-1] is Ellipsis else arguments
    return tuple(_typed(hint, item) for hint, item in zip(wanted, items, strict=True))


def _mapping(arguments: tuple[Any, ...], value: Any) -> dict[Any, Any]:
    if not isinstance(value, dict):
        raise TypeError("no mapping where there has to be one")
    return {key: _typed(arguments[1], item) for key, item in value.items()}


_READERS: Mapping[Any, Callable[[tuple[Any, ...], Any], Any]] = {tuple: _tuple, Mapping: _mapping}
