"""Checks of everything in a model but its terms: name, sizes, boundary, parameters."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from lbwork.errors import ModelError
from lbwork.model.functions import CONSTANTS, FUNCTIONS
from lbwork.model.operators import known_operator_names
from lbwork.model.sources import scalar
from lbwork.model.tokens import tokens
from lbwork.model.words import nearest, shown

__all__ = [
    "BOUNDARIES",
    "checked_boundary",
    "checked_description",
    "checked_items",
    "checked_name",
    "checked_number",
    "checked_parameters",
]

MAX_NAME = 80
BOUNDARIES = ("open", "periodic")

# The first four are what Model.replace changes besides parameters; S would be read as part of S+.
RESERVED = ("sites", "boundary", "name", "description", "S", "j", "L", *CONSTANTS, *FUNCTIONS)


def checked_name(name: Any) -> str:
    """The name of a model: 1 to 80 printable characters; raises ModelError."""
    if not isinstance(name, str) or not name.strip():
        raise ModelError(
            f'name: {shown(name)} names nothing; give the model a name, e.g. name = "my-chain"'
        )
    if len(name) > MAX_NAME or not name.isprintable():
        raise ModelError(
            f"name: {shown(name)} is not {MAX_NAME} or fewer printable characters; shorten it"
        )
    return name


def checked_description(text: Any) -> str:
    """Free text that can be written to a file as UTF-8; raises ModelError."""
    if not isinstance(text, str):
        raise ModelError(f"description: {shown(text)} is not text; put it in quotes")
    if any("\ud800" <= character <= "\udfff" for character in text):
        raise ModelError("description: half a surrogate pair is not text; remove it")
    return text


def checked_number(key: str, value: Any, low: int, high: int) -> int:
    """A whole number from ``low`` to ``high``; raises ModelError naming ``key``."""
    if isinstance(value, bool) or not isinstance(value, int | np.integer):
        raise ModelError(f"{key}: {shown(value)} is not a whole number; give {low} to {high}")
    if not low <= value <= high:
        raise ModelError(f"{key}: {shown(value)} is outside {low} to {high}; give one of these")
    return int(value)


def checked_boundary(boundary: Any, sites: int) -> str:
    """``open`` or ``periodic``, the latter from two sites on; raises ModelError."""
    if not isinstance(boundary, str) or boundary not in BOUNDARIES:
        hint = nearest(boundary, BOUNDARIES) if isinstance(boundary, str) else ""
        raise ModelError(f"boundary: {shown(boundary)} is not known{hint}; use open or periodic")
    if boundary == "periodic" and sites < 2:
        raise ModelError("boundary: a ring needs at least 2 sites; use open")
    return boundary


def checked_items(items: Any, wanted: type, key: str) -> tuple[Any, ...]:
    """The terms or jumps as a tuple; raises ModelError when something else is among them."""
    if isinstance(items, wanted):
        items = (items,)
    try:
        found = tuple(items)
    except TypeError:
        raise ModelError(
            f"{key}: {shown(items)} is not a sequence; give a tuple of {wanted.__name__}"
        ) from None
    for item in found:
        if not isinstance(item, wanted):
            raise ModelError(
                f"{key}: {shown(item)} is not a {wanted.__name__}; write {wanted.__name__}(...)"
            )
    return found


def checked_parameters(parameters: Any, dimension: int) -> dict[str, float | complex]:
    """Legal names with finite numbers; a text value is evaluated once. Raises ModelError."""
    if not isinstance(parameters, Mapping):
        raise ModelError(
            f"parameters: {shown(parameters)} is not a table; give names with their numbers"
        )
    operators = known_operator_names(dimension)
    checked: dict[str, float | complex] = {}
    for key, value in parameters.items():
        place = f"parameter {shown(key)}"
        if not isinstance(key, str) or not key.isidentifier() or not key.isascii():
            raise ModelError(f"{place}: not a legal name; use letters, digits and _")
        if len(key) > MAX_NAME:
            raise ModelError(f"{place}: the name is longer than {MAX_NAME} letters; shorten it")
        if key in RESERVED:
            raise ModelError(f"{place}: the name is reserved; choose another")
        if key in operators:
            raise ModelError(f"{place}: this is the name of an operator; choose another")
        if isinstance(value, str):
            _check_independent(value, parameters, place)
        number = _parameter(value, place)
        checked[key] = number.real if number.imag == 0 else number
    return checked


def _check_independent(text: str, parameters: Mapping[str, Any], place: str) -> None:
    """Parameters are independent numbers, so that replacing one leaves no other out of date."""
    for kind, word in tokens(text, place):
        if kind == "name" and word in parameters:
            raise ModelError(
                f"{place}: {shown(text)} uses the parameter {shown(word)}; a parameter is one "
                "number, put formulas into the terms"
            )


def _parameter(value: Any, place: str) -> complex:
    if isinstance(value, str):
        return scalar(value, {}, place)
    if isinstance(value, bool | np.bool_):
        raise ModelError(f"{place}: {shown(value)} is not a number; write 0 or 1")
    if not isinstance(value, int | float | complex | np.number):
        raise ModelError(
            f"{place}: {shown(value)} is not one number; put lists into a coefficient or rate"
        )
    try:
        return scalar(complex(value), {}, place)
    except OverflowError:
        raise ModelError(
            f"{place}: {shown(value)} is too large a number; rescale the units"
        ) from None
