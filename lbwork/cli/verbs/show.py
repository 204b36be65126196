"""``lbwork show``: one kept run."""

from __future__ import annotations

import json as json_text
from pathlib import Path
from typing import Any

from lbwork.cli.console import emit_json, emit_table, emit_text, human_bytes, human_seconds
from lbwork.cli.options import JsonFlag, RunName, RunsFolder
from lbwork.store import RunFile, RunStore

NAME = "show"
LONG_LIST = 12


def run_document(kept: RunFile) -> dict[str, Any]:
    """Everything a run holds but its arrays, as one JSON document."""
    return {
        "summary": kept.summary.to_dict(),
        "model": kept.model_toml,
        "options": kept.options,
        "provenance": kept.provenance,
        "sectors": [document for _, document, _ in kept.sectors()],
        "results": {name: kept.result(name).document for name in kept.results()},
        "figures": list(kept.figures()),
    }


def _short(value: Any) -> str:
    if isinstance(value, float):
        return f"{value:.10g}"
    if isinstance(value, list) and len(value) > LONG_LIST:
        return f"{len(value)} entries"
    if isinstance(value, dict):
        return json_text.dumps(value) if len(value) <= 4 else f"{len(value)} entries"
    if isinstance(value, list):
        return ", ".join(_short(item) for item in value)
    return str(value)


def run(run: RunName, json: JsonFlag = False, runs: RunsFolder = Path("runs")) -> None:
    """A kept run: model, sectors, results with certificates, where it was made."""
    kept = RunStore(runs).open(run)
    if json:
        emit_json(run_document(kept))
        return
    summary = kept.summary
    emit_text(
        f"{summary.run_id}: {summary.status}, {human_seconds(summary.wall_time)}, peak memory "
        f"{human_bytes(summary.peak_memory)}\nmodel identity {summary.identity}"
        f"\n\n{kept.model_toml}"
    )
    rows = [
        [str(document["dimension"]), str(document["multiplicity"]), str(document["label"])]
        for _, document, _ in kept.sectors()
    ]
    if rows:
        emit_table([("size", "right"), ("copies", "right"), ("sector", "left")], rows)
    for name in kept.results():
        document = kept.result(name).document
        emit_table(
            [("quantity", "left"), ("value", "left")],
            [[key, _short(value)] for key, value in document.items()],
            title=name,
        )
