"""``lbwork catalogue``: the bundled published models."""

from __future__ import annotations

from typing import Annotated, Any

import typer

from lbwork.cli.console import emit_json, emit_table, emit_text
from lbwork.cli.options import JsonFlag
from lbwork.model import CatalogueEntry, catalogue, catalogue_entry, model_to_toml

NAME = "catalogue"


def _document(entry: CatalogueEntry) -> dict[str, Any]:
    model = entry.model()
    return {
        "name": entry.name,
        "title": entry.title,
        "source": entry.source,
        "known": entry.known,
        "integrable": entry.integrable,
        "argument": entry.argument,
        "sites": model.sites,
        "local_dimension": model.local_dimension,
        "boundary": model.boundary,
        "parameters": dict(model.parameters),
        "identity": model.identity,
    }


def run(
    name: Annotated[
        str | None, typer.Argument(help="Show one model in full, with its file.", metavar="NAME")
    ] = None,
    json: JsonFlag = False,
) -> None:
    """The bundled published models, with source and what is known of them."""
    if name is not None:
        entry = catalogue_entry(name)
        if json:
            emit_json({**_document(entry), "file": model_to_toml(entry.model())})
            return
        emit_text(
            f"{entry.title}\n{entry.known}\nintegrable: {entry.integrable} ({entry.argument})"
        )
        emit_text(f"source: {entry.source}\n\n{model_to_toml(entry.model())}")
        return
    entries = catalogue()
    if json:
        emit_json({"models": [_document(entry) for entry in entries]})
        return
    rows = []
    for entry in entries:
        model = entry.model()
        kind = "ring" if model.boundary == "periodic" else "open"
        rows.append(
            [
                entry.name,
                entry.title,
                f"{model.local_dimension}",
                f"{model.sites} {kind}",
                entry.integrable,
            ]
        )
    emit_table(
        [
            ("name", "left"),
            ("what it is", "left"),
            ("levels", "right"),
            ("sites", "left"),
            ("integrable", "left"),
        ],
        rows,
    )
    emit_text("lbwork catalogue NAME shows source, argument and the model file.")
