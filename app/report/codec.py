"""Results to JSON and back without loss: the way from one process into another.

Numbers keep every bit: JSON carries the shortest text that reads back as the same
float, and what JSON has no number for (NaN, infinities) travels as a word. The
types of the results' fields say what each entry becomes again.
"""

from __future__ import annotations

import math
import types
import typing
from collections.abc import Mapping
from dataclasses import fields, is_dataclass
from enum import Enum
from functools import cache
from typing import Any, get_args, get_origin, get_type_hints

import numpy as np

from app.analysis.results import Results

_WORDS = {"nan": math.nan, "inf": math.inf, "-inf": -math.inf}


class CodecError(ValueError):
    """An entry that is not what its field says."""


def encode(results: Results) -> dict[str, Any]:
    """Write results as what JSON can hold.

    Parameters
    ----------
    results : Results
        What was found.

    Returns
    -------
    dict
        Of strings, finite numbers, booleans, None, lists and dicts.
    """
    return typing.cast("dict[str, Any]", _plain(results))


def decode(content: Mapping[str, Any]) -> Results:
    """Read results back.

    Parameters
    ----------
    content : mapping
        As :func:`encode` wrote it.

    Returns
    -------
    Results
        Equal in every bit; its arrays are read-only.

    Raises
    ------
    CodecError
        If an entry is missing or is not what its field says.
    """
    return typing.cast("Results", _built(Results, content, "results"))


def _plain(value: Any) -> Any:  # noqa: ANN401 - whatever a result may hold
    if is_dataclass(value) and not isinstance(value, type):
        return {entry.name: _plain(getattr(value, entry.name)) for entry in fields(value)}
    if isinstance(value, Enum):
        return value.value
    if isinstance(value, np.ndarray):
        return [_plain(one) for one in value.tolist()]
    if isinstance(value, (tuple, list)):
        return [_plain(one) for one in value]
    if isinstance(value, Mapping):
        return {str(key): _plain(one) for key, one in value.items()}
    if isinstance(value, np.generic):
        return _plain(value.item())
    if isinstance(value, float) and not math.isfinite(value):
        return repr(value)
    return value


@cache
def _hints(kind: type) -> dict[str, Any]:
    return get_type_hints(kind)


def _built(kind: Any, value: Any, place: str) -> Any:  # noqa: ANN401 - one case a type
    origin = get_origin(kind)
    if is_dataclass(kind):
        return _dataclass(typing.cast("type", kind), value, place)
    if origin is np.ndarray:
        return _array(kind, value, place)
    if origin in (types.UnionType, typing.Union):
        return _choice(kind, value, place)
    if origin is tuple:
        return _tuple(kind, value, place)
    if origin is not None and issubclass(origin, Mapping):
        if not isinstance(value, Mapping):
            raise CodecError(f"{place} is not a table")
        inner = get_args(kind)[1]
        return {str(key): _built(inner, one, f"{place}.{key}") for key, one in value.items()}
    if isinstance(kind, type) and issubclass(kind, Enum):
        try:
            return kind(value)
        except ValueError:
            raise CodecError(f"{place} has an unknown value") from None
    return _scalar(kind, value, place)


def _dataclass(kind: type, value: Any, place: str) -> Any:  # noqa: ANN401
    if not isinstance(value, Mapping):
        raise CodecError(f"{place} is not a table")
    hints = _hints(kind)
    found = {}
    for entry in fields(kind):
        if entry.name not in value:
            raise CodecError(f"{place}.{entry.name} is missing")
        found[entry.name] = _built(hints[entry.name], value[entry.name], f"{place}.{entry.name}")
    return kind(**found)


def _array(kind: Any, value: Any, place: str) -> Any:  # noqa: ANN401
    numbers = get_args(get_args(kind)[1])[0]
    if not isinstance(value, list):
        raise CodecError(f"{place} is not a list")
    try:
        array = np.array([_WORDS.get(one, one) for one in value], dtype=numbers)
    except (TypeError, ValueError, OverflowError):
        raise CodecError(f"{place} has something that is not a number") from None
    array.setflags(write=False)
    return array


def _choice(kind: Any, value: Any, place: str) -> Any:  # noqa: ANN401
    options = get_args(kind)
    if value is None and type(None) in options:
        return None
    if set(options) == {float, str}:
        # A word that is no number stays a word; inputs are finite.
        return value if isinstance(value, str) else _scalar(float, value, place)
    (inner,) = (one for one in options if one is not type(None))
    return _built(inner, value, place)


def _tuple(kind: Any, value: Any, place: str) -> Any:  # noqa: ANN401
    if not isinstance(value, list):
        raise CodecError(f"{place} is not a list")
    inner = get_args(kind)
    if inner[-1] is Ellipsis:
        return tuple(_built(inner[0], one, f"{place}[{at}]") for at, one in enumerate(value))
    if len(inner) != len(value):
        raise CodecError(f"{place} must have {len(inner)} entries")
    return tuple(_built(one, entry, place) for one, entry in zip(inner, value, strict=True))


def _scalar(kind: Any, value: Any, place: str) -> Any:  # noqa: ANN401
    if kind is float:
        if isinstance(value, str) and value in _WORDS:
            return _WORDS[value]
        if isinstance(value, (int, float)) and not isinstance(value, bool):
            return float(value)
    elif isinstance(kind, type) and type(value) is kind:
        return value
    raise CodecError(f"{place} is not a {getattr(kind, '__name__', kind)}")
