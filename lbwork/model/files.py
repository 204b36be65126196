"""Model files: TOML with the project's own keys, read strictly, written to round-trip."""

from __future__ import annotations

import json
import tomllib
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any

from lbwork.errors import ModelError
from lbwork.model.model import Model
from lbwork.model.terms import Jump, RandomOperator, Term
from lbwork.model.words import nearest, shown

__all__ = ["model_from_document", "model_from_toml", "model_to_toml", "parse_toml", "read_toml"]

MAX_FILE_BYTES = 4_000_000
MODEL_KEYS = (
    "name",
    "description",
    "sites",
    "local_dimension",
    "boundary",
    "parameters",
    "hamiltonian",
    "jump",
    "about",
)
TERM_KEYS = ("operator", "matrix", "random", "on", "coefficient")
JUMP_KEYS = (*TERM_KEYS, "rate")
RANDOM_KEYS = ("kind", "range", "seed")
ABOUT_KEYS = ("title", "source", "known", "integrable", "argument", "sensible_sites")


def _known_keys(document: Mapping[str, Any], allowed: Iterable[str], place: str) -> None:
    allowed = tuple(allowed)
    for key in document:
        if key not in allowed:
            raise ModelError(
                f"{place}: unknown key {shown(key)}{nearest(str(key), allowed)}; known keys are "
                f"{', '.join(allowed)}"
            )


def read_toml(path: Path) -> dict[str, Any]:
    """Read a TOML file; raises ModelError when it is missing, too large, not text or not TOML."""
    place = shown(str(path))
    try:
        if path.is_dir():
            raise ModelError(f"{place}: is a folder; give the path of a model file")
        # Read with a bound rather than asked for its size, which pipes and devices do not know.
        with path.open("rb") as file:
            content = file.read(MAX_FILE_BYTES + 1)
    except OSError as error:
        raise ModelError(
            f"{place}: cannot be read ({error.strerror or error}); check the path"
        ) from None
    except ValueError as error:
        raise ModelError(f"{place}: is not a path ({error}); check it") from None
    if len(content) > MAX_FILE_BYTES:
        raise ModelError(
            f"{place}: more than {MAX_FILE_BYTES} bytes are no model file; check the path"
        )
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise ModelError(
            f"{place}: not UTF-8 text from byte {error.start} on; save it as UTF-8"
        ) from None
    return parse_toml(text, place)


def parse_toml(text: str, place: str) -> dict[str, Any]:
    """Parse TOML text; raises ModelError with the line of the mistake."""
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        reason = shown(str(error)).strip("'\"")
    except RecursionError:
        reason = "lists or tables are nested too deeply"
    except ValueError as error:
        # Numbers and dates that have the form of TOML but no value.
        reason = shown(str(error)).strip("'\"")
    raise ModelError(f"{place}: not valid TOML: {reason}; correct the file there")


def model_from_toml(text: str, place: str = "model") -> Model:
    """A model from the text of a model file; ``place`` opens messages about its syntax.

    Raises ModelError.
    """
    return model_from_document(parse_toml(text, place))


def model_from_document(document: Mapping[str, Any]) -> Model:
    """A model from a parsed model file; unknown keys and wrong types are refused by name."""
    _known_keys(document, MODEL_KEYS, "model file")
    for key in ("name", "sites"):
        if key not in document:
            raise ModelError(f"model file: key '{key}' is missing; add it at the top")
    for key in ("name", "description", "boundary"):
        if not isinstance(document.get(key, ""), str):
            raise ModelError(f"{key}: {shown(document[key])} is not text; put it in quotes")
    parameters = document.get("parameters", {})
    if not isinstance(parameters, Mapping):
        raise ModelError(
            f"parameters: {shown(parameters)} is not a table; write [parameters] and below it "
            "lines name = number"
        )
    about = document.get("about", {})
    if not isinstance(about, Mapping):
        raise ModelError(f"about: {shown(about)} is not a table; write [about] and lines below it")
    _known_keys(about, ABOUT_KEYS, "[about]")
    return Model(
        name=document["name"],
        description=document.get("description", ""),
        sites=document["sites"],
        local_dimension=document.get("local_dimension", 2),
        boundary=document.get("boundary", "open"),
        parameters=dict(parameters),
        hamiltonian=tuple(_term(item, place) for item, place in _entries(document, "hamiltonian")),
        jumps=tuple(_jump(item, place) for item, place in _entries(document, "jump")),
    )


def _entries(document: Mapping[str, Any], key: str) -> list[tuple[Mapping[str, Any], str]]:
    entries = document.get(key, [])
    label = "hamiltonian term" if key == "hamiltonian" else "jump"
    if not isinstance(entries, list) or not all(isinstance(item, Mapping) for item in entries):
        raise ModelError(
            f"{key}: {shown(entries)} is not a list of tables; write each entry under its own "
            f"[[{key}]] heading"
        )
    return [(item, f"{label} {index}") for index, item in enumerate(entries, start=1)]


def _operator(item: Mapping[str, Any], place: str) -> Any:
    given = [key for key in ("operator", "matrix", "random") if key in item]
    if len(given) != 1:
        reason = "none is given" if not given else f"{' and '.join(given)} are given"
        raise ModelError(f"{place}: {reason}; give exactly one of operator, matrix, random")
    value = item[given[0]]
    if given[0] == "operator":
        if not isinstance(value, str):
            raise ModelError(
                f"{place}: operator = {shown(value)} is not text; use matrix for numbers"
            )
        return value
    if given[0] == "matrix":
        if not isinstance(value, list):
            raise ModelError(
                f"{place}: matrix = {shown(value)} is not a list of rows; write e.g. "
                "[[0, 1], [1, 0]]"
            )
        return value
    if not isinstance(value, Mapping):
        raise ModelError(
            f"{place}: random = {shown(value)} is not a table; write e.g. "
            '{kind = "hermitian", range = 2, seed = 1}'
        )
    _known_keys(value, RANDOM_KEYS, f"{place}: random")
    for key in RANDOM_KEYS:
        if key not in value:
            raise ModelError(f"{place}: random needs the key '{key}'; add it")
    return RandomOperator(value["kind"], value["range"], value["seed"], place)


def _term(item: Mapping[str, Any], place: str) -> Term:
    _known_keys(item, TERM_KEYS, place)
    operator = _operator(item, place)
    return Term(operator, item.get("on", "all"), item.get("coefficient", 1.0), place)


def _jump(item: Mapping[str, Any], place: str) -> Jump:
    _known_keys(item, JUMP_KEYS, place)
    operator = _operator(item, place)
    return Jump(
        operator, item.get("on", "all"), item.get("rate", 1.0), item.get("coefficient", 1.0), place
    )


def _value_text(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return json.dumps(value, ensure_ascii=False).replace("\u007f", "\\u007f")
    if isinstance(value, Mapping):
        return "{" + ", ".join(f"{key} = {_value_text(item)}" for key, item in value.items()) + "}"
    if isinstance(value, list):
        return "[" + ", ".join(_value_text(item) for item in value) + "]"
    return repr(value)


def model_to_toml(model: Model) -> str:
    """The text of a model file that reads back as the same model."""
    document = model.to_dict()
    lines = [
        f"{key} = {_value_text(document[key])}"
        for key in ("name", "description", "sites", "local_dimension", "boundary")
    ]
    if document["parameters"]:
        lines += ["", "[parameters]"]
        lines += [f"{key} = {_value_text(value)}" for key, value in document["parameters"].items()]
    for key in ("hamiltonian", "jump"):
        for entry in document[key]:
            lines += ["", f"[[{key}]]"]
            lines += [f"{name} = {_value_text(value)}" for name, value in entry.items()]
    return "\n".join(lines) + "\n"
