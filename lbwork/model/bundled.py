"""The bundled published models and the one function that turns a word into a model."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from importlib import resources
from pathlib import Path
from typing import Any

from lbwork.errors import ModelError
from lbwork.model.files import model_from_document, parse_toml, read_toml
from lbwork.model.model import Model
from lbwork.model.words import nearest, shown

__all__ = ["CatalogueEntry", "catalogue", "catalogue_entry", "load_model"]


@dataclass(frozen=True, eq=False)
class CatalogueEntry:
    """A published model: ``integrable`` is ``yes``, ``no`` or ``unknown``, by ``argument``.

    ``sensible_sites`` are the sizes at which the tasks of this program take seconds to minutes.
    """

    name: str
    title: str
    source: str
    known: str
    integrable: str
    argument: str
    sensible_sites: tuple[int, ...]
    document: Mapping[str, Any]

    def model(self) -> Model:
        """The model with its default size and parameters."""
        return model_from_document(self.document)


@lru_cache(maxsize=1)
def catalogue() -> tuple[CatalogueEntry, ...]:
    """All bundled models, in alphabetical order."""
    folder = resources.files("lbwork.model") / "catalogue"
    entries = []
    for item in folder.iterdir():
        if item.name.endswith(".toml"):
            document = parse_toml(item.read_text(encoding="utf-8"), item.name)
            about = document["about"]
            entries.append(
                CatalogueEntry(
                    name=document["name"],
                    title=about["title"],
                    source=about["source"],
                    known=about["known"],
                    integrable=about["integrable"],
                    argument=about["argument"],
                    sensible_sites=tuple(about["sensible_sites"]),
                    document=document,
                )
            )
    return tuple(sorted(entries, key=lambda entry: entry.name))


def catalogue_entry(name: str) -> CatalogueEntry:
    """The bundled model of this name; raises ModelError with the nearest name."""
    entries = {entry.name: entry for entry in catalogue()}
    if name not in entries:
        raise ModelError(
            f"{shown(name)} is not a bundled model{nearest(name, entries)}; see lbwork catalogue"
        )
    return entries[name]


def load_model(name_or_path: str | Path, /, **changes: Any) -> Model:
    """A model by catalogue name or from a model file, with changes as in :meth:`Model.replace`.

    A word that ends in ``.toml`` or contains a path separator is a path; so is any other word that
    is no catalogue name but names an existing file. Raises ModelError.
    """
    model = _loaded(name_or_path)
    return model.replace(**changes) if changes else model


def _loaded(name_or_path: str | Path) -> Model:
    if not isinstance(name_or_path, str | Path):
        raise ModelError(
            f"model: {shown(name_or_path)} is neither text nor a path; give a catalogue name or "
            "the path of a .toml file"
        )
    text = str(name_or_path)
    names = [entry.name for entry in catalogue()]
    if isinstance(name_or_path, str) and text in names:
        return catalogue_entry(text).model()
    separators = [mark for mark in (os.sep, os.altsep) if mark]
    is_path = (
        isinstance(name_or_path, Path)
        or text.endswith(".toml")
        or any(mark in text for mark in separators)
        or os.path.exists(text)
    )
    if is_path:
        return model_from_document(read_toml(Path(name_or_path)))
    raise ModelError(
        f"{shown(text)} is neither a bundled model{nearest(text, names)} nor a file; see lbwork "
        "catalogue, or give the path of a .toml file"
    )
