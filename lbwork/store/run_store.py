"""The run folder: create, open, resume, list and find runs."""

from __future__ import annotations

import contextlib
import datetime
import difflib
import io
import itertools
import os
import re
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np

from lbwork.errors import StoreError
from lbwork.provenance import provenance
from lbwork.store.content import check_listing, read_header, write_header
from lbwork.store.document import document_text, read_document
from lbwork.store.durable import in_memory, make_folder, replace_file
from lbwork.store.housekeeping import sound_records, sweep
from lbwork.store.lock import LockedRunError, RunLock
from lbwork.store.migration import migrate
from lbwork.store.opening import DamagedRunError, damage_named, opened
from lbwork.store.places import Places
from lbwork.store.reader import RunFile
from lbwork.store.records import RunHeader, RunSummary, planned_indices
from lbwork.store.schema import CLOSING_STATUSES, SUFFIX, checked_kind, checked_text, file_words
from lbwork.store.summary import all_summaries, read_summary, run_ids, utc_text
from lbwork.store.writer import RunWriter
from lbwork.version import __version__

__all__ = ["RunStore"]

Plan = Sequence[Any] | Mapping[str, Any]

_IDENTITY = re.compile(r"[0-9a-f]{64}")


class RunStore:
    """The runs kept in one folder, one HDF5 file each.

    Nothing is touched at construction. Writing creates the folder when its parent exists; reading
    never creates or changes anything.
    """

    def __init__(self, folder: str | os.PathLike[str]) -> None:
        self.folder = Path(folder)

    def __repr__(self) -> str:
        return f"RunStore({str(self.folder)!r})"

    def create(
        self,
        kind: str,
        *,
        model_name: str,
        model_toml: str,
        canonical_json: str,
        identity: str,
        options: Mapping[str, Any],
        plan: Plan,
        seed: int | None = None,
    ) -> RunWriter:
        """Start a run and return its writer, which holds the lock of the run.

        kind: spectrum, levels, gap, steady, audit, ...; identity: the model's SHA-256, 64 hex
        digits; plan: the sectors that *this run* sets out to write (list, or dict with "sectors"),
        empty when it writes results only. Raises StoreError when the folder cannot be written or an
        argument cannot be kept.
        """
        if not _IDENTITY.fullmatch(identity):
            raise StoreError(f"model identity '{identity}' is not 64 hexadecimal digits")
        whole_seed = _checked_seed(seed)
        make_folder(self.folder)
        sweep(self.folder)
        now = utc_text(datetime.datetime.now(datetime.UTC))
        moment = now.replace("-", "").replace(":", "")
        stem = f"{checked_kind(kind)}-{file_words(model_name)}-{identity[:8]}-{moment}"
        plan_text = document_text(plan, "plan")
        planned_indices(read_document(plan_text))
        fields = {
            "kind": kind,
            "created": now,
            "version": __version__,
            "model_name": checked_text(model_name, "the model name"),
            "model_toml": checked_text(model_toml, "the model file"),
            "canonical_json": checked_text(canonical_json, "the canonical model"),
            "identity": identity,
            "options_text": document_text(options, "options"),
            "plan_text": plan_text,
            "provenance_text": document_text(provenance(), "provenance"),
        }
        places, lock = self._new_place(stem)
        try:
            header = RunHeader(run_id=places.run_id, seed=whole_seed, **fields)
            make_folder(places.parts)
            content = io.BytesIO()
            with in_memory(content) as file:
                write_header(file, header)
            replace_file(places.file, content.getvalue(), places.parts)
        except BaseException:
            lock.release()
            raise
        return RunWriter(places, lock, header, {})

    def open(self, run_id: str) -> RunFile:
        """Open a run read-only, finished or not, by its id or the beginning of it."""
        return RunFile(Places(self.folder, self.find(run_id)))

    def resume(self, run_id: str) -> RunWriter:
        """Take up an unfinished run, to the same plan: finished sectors are not computed again.

        Every finished record is read and checked; a damaged one is set aside and counts as not
        finished. Raises StoreError when the run has ended, is being written or is damaged.
        """
        places = Places(self.folder, self.find(run_id))
        lock = RunLock(places.lock, places.run_id)
        try:
            header = self._header(places)
            if read_summary(places).status in CLOSING_STATUSES:
                raise StoreError(f"run '{places.run_id}' has ended; start a new one")
            make_folder(places.parts)
            writer = RunWriter(places, lock, header, sound_records(places))
            writer.write_resumption(provenance())
        except BaseException:
            lock.release()
            raise
        return writer

    def find_resumable(
        self,
        kind: str,
        *,
        identity: str,
        options: Mapping[str, Any],
        plan: Plan,
        seed: int | None = None,
    ) -> str | None:
        """Id of the newest unfinished run of this very task that no process is writing, or None.

        The task is the same when kind, model identity, options, plan and seed all are.
        """
        if not self.folder.is_dir():
            return None
        task = (identity, document_text(options, "options"), document_text(plan, "plan"), seed)
        for summary in reversed(self.list()):
            if (summary.status, summary.kind, summary.identity) == ("unfinished", kind, identity):
                with contextlib.suppress(DamagedRunError, FileNotFoundError):
                    header = self._header(Places(self.folder, summary.run_id))
                    found = (header.identity, header.options_text, header.plan_text, header.seed)
                    if found == task:
                        return summary.run_id
        return None

    def list(self) -> tuple[RunSummary, ...]:
        """All runs, oldest first; damaged ones are listed with the reason, never raised.

        Raises StoreError only when the folder itself cannot be read.
        """
        return all_summaries(self.folder)

    def find(self, run_id: str) -> str:
        """The full id of the one run whose id begins with ``run_id``.

        Raises StoreError with the nearest ids when there is none, with the candidates when there
        are several.
        """
        wanted = run_id.removesuffix(SUFFIX)
        ids = run_ids(self.folder)
        if wanted in ids:
            return wanted
        matches = [one for one in ids if wanted and one.startswith(wanted)]
        if len(matches) == 1:
            return matches[0]
        if matches:
            shown = ", ".join(matches[:5]) + (", ..." if len(matches) > 5 else "")
            raise StoreError(f"'{run_id}' fits {len(matches)} runs, write more of it: {shown}")
        nearest = difflib.get_close_matches(wanted, ids, n=3, cutoff=0.3)
        hint = f"nearest: {', '.join(nearest)}" if nearest else f"it holds {len(ids)} runs"
        raise StoreError(f"no run '{run_id}' in run folder '{self.folder}'; {hint}")

    def upgrade(self, run_id: str) -> tuple[str, ...]:
        """Rewrite a run file of an older schema at the current one; returns the steps taken.

        Never needed for reading, which migrates in memory; it saves doing so each time.
        """
        places = Places(self.folder, self.find(run_id))
        lock = RunLock(places.lock, places.run_id)
        try:
            with damage_named(places.file):
                content = io.BytesIO(places.file.read_bytes())
                with in_memory(content) as file:
                    steps = migrate(file)
            if steps:
                replace_file(places.file, content.getvalue(), self.folder)
        finally:
            lock.release()
        return steps

    def _header(self, places: Places) -> RunHeader:
        with opened(places.file) as file:
            check_listing(file)
            return read_header(file)

    def _new_place(self, stem: str) -> tuple[Places, RunLock]:
        for count in itertools.count(1):
            places = Places(self.folder, stem if count == 1 else f"{stem}-{count}")
            if places.file.exists() or places.parts.exists():
                continue
            with contextlib.suppress(LockedRunError):
                lock = RunLock(places.lock, places.run_id)
                # Somebody may have had the lock, written a run and gone in the meantime.
                if not places.file.exists() and not places.parts.exists():
                    return places, lock
                lock.release()
        raise StoreError(f"no free name for run '{stem}' in '{self.folder}'")


def _checked_seed(seed: object) -> int | None:
    if seed is None:
        return None
    if isinstance(seed, bool) or not isinstance(seed, int | np.integer):
        raise StoreError(f"seed {seed!r} is not a whole number; pass one, or None")
    return int(seed)
