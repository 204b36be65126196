"""Clearing away what killed processes leave behind; evidence is never touched.

Removed are temporary files, the parts of a run that have been folded into its file, and the traces
of a run that was never born (no run file, no finished record). A damaged record is renamed to
``*.damaged`` and stays.
"""

from __future__ import annotations

import contextlib
import os
from pathlib import Path

import h5py

from lbwork.errors import StoreError
from lbwork.store.content import is_complete, read_record
from lbwork.store.durable import TEMPORARY
from lbwork.store.lock import RunLock, is_held
from lbwork.store.opening import DamagedRunError, opened
from lbwork.store.places import Places
from lbwork.store.records import Record

__all__ = ["remove_parts", "sound_records", "sweep"]


def sweep(folder: Path) -> None:
    """Clear the leftovers of all runs in a folder that no process is writing."""
    for entry in sorted(folder.iterdir()):
        if entry.suffix in (".parts", ".lock"):
            places = Places(folder, entry.stem)
            if not is_held(places.lock):
                # Another's run in a shared folder is not ours to clear; that stops nobody.
                with contextlib.suppress(OSError):
                    _clear(places)


def sound_records(places: Places) -> dict[str, tuple[Record, ...]]:
    """Finished records of an unfinished run, each checked; damaged ones are renamed aside.

    To be called by the holder of the lock. Arrays are dropped, to keep memory for the next sector.
    """
    _remove_temporaries(places)
    sound: dict[str, tuple[Record, ...]] = {}
    for family, names in places.part_names().items():
        records = []
        for name in names:
            part = places.part(family, name)
            try:
                with opened(part) as file:
                    whole = read_record(file, family, name)
            except DamagedRunError:
                os.replace(part, part.with_name(part.name + ".damaged"))
                continue
            records.append(Record(name, {}, {}, whole.elapsed, whole.peak_memory))
        sound[family] = tuple(records)
    return sound


def remove_parts(places: Places) -> None:
    """Remove the folded records of an ended run; damaged ones keep the folder in place."""
    _remove_temporaries(places)
    for family, names in places.part_names().items():
        for name in names:
            places.part(family, name).unlink(missing_ok=True)
    with contextlib.suppress(OSError):
        places.parts.rmdir()


def _clear(places: Places) -> None:
    lock = RunLock(places.lock, places.run_id)
    try:
        places.file.with_name(places.file.name + TEMPORARY).unlink(missing_ok=True)
        if places.parts.is_dir() and (_ended(places) or _never_born(places)):
            remove_parts(places)
    finally:
        lock.release()


def _ended(places: Places) -> bool:
    try:
        with opened(places.file) as file:
            return is_complete(file.get("completion")) and _holds_all(file, places)
    except (StoreError, FileNotFoundError):
        return False


def _holds_all(file: h5py.File, places: Places) -> bool:
    wanted = places.part_names().items()
    return all(name in file[family] for family, names in wanted for name in names)


def _never_born(places: Places) -> bool:
    return not places.file.exists() and not any(places.part_names().values())


def _remove_temporaries(places: Places) -> None:
    for leftover in places.parts.glob("*" + TEMPORARY):
        leftover.unlink(missing_ok=True)
