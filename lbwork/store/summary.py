"""One line per run, whatever state its file is in."""

from __future__ import annotations

import datetime
import os
from pathlib import Path

import h5py

from lbwork.errors import StoreError
from lbwork.store.content import read_listing
from lbwork.store.lock import is_held
from lbwork.store.migration import NewerRunError
from lbwork.store.opening import STORED_SCHEMA, DamagedRunError, opened
from lbwork.store.places import Places
from lbwork.store.records import RunSummary
from lbwork.store.schema import CLOSING_STATUSES, SCHEMA, SUFFIX

__all__ = ["all_summaries", "read_summary", "run_ids", "summary_or_damage", "utc_text"]

_PARTS = ".parts"


def read_summary(places: Places) -> RunSummary:
    """Summary of one run; raises DamagedRunError, NewerRunError or FileNotFoundError."""
    # Records first, file second: a run that ends in between is then seen as ended.
    parts = places.part_names()
    with opened(places.file) as file:
        return _summary(file, places, parts)


def summary_or_damage(places: Places) -> RunSummary:
    """Summary of one run that is never an error: the status says "damaged" or "newer"."""
    try:
        return read_summary(places)
    except NewerRunError as error:
        return RunSummary(places.run_id, places.file, "newer", str(error))
    except DamagedRunError as error:
        return RunSummary(places.run_id, places.file, "damaged", error.reason)
    except FileNotFoundError:
        reason = f"the run file is missing; finished records are in '{places.parts}'"
        return RunSummary(places.run_id, places.file, "damaged", reason)


def all_summaries(folder: Path) -> tuple[RunSummary, ...]:
    """Summaries of every run in a folder, oldest first, damaged ones included."""
    names = _entries(folder)
    runs = {name.removesuffix(SUFFIX) for name in names if name.endswith(SUFFIX)}
    orphans = {name.removesuffix(_PARTS) for name in names if name.endswith(_PARTS)} - runs
    found = [summary_or_damage(Places(folder, run_id)) for run_id in runs]
    for run_id in orphans:
        places = Places(folder, run_id)
        # Without records it is a run that is just being born, or that never was.
        if any(places.part_names().values()) and not places.file.exists():
            found.append(summary_or_damage(places))
    return tuple(sorted(found, key=lambda one: (one.created or _changed(one.path), one.run_id)))


def run_ids(folder: Path) -> tuple[str, ...]:
    """Ids of the runs in a folder, sorted; no file is opened."""
    names = _entries(folder)
    return tuple(sorted(name.removesuffix(SUFFIX) for name in names if name.endswith(SUFFIX)))


def utc_text(moment: datetime.datetime) -> str:
    """ISO 8601 text in UTC, to the second: 2025-01-31T12:00:00Z."""
    return moment.astimezone(datetime.UTC).strftime("%Y-%m-%dT%H:%M:%SZ")


def _entries(folder: Path) -> list[str]:
    try:
        return [name for name in os.listdir(folder) if not name.startswith(".")]
    except OSError as error:
        raise StoreError(
            f"cannot list run folder '{folder}' ({error.strerror}); name one that exists"
        ) from error


def _summary(file: h5py.File, places: Places, parts: dict[str, tuple[str, ...]]) -> RunSummary:
    listing = read_listing(file)
    if listing["status"] not in CLOSING_STATUSES:
        listing |= {
            "status": _open_status(places),
            "sectors_done": len(parts["sectors"]),
            "results": parts["results"],
        }
    schema = int(file.attrs.get(STORED_SCHEMA, SCHEMA))
    return RunSummary(run_id=places.run_id, path=places.file, schema=schema, **listing)


def _open_status(places: Places) -> str:
    return "running" if is_held(places.lock) else "unfinished"


def _changed(path: Path) -> str:
    try:
        changed = path.stat().st_mtime
    except OSError:
        return ""
    return utc_text(datetime.datetime.fromtimestamp(changed, datetime.UTC))
