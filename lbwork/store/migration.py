"""Files of earlier schema numbers, brought up to date step by step.

A step changes an HDF5 file that lives in memory, a run file or one record of an unfinished run
alike; the file on the disk stays as it was until the run is rewritten. Newer numbers are refused.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import h5py

from lbwork.errors import StoreError
from lbwork.store.arrays import write_array
from lbwork.store.content import write_listing
from lbwork.store.schema import FORMAT, SCHEMA

__all__ = ["MIGRATIONS", "Migration", "NewerRunError", "migrate", "schema_of"]


class NewerRunError(StoreError):
    """The file was written by a later lbwork, in a layout that this one does not know."""


@dataclass(frozen=True)
class Migration:
    """A named step; ``change`` edits the file in place and need not touch the schema number."""

    name: str
    change: Callable[[h5py.File], None]


def _plain_numbers(file: h5py.File) -> None:
    # Schema 1 kept complex numbers as a compound (r, i) and booleans as an enumeration, which most
    # readers other than the writing library refuse; schema 2 keeps pairs and bytes.
    odd: list[h5py.Dataset] = []

    def collect(_: str, item: h5py.HLObject) -> None:
        if isinstance(item, h5py.Dataset) and item.dtype.kind in "cb":
            odd.append(item)

    file.visititems(collect)
    for dataset in odd:
        array, group, name = dataset[()], dataset.parent, dataset.name.rpartition("/")[2]
        del group[name]
        write_array(group, name, array)


MIGRATIONS: Final = {(1, 2): Migration("complex numbers as pairs", _plain_numbers)}
"""Steps by (from, to); each leads to the next number."""


def schema_of(file: h5py.File) -> int:
    """Schema number of an open file.

    Raises NewerRunError when it is beyond ours, StoreError when the file is none of the store's.
    """
    number = file.attrs.get("schema")
    if file.attrs.get("format") != FORMAT or number is None:
        raise StoreError("it is an HDF5 file, but not a run of lbwork")
    if int(number) > SCHEMA:
        version = file.attrs.get("lbwork_version", "a later version")
        raise NewerRunError(
            f"it has schema {int(number)}, written by lbwork {version}; this lbwork reads up to "
            f"schema {SCHEMA}: install a newer one"
        )
    if int(number) < 1:
        raise StoreError(f"its schema number {int(number)} does not exist")
    return int(number)


def migrate(file: h5py.File) -> tuple[str, ...]:
    """Bring a writable file to the current schema; returns the names of the steps taken."""
    steps = []
    number = schema_of(file)
    while number < SCHEMA:
        step = MIGRATIONS[number, number + 1]
        step.change(file)
        number += 1
        file.attrs["schema"] = number
        steps.append(step.name)
    if steps and "model" in file:
        # Derived from the rest, in today's form; the parts of an unfinished run have none.
        write_listing(file)
    return tuple(steps)
