"""Kept runs: one HDF5 file per run, safe against kills, readable by any HDF5 tool.

>>> import tempfile
>>> import numpy as np
>>> from lbwork.store import RunStore
>>> folder = tempfile.TemporaryDirectory()
>>> store = RunStore(folder.name)
>>> with store.create(
...     "spectrum", model_name="example", model_toml="", canonical_json="{}", identity="0" * 64,
...     options={}, plan=[{"index": 0, "dimension": 2}], seed=1,
... ) as run:
...     run.write_sector(0, {"label": "all"}, {"eigenvalues": np.array([0j, -1 + 2j])})
>>> kept = store.open("spectrum-example")
>>> kept.summary.status, kept.summary.sectors_done
('complete', 1)
>>> [arrays["eigenvalues"] for _, _, arrays in kept.sectors()]
[array([ 0.+0.j, -1.+2.j])]
>>> folder.cleanup()

The layout is described field by field in DEVELOPERS.md; :mod:`lbwork.store.writer` explains how a
run survives a kill.
"""

from __future__ import annotations

from lbwork.store.document import document_text, read_document, to_jsonable
from lbwork.store.lock import LockedRunError
from lbwork.store.migration import NewerRunError
from lbwork.store.opening import DamagedRunError
from lbwork.store.reader import RunFile
from lbwork.store.records import Record, RunHeader, RunSummary
from lbwork.store.run_store import RunStore
from lbwork.store.schema import SCHEMA
from lbwork.store.writer import RunWriter

__all__ = [
    "SCHEMA",
    "DamagedRunError",
    "LockedRunError",
    "NewerRunError",
    "Record",
    "RunFile",
    "RunHeader",
    "RunStore",
    "RunSummary",
    "RunWriter",
    "document_text",
    "read_document",
    "to_jsonable",
]
