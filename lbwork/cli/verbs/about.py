"""``lbwork about``: what a bug report needs."""

from __future__ import annotations

from typing import Any

from lbwork.cli.console import emit_json, emit_table, human_bytes
from lbwork.cli.options import JsonFlag
from lbwork.provenance import provenance
from lbwork.store import SCHEMA

NAME = "about"


def run(json: JsonFlag = False) -> None:
    """Versions, threads, BLAS and run-file schema."""
    document: dict[str, Any] = {**provenance(), "run_file_schema": SCHEMA}
    if json:
        emit_json(document)
        return
    rows = [[package, version] for package, version in document["versions"].items()]
    rows.append(["python", document["python"]])
    rows.append(["system", document["system"]])
    rows.append(["processors", str(document["processors"])])
    rows.append(["memory available", human_bytes(document["memory_available"])])
    for pool in document["thread_pools"]:
        rows.append([f"threads of {pool['library']} {pool['version']}", str(pool["threads"])])
    rows.append(["run file schema", str(SCHEMA)])
    emit_table([("what", "left"), ("value", "left")], rows)
