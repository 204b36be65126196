"""Headers, records and completion as HDF5 groups: the one place that knows their fields.

The root attribute ``listing`` repeats in one JSON text what the list of runs shows, since opening
groups and attributes one by one makes a folder of some hundred runs slow to list.

Each record carries a SHA-256 over its document and arrays, so that a flipped bit is found when the
record is read; its marker ``complete`` is written last.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from typing import Any

import h5py
import numpy as np

from lbwork.errors import StoreError
from lbwork.store.arrays import read_array, write_array
from lbwork.store.document import document_text, read_document
from lbwork.store.records import Record, RunHeader, planned_indices
from lbwork.store.schema import CLOSING_STATUSES, DOCUMENT, FAMILIES, FORMAT, SCHEMA, checked_text

__all__ = [
    "check_listing",
    "is_complete",
    "read_header",
    "read_listing",
    "read_record",
    "stamp",
    "write_completion",
    "write_header",
    "write_listing",
    "write_record",
]

_TEXT = h5py.string_dtype("utf-8")
_MARKER = "complete"
_GROUPS = frozenset((*FAMILIES, "model", "options", "plan", "provenance"))


def stamp(file: h5py.File, header: RunHeader) -> None:
    """Root attributes that every file of a run carries, its parts too."""
    file.attrs["format"] = FORMAT
    file.attrs["schema"] = SCHEMA
    file.attrs["kind"] = header.kind
    file.attrs["run_id"] = header.run_id
    file.attrs["created"] = header.created
    file.attrs["lbwork_version"] = header.version


def write_header(file: h5py.File, header: RunHeader) -> None:
    """Root attributes, model, options, plan, provenance and empty groups of records."""
    stamp(file, header)
    if header.seed is not None:
        # Decimal text: seeds of 128 bits are in use, HDF5 integers end at 64.
        file.attrs["seed"] = str(header.seed)
    for path, text in header.texts().items():
        file.create_dataset(path, data=checked_text(text, path), dtype=_TEXT)
    file["plan"].attrs["sectors"] = len(planned_indices(header.plan))
    for family in FAMILIES:
        file.create_group(family)
    file.attrs["header_sha256"] = header.seal()
    write_listing(file)


def read_header(file: h5py.File) -> RunHeader:
    """The header of an open run file; StoreError when a field is missing or was changed."""
    seed = file.attrs.get("seed")
    header = RunHeader(
        run_id=_words(file, "run_id"),
        kind=_words(file, "kind"),
        created=_words(file, "created"),
        version=_words(file, "lbwork_version"),
        model_name=_read_text(file, "model/name"),
        model_toml=_read_text(file, "model/toml"),
        canonical_json=_read_text(file, "model/canonical_json"),
        identity=_read_text(file, "model/identity"),
        options_text=_read_text(file, "options/json"),
        plan_text=_read_text(file, "plan/json"),
        provenance_text=_read_text(file, "provenance/json"),
        seed=None if seed is None else int(seed),
    )
    if _words(file, "header_sha256") != header.seal():
        raise StoreError("its header does not match its SHA-256")
    return header


def write_record(file: h5py.File, family: str, record: Record) -> None:
    """Write one record as group ``family/name``; its arrays have passed ``checked_array``."""
    group = file.require_group(family).create_group(record.name)
    text = document_text(record.document, f"{family}/{record.name}")
    group.create_dataset(DOCUMENT, data=checked_text(text, record.name), dtype=_TEXT)
    for name, array in record.arrays.items():
        write_array(group, name, array)
    group.attrs["elapsed"] = record.elapsed
    group.attrs["peak_memory"] = record.peak_memory
    group.attrs["sha256"] = _seal(text, record.arrays)
    group.attrs[_MARKER] = np.uint8(1)


def read_record(file: h5py.File, family: str, name: str) -> Record:
    """Read one record and check it against its SHA-256; KeyError when there is none."""
    group = _group(file, f"{family}/{name}")
    if not is_complete(group):
        raise StoreError(f"record {family}/{name} has no completion marker")
    text = _read_text(group, DOCUMENT)
    arrays = {key: read_array(item) for key, item in group.items() if key != DOCUMENT}
    if _words(group, "sha256") != _seal(text, arrays):
        raise StoreError(f"record {family}/{name} does not match its SHA-256")
    return Record(
        name=name,
        document=read_document(text, f"{family}/{name}"),
        arrays=arrays,
        elapsed=float(group.attrs["elapsed"]),
        peak_memory=int(group.attrs["peak_memory"]),
    )


def write_completion(
    file: h5py.File,
    *,
    status: str,
    finished: str,
    wall_time: float,
    peak_memory: int,
) -> None:
    """Write the group ``completion``: wall time in seconds, memory in bytes, the marker last."""
    group = file.create_group("completion")
    group.attrs["status"] = status
    group.attrs["finished"] = finished
    group.attrs["wall_time"] = wall_time
    group.attrs["peak_memory"] = peak_memory
    write_listing(file)
    group.attrs[_MARKER] = np.uint8(1)


def write_listing(file: h5py.File) -> None:
    """Derive the root attribute ``listing`` of a run file from its content."""
    file.attrs["listing"] = document_text(_listing(file), "the listing")


def read_listing(file: h5py.File) -> dict[str, Any]:
    """Fields of :class:`RunSummary` from the listing, without looking into the groups."""
    missing = sorted(_GROUPS - set(file))
    if missing:
        raise StoreError(f"it has no group '{missing[0]}'")
    if "completion" in file and not is_complete(file["completion"]):
        raise StoreError("its completion has no marker")
    listing = read_document(_words(file, "listing"), "its listing")
    if not isinstance(listing, dict):
        raise StoreError(f"its listing is a {type(listing).__name__}")
    if ("completion" in file) != (listing.get("status") in CLOSING_STATUSES):
        raise StoreError("its listing does not match its content")
    return dict(listing, results=tuple(listing["results"]))


def check_listing(file: h5py.File) -> None:
    """StoreError when a group is missing or the listing says anything else than the content."""
    read_listing(file)
    if _words(file, "listing") != document_text(_listing(file), "the listing"):
        raise StoreError("its listing does not match its content")


def is_complete(group: h5py.Group | None) -> bool:
    """Whether a record, or the group ``completion``, carries its marker."""
    return group is not None and int(group.attrs.get(_MARKER, 0)) == 1


def _listing(file: h5py.File) -> dict[str, Any]:
    header = read_header(file)
    listing: dict[str, Any] = {
        "kind": header.kind,
        "created": header.created,
        "version": header.version,
        "model_name": header.model_name,
        "identity": header.identity,
        "seed": header.seed,
        "sectors_planned": int(file["plan"].attrs["sectors"]),
        "sectors_done": len(file["sectors"]),
        "results": sorted(file["results"]),
        "status": "unfinished",
    }
    if "completion" in file:
        completion = file["completion"].attrs
        listing |= {
            "status": _words(file["completion"], "status"),
            "finished": _words(file["completion"], "finished"),
            "wall_time": float(completion["wall_time"]),
            "peak_memory": int(completion["peak_memory"]),
        }
    return listing


def _read_text(group: h5py.Group, path: str) -> str:
    """The UTF-8 text in a scalar dataset; StoreError when there is none."""
    dataset = group.get(path)
    if not isinstance(dataset, h5py.Dataset) or dataset.shape != ():
        raise StoreError(f"it has no text '{path}'")
    return str(dataset.asstr()[()])


def _group(file: h5py.File, path: str) -> h5py.Group:
    group = file[path]
    if not isinstance(group, h5py.Group):
        raise StoreError(f"'{path}' is not a group")
    return group


def _words(group: h5py.Group, name: str) -> str:
    words = group.attrs.get(name)
    if not isinstance(words, str):
        raise StoreError(f"it has no attribute '{name}'")
    return words


def _seal(text: str, arrays: Mapping[str, np.ndarray]) -> str:
    seal = hashlib.sha256(text.encode("utf-8"))
    for name in sorted(arrays):
        array = arrays[name]
        seal.update(f"\0{name}\0{array.dtype.name}\0{array.shape}\0".encode())
        seal.update(np.ascontiguousarray(array).tobytes())
    return seal.hexdigest()
