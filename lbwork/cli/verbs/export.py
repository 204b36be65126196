"""``lbwork export``: the numbers of a kept run in a form other programs read."""

from __future__ import annotations

import csv
import io
import json as json_text
import os
from pathlib import Path
from typing import Annotated

import numpy as np
import typer

from lbwork.cli.console import emit_json, emit_text
from lbwork.cli.options import JsonFlag, RunName, RunsFolder
from lbwork.cli.verbs.show import run_document
from lbwork.errors import StoreError, UsageError
from lbwork.store import RunFile, RunStore

NAME = "export"
KINDS = (".csv", ".json", ".npz", ".toml")


def _levels_table(kept: RunFile) -> bytes:
    text = io.StringIO()
    writer = csv.writer(text)
    writer.writerow(["sector", "label", "multiplicity", "conjugates", "real", "imaginary", "bound"])
    for index, document, arrays in kept.sectors():
        for level, bound in zip(arrays["eigenvalues"], arrays["error_bounds"], strict=True):
            writer.writerow(
                [
                    index,
                    document["label"],
                    document["multiplicity"],
                    document["conjugates"],
                    repr(float(level.real)),
                    repr(float(level.imag)),
                    repr(float(bound)),
                ]
            )
    return text.getvalue().encode()


def _arrays(kept: RunFile) -> bytes:
    found: dict[str, np.ndarray] = {}
    for index, _, arrays in kept.sectors():
        found |= {f"sector_{index}_{name}": array for name, array in arrays.items()}
    for name in kept.results():
        found |= {f"{name}_{key}": array for key, array in kept.result(name).arrays.items()}
    if not found:
        raise StoreError(f"run '{kept.run_id}' holds no arrays; export it as .json")
    content = io.BytesIO()
    np.savez(content, allow_pickle=False, **found)
    return content.getvalue()


def _content(kept: RunFile, suffix: str) -> bytes:
    if suffix == ".csv":
        if not kept.summary.sectors_done:
            raise StoreError(f"run '{kept.run_id}' holds no levels; export it as .json")
        return _levels_table(kept)
    if suffix == ".npz":
        return _arrays(kept)
    if suffix == ".toml":
        return kept.model_toml.encode()
    return (json_text.dumps(run_document(kept), indent=1, allow_nan=False) + "\n").encode()


def run(
    run: RunName,
    out: Annotated[Path, typer.Option("--out", help="File to write: .csv .json .npz or .toml.")],
    json: JsonFlag = False,
    runs: RunsFolder = Path("runs"),
) -> None:
    """Levels as CSV, everything as JSON, arrays as NPZ, or the model file as TOML."""
    if out.suffix not in KINDS:
        raise UsageError(f"--out {out}: give a file that ends in {', '.join(KINDS)}")
    if not out.parent.is_dir():
        raise UsageError(f"--out {out}: folder '{out.parent}' does not exist; create it first")
    content = _content(RunStore(runs).open(run), out.suffix)
    unfinished = out.with_name(f".{out.name}.{os.getpid()}.partial")
    try:
        unfinished.write_bytes(content)
        os.replace(unfinished, out)
    except OSError as error:
        raise StoreError(f"cannot write '{out}': {error.strerror or error}") from None
    finally:
        unfinished.unlink(missing_ok=True)
    if json:
        emit_json({"file": str(out), "bytes": len(content)})
        return
    emit_text(str(out))
