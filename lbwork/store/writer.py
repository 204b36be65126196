"""Writing one run: header first, every record safe on the disk as soon as it is finished.

While a run is unfinished its file ``<id>.h5`` holds the header only, and each finished record is a
small HDF5 file of its own in ``<id>.parts/``, under the group path that it will have in the end;
finishing folds them into the run file in one step and removes the folder. Every file appears by
renaming a complete, forced temporary, so that a kill -9 at any moment loses at most the record in
hand and never leaves a file that cannot be read, and the cost of a record does not grow with the
run. Copying the whole run file for each record would be as safe, at quadratic cost; appending to
one HDF5 file would not be safe at all.
"""

from __future__ import annotations

import datetime
import io
import time
from collections.abc import Mapping
from types import TracebackType
from typing import Any, Self

import h5py
import numpy as np

from lbwork.errors import StoreError
from lbwork.provenance import peak_memory
from lbwork.store.arrays import checked_array
from lbwork.store.content import read_record, stamp, write_completion, write_header, write_record
from lbwork.store.document import read_document, to_jsonable
from lbwork.store.durable import in_memory, replace_file
from lbwork.store.housekeeping import remove_parts
from lbwork.store.lock import RunLock
from lbwork.store.opening import opened
from lbwork.store.places import Places
from lbwork.store.reader import read_stored_record
from lbwork.store.records import Record, RunHeader, RunSummary, planned_indices
from lbwork.store.schema import CLOSING_STATUSES, DOCUMENT, FAMILIES, checked_name, sector_name
from lbwork.store.summary import read_summary, utc_text

__all__ = ["RunWriter"]


class RunWriter:
    """The one writer of a run, from :class:`~lbwork.store.RunStore`; holds the lock of the run.

    As a context manager it finishes the run as "complete" when the block ends, and leaves it
    unfinished, to be resumed, when the block raises or has called :meth:`close`.
    """

    def __init__(
        self,
        places: Places,
        lock: RunLock,
        header: RunHeader,
        finished: Mapping[str, tuple[Record, ...]],
    ) -> None:
        self._places = places
        self._lock = lock
        self._header = header
        self._planned = planned_indices(header.plan)
        self._names = {
            family: {one.name for one in finished.get(family, ())} for family in FAMILIES
        }
        earlier = [record for records in finished.values() for record in records]
        self._elapsed_before = max((record.elapsed for record in earlier), default=0.0)
        self._peak_before = max((record.peak_memory for record in earlier), default=0)
        self._started = time.monotonic()

    def __repr__(self) -> str:
        return f"RunWriter({self.run_id!r}, {len(self._names['sectors'])}/{len(self._planned)})"

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        try:
            if kind is None and self._lock.held:
                self.finish()
        finally:
            self.close()

    @property
    def run_id(self) -> str:
        """Name of the run: the name of its file without ``.h5``."""
        return self._places.run_id

    @property
    def header(self) -> RunHeader:
        """Everything known before the run started; model, options and plan of a resumed run."""
        return self._header

    @property
    def options(self) -> Any:
        """Options of the run."""
        return read_document(self._header.options_text, "the options")

    @property
    def plan(self) -> Any:
        """Plan of the run."""
        return self._header.plan

    def finished_sectors(self) -> tuple[int, ...]:
        """Indices of the sectors that need not be computed again, increasing."""
        return tuple(sorted(int(name) for name in self._names["sectors"]))

    def missing_sectors(self) -> tuple[int, ...]:
        """Planned indices that are still to be computed, in the order of the plan."""
        done = set(self.finished_sectors())
        return tuple(index for index in self._planned if index not in done)

    def finished_results(self) -> tuple[str, ...]:
        """Names of the results that are on the disk, sorted."""
        return tuple(sorted(self._names["results"]))

    def read_sector(self, index: int) -> Record:
        """A finished sector, bit by bit as it was written; StoreError when it is not finished."""
        return self._read("sectors", sector_name(index))

    def read_result(self, name: str) -> Record:
        """A finished result; StoreError when it is not finished."""
        return self._read("results", name)

    def write_sector(
        self, index: int, metadata: Mapping[str, Any], arrays: Mapping[str, Any]
    ) -> None:
        """Keep one finished sector; when this returns it is safe on the disk.

        metadata: JSON-able; arrays: at least ``eigenvalues`` (n,) complex and finite for a
        spectrum; ``error_bounds`` (n,) and ``parts`` (sizes that add up to n) are checked against
        it where present. Raises StoreError for a sector that is not planned, or that is finished
        already: evidence is not overwritten.
        """
        name = sector_name(index)
        if index not in self._planned:
            raise StoreError(
                f"sector {index} is not in the plan of run '{self.run_id}' "
                f"({len(self._planned)} sectors); start a run with this sector in its plan"
            )
        if name in self._names["sectors"]:
            raise StoreError(f"sector {index} of run '{self.run_id}' is finished already")
        _check_levels(arrays, index)
        self._write("sectors", name, metadata, arrays)

    def write_result(
        self, name: str, document: Any, arrays: Mapping[str, Any] | None = None
    ) -> None:
        """Keep a named result; one of the same name is replaced, as a resumed run may redo it."""
        self._write("results", checked_name(name), document, arrays or {})

    def attach_figure(self, name: str, content: bytes) -> None:
        """Keep the file of a figure; ``name`` with its suffix, such as ``spectrum.pdf``."""
        pixels = np.frombuffer(content, dtype=np.uint8)
        self._write(
            "figures", checked_name(name, "figure"), {"bytes": len(content)}, {"bytes": pixels}
        )

    def write_resumption(self, provenance: Mapping[str, Any]) -> None:
        """Note that the run was taken up again, and by which versions on which machine."""
        last = max((int(name) for name in self._names["resumptions"]), default=1)
        self._write("resumptions", f"{last + 1:03d}", provenance, {})

    def finish(self, status: str = "complete") -> RunSummary:
        """Fold everything into the one run file, release the lock and return the summary.

        status: "complete", "uncertified" or "failed". "complete" is refused while planned sectors
        are missing, or when nothing at all was kept.
        """
        self._check_held()
        if status not in CLOSING_STATUSES:
            raise StoreError(f"status '{status}' is unknown; use {', '.join(CLOSING_STATUSES)}")
        if status == "complete":
            self._check_complete()
        replace_file(self._places.file, self._folded(status), self._places.parts)
        remove_parts(self._places)
        self.close()
        return read_summary(self._places)

    def close(self) -> None:
        """Release the lock and leave the run as it is; may be called twice."""
        self._lock.release()

    def _write(self, family: str, name: str, document: Any, arrays: Mapping[str, Any]) -> None:
        self._check_held()
        place = f"{family}/{name}"
        if not isinstance(document, Mapping) and not hasattr(document, "to_dict"):
            raise StoreError(f"the document of {place} is a {type(document).__name__}; pass a dict")
        for key in arrays:
            if checked_name(key, "array") == DOCUMENT:
                raise StoreError(f"an array of {place} is named '{DOCUMENT}'; choose another name")
        record = Record(
            name=name,
            document=to_jsonable(document, place),
            arrays={key: checked_array(array, f"{place}/{key}") for key, array in arrays.items()},
            elapsed=self._elapsed(),
            peak_memory=self._peak(),
        )
        content = io.BytesIO()
        with in_memory(content) as file:
            stamp(file, self._header)
            write_record(file, family, record)
        replace_file(self._places.part(family, name), content.getvalue(), self._places.parts)
        self._names[family].add(name)

    def _read(self, family: str, name: str) -> Record:
        if name not in self._names[family]:
            raise StoreError(f"run '{self.run_id}' has no finished {family[:-1]} '{name}'")
        return read_stored_record(self._places, family, name)

    def _folded(self, status: str) -> bytes:
        content = io.BytesIO()
        with in_memory(content) as file:
            write_header(file, self._header)
            for family, names in self._names.items():
                for name in sorted(names):
                    self._fold(family, name, file)
                    read_record(file, family, name)
            write_completion(
                file,
                status=status,
                finished=utc_text(datetime.datetime.now(datetime.UTC)),
                wall_time=self._elapsed(),
                peak_memory=self._peak(),
            )
        return content.getvalue()

    def _fold(self, family: str, name: str, file: h5py.File) -> None:
        part = self._places.part(family, name)
        try:
            with opened(part) as finished:
                finished.copy(finished[family][name], file[family], name)
        except FileNotFoundError:
            raise StoreError(
                f"'{part}' has vanished; resume run '{self.run_id}' to compute it again"
            ) from None

    def _check_held(self) -> None:
        if not self._lock.held:
            raise StoreError(f"run '{self.run_id}' is closed; resume it to write more")

    def _check_complete(self) -> None:
        missing = self.missing_sectors()
        if missing:
            raise StoreError(
                f"run '{self.run_id}' is not complete: sector {missing[0]} and {len(missing) - 1} "
                f"more of {len(self._planned)} are missing; compute them, or plan fewer"
            )
        if not self._names["sectors"] and not self._names["results"]:
            raise StoreError(f"run '{self.run_id}' holds neither sectors nor results; write some")

    def _elapsed(self) -> float:
        return self._elapsed_before + time.monotonic() - self._started

    def _peak(self) -> int:
        return max(self._peak_before, peak_memory())


def _check_levels(arrays: Mapping[str, Any], index: int) -> None:
    if "eigenvalues" not in arrays:
        return
    levels = np.asarray(arrays["eigenvalues"])
    if levels.ndim != 1 or levels.dtype.kind != "c":
        raise StoreError(
            f"eigenvalues of sector {index} are {levels.dtype} {levels.shape}; pass complex (n,)"
        )
    wrong = np.flatnonzero(~np.isfinite(levels))
    if wrong.size:
        raise StoreError(f"eigenvalue {wrong[0] + 1} of sector {index} is {levels[wrong[0]]}")
    bounds = arrays.get("error_bounds")
    if bounds is not None and np.shape(bounds) != levels.shape:
        raise StoreError(
            f"sector {index} has {levels.size} eigenvalues but error bounds {np.shape(bounds)}"
        )
    parts = arrays.get("parts")
    if parts is not None and int(np.sum(parts)) != levels.size:
        raise StoreError(
            f"parts of sector {index} add up to {int(np.sum(parts))}, not to its "
            f"{levels.size} eigenvalues"
        )
