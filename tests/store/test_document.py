"""Documents come back equal; what JSON cannot hold is refused with its place."""

from __future__ import annotations

import enum
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from pathlib import PurePosixPath
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from lbwork.errors import StoreError
from lbwork.store import document_text, read_document, to_jsonable

numbers = st.integers() | st.floats(allow_nan=False, allow_infinity=False)
texts = st.text(st.characters(exclude_categories=["Cs"]))
documents = st.recursive(
    st.none() | st.booleans() | numbers | texts,
    lambda inner: st.lists(inner) | st.dictionaries(texts, inner),
    max_leaves=20,
)


@settings(max_examples=100, deadline=None)
@given(documents)
def test_round_trip(document: Any) -> None:
    text = document_text(document)
    again = read_document(text)
    assert again == document
    # Equality forgets the sign of zero and True against 1; the text does not.
    assert document_text(again) == text


@settings(max_examples=50, deadline=None)
@given(st.dictionaries(texts, numbers))
def test_order_of_keys_does_not_matter(document: dict[str, float]) -> None:
    turned = dict(reversed(document.items()))
    assert document_text(turned) == document_text(document)


class Side(enum.Enum):
    LEFT = "left"


@dataclass(frozen=True)
class Inner:
    value: complex
    levels: tuple[float, ...]


@dataclass(frozen=True)
class Outer:
    inner: Inner
    share: Fraction


class Speaking:
    def to_dict(self) -> Mapping[str, Any]:
        return {"name": np.str_("x"), "count": np.int64(3)}


@pytest.mark.parametrize(
    ("value", "plain"),
    [
        (1 - 2j, [1.0, -2.0]),
        (np.complex128(1j), [0.0, 1.0]),
        (np.float32(0.5), 0.5),
        (np.bool_(True), True),
        (np.arange(3), [0, 1, 2]),
        (np.array([[1j]]), [[[0.0, 1.0]]]),
        (np.array(2.0), 2.0),
        (Fraction(1, 3), "1/3"),
        (PurePosixPath("a/b"), "a/b"),
        (Side.LEFT, "left"),
        (
            Outer(Inner(1j, (0.5,)), Fraction(2)),
            {"inner": {"value": [0.0, 1.0], "levels": [0.5]}, "share": "2"},
        ),
        (Speaking(), {"name": "x", "count": 3}),
        ((1, (2,)), [1, [2]]),
        (2**200, 2**200),
    ],
)
def test_plain_forms(value: Any, plain: Any) -> None:
    found = to_jsonable(value)
    assert found == plain
    assert type(found) is type(plain)
    assert read_document(document_text(value)) == plain


def endless() -> list[Any]:
    ring: list[Any] = []
    ring.append(ring)
    return ring


@pytest.mark.parametrize(
    ("value", "words"),
    [
        ({"a": [0.0, float("nan")]}, r"document.a\[1\] is nan"),
        ({"a": -np.inf}, "document.a is -inf"),
        (complex(0.0, np.inf), "document is inf"),
        ({1: 2}, "has the key 1, which is not a string"),
        ({"a": {1, 2}}, "document.a is a set"),
        ({"a": object()}, "document.a is a object"),
        ({"a": b"x"}, "document.a is a bytes"),
        ({"a": Inner}, "document.a is a type"),
        ("\ud800", "not valid UTF-8"),
        ({"\ud800": 1}, "not valid UTF-8"),
        (endless(), "deeper than 100"),
    ],
)
def test_refused(value: Any, words: str) -> None:
    with pytest.raises(StoreError, match=words) as caught:
        document_text(value)
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize("text", ["NaN", "[1, -Infinity]", "{", "", "[" * 100_000])
def test_strict_reading(text: str) -> None:
    with pytest.raises(StoreError, match="not a JSON document"):
        read_document(text)
