"""Plain JSON documents: every record becomes one, and comes back equal.

The text is canonical (sorted keys, shortest float text that reads back to the same double), so two
documents are equal exactly when their texts are.
"""

from __future__ import annotations

import dataclasses
import enum
import json
import math
import os
from collections.abc import Mapping
from fractions import Fraction
from typing import Any

import numpy as np

from lbwork.errors import StoreError

__all__ = ["document_text", "read_document", "to_jsonable"]

_DEEPEST = 100


def to_jsonable(value: object, place: str = "document") -> Any:
    """The same content in dicts, lists, strings, numbers, booleans and None.

    complex -> [re, im]; arrays -> nested lists; tuples -> lists; dataclasses, and records with a
    ``to_dict()``, -> dicts; Fraction and path -> text; enumeration members -> their value.

    Raises StoreError with the place for NaN and infinity (not JSON), for keys that are not strings,
    for sets (no order) and for anything else that has no plain form.
    """
    return _plain(value, place, 0)


def document_text(document: object, place: str = "document") -> str:
    """Canonical JSON text of a document, UTF-8 characters kept readable."""
    plain = to_jsonable(document, place)
    return json.dumps(plain, sort_keys=True, allow_nan=False, ensure_ascii=False)


def read_document(text: str, place: str = "document") -> Any:
    """The document behind a JSON text; raises StoreError when the text is not strict JSON."""
    try:
        return json.loads(text, parse_constant=_refused_constant)
    except (ValueError, RecursionError) as error:
        raise StoreError(f"{place} is not a JSON document ({error})") from None


def _refused_constant(word: str) -> None:
    raise ValueError(f"{word} is not JSON")


def _plain(value: object, place: str, depth: int) -> Any:
    if depth > _DEEPEST:
        raise StoreError(f"{place[:80]}... is nested deeper than {_DEEPEST} levels; flatten it")
    if value is None or isinstance(value, bool | np.bool_):
        return None if value is None else bool(value)
    if isinstance(value, enum.Enum):
        return _plain(value.value, place, depth + 1)
    if isinstance(value, str):
        return _text(str(value), place)
    if isinstance(value, int | np.integer):
        return int(value)
    if isinstance(value, float | np.floating):
        return _finite(float(value), place)
    if isinstance(value, complex | np.complexfloating):
        number = complex(value)
        return [_finite(number.real, place), _finite(number.imag, place)]
    if isinstance(value, Fraction | os.PathLike):
        return _text(str(value), place)
    if isinstance(value, np.ndarray):
        return _plain(value.tolist(), place, depth + 1)
    return _container(value, place, depth)


def _container(value: object, place: str, depth: int) -> Any:
    if isinstance(value, Mapping):
        plain = {}
        for key, item in value.items():
            if not isinstance(key, str):
                raise StoreError(f"{place} has the key {key!r}, which is not a string")
            plain[_text(str(key), place)] = _plain(item, f"{place}.{key}", depth + 1)
        return plain
    if isinstance(value, list | tuple):
        return [_plain(item, f"{place}[{i}]", depth + 1) for i, item in enumerate(value)]
    if hasattr(value, "to_dict") and not isinstance(value, type):
        return _plain(value.to_dict(), place, depth + 1)
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        fields = {field.name: getattr(value, field.name) for field in dataclasses.fields(value)}
        return _plain(fields, place, depth + 1)
    raise StoreError(
        f"{place} is a {type(value).__name__}, which has no JSON form; "
        "pass numbers, strings, lists or dicts"
    )


def _finite(number: float, place: str) -> float:
    if not math.isfinite(number):
        raise StoreError(f"{place} is {number}, which JSON cannot hold; leave it out or use null")
    return number


def _text(text: str, place: str) -> str:
    try:
        text.encode("utf-8")
    except UnicodeEncodeError:
        raise StoreError(f"{place} is text that is not valid UTF-8; remove the surrogate") from None
    return text
