"""Writes ``schema-<number>.h5`` beside itself with the schema of today.

To be run once, when a schema number is introduced; the files of earlier numbers are evidence of
what old programs wrote and are never written again: ``python -m tests.store.golden.write_golden``.
"""

from __future__ import annotations

import tempfile
from pathlib import Path

from lbwork.errors import StoreError
from lbwork.store import SCHEMA, RunStore
from tests.store.examples import start, write_rest

GOLDEN = Path(__file__).parent


def write_golden() -> Path:
    """Write the example run as the golden file of the current schema; refuses to replace one."""
    target = GOLDEN / f"schema-{SCHEMA}.h5"
    if target.exists():
        raise StoreError(f"'{target}' exists; golden files are written once per schema number")
    with tempfile.TemporaryDirectory() as folder:
        with start(RunStore(folder)) as run:
            write_rest(run)
        target.write_bytes((Path(folder) / f"{run.run_id}.h5").read_bytes())
    return target


if __name__ == "__main__":
    write_golden()
