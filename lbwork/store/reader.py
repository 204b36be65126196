"""A kept run, read-only, finished or not.

Nothing stays open between calls, so a reader never stands in the way of a writer, and a run that
ends while it is read is followed into its final file.
"""

from __future__ import annotations

import contextlib
import difflib
from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np

from lbwork.errors import StoreError
from lbwork.store.content import check_listing, is_complete, read_header, read_record
from lbwork.store.document import read_document
from lbwork.store.opening import opened
from lbwork.store.places import Places
from lbwork.store.records import Record, RunHeader, RunSummary, planned_indices
from lbwork.store.schema import sector_name
from lbwork.store.summary import read_summary

__all__ = ["RunFile", "read_stored_record"]


class RunFile:
    """One run: header and summary at construction, records when asked for.

    Raises DamagedRunError or NewerRunError when the file cannot be read. Every record is checked
    against its SHA-256 as it is read.
    """

    def __init__(self, places: Places) -> None:
        self._places = places
        self._summary = read_summary(places)
        with opened(places.file) as file:
            check_listing(file)
            self._header = read_header(file)

    def __repr__(self) -> str:
        return f"RunFile({self.run_id!r}, {self._summary.status})"

    @property
    def run_id(self) -> str:
        """Name of the run: the name of its file without ``.h5``."""
        return self._places.run_id

    @property
    def summary(self) -> RunSummary:
        """Summary at the moment of opening."""
        return self._summary

    @property
    def header(self) -> RunHeader:
        """Everything known before the run started."""
        return self._header

    @property
    def model_toml(self) -> str:
        """Source text of the model, TOML."""
        return self._header.model_toml

    @property
    def canonical_json(self) -> str:
        """Canonical form of the model, whose SHA-256 is its identity."""
        return self._header.canonical_json

    @property
    def options(self) -> Any:
        """Options of the run."""
        return read_document(self._header.options_text, "the options")

    @property
    def plan(self) -> Any:
        """Sectors that the run set out to compute."""
        return self._header.plan

    @property
    def provenance(self) -> Any:
        """Versions, machine and thread settings of the program that created the run."""
        return read_document(self._header.provenance_text, "the provenance")

    def missing_sectors(self) -> tuple[int, ...]:
        """Planned sector indices that are not finished."""
        done = {int(name) for name in self._names("sectors")}
        return tuple(index for index in planned_indices(self.plan) if index not in done)

    def sectors(self) -> Iterator[tuple[int, dict[str, Any], Mapping[str, np.ndarray]]]:
        """Finished sectors by increasing index: (index, metadata, arrays)."""
        for record in self._records("sectors"):
            yield int(record.name), record.document, record.arrays

    def sector(self, index: int) -> Record:
        """One finished sector; StoreError when it is not there."""
        return self._record("sectors", sector_name(index))

    def results(self) -> tuple[str, ...]:
        """Names of the results."""
        return self._names("results")

    def result(self, name: str) -> Record:
        """One named result; StoreError with the nearest names when it is not there."""
        return self._record("results", name)

    def figures(self) -> tuple[str, ...]:
        """Names of the figures."""
        return self._names("figures")

    def figure(self, name: str) -> bytes:
        """The file of one figure."""
        return self._record("figures", name).arrays["bytes"].tobytes()

    def resumptions(self) -> tuple[Record, ...]:
        """One record, with its own provenance, for each time the run was taken up again."""
        return tuple(self._records("resumptions"))

    def verify(self) -> int:
        """Read every record against its SHA-256; returns their number, raises on damage."""
        families = ("sectors", "results", "figures", "resumptions")
        return sum(1 for family in families for _ in self._records(family))

    def _names(self, family: str) -> tuple[str, ...]:
        parts = self._places.part_names()[family]
        with opened(self._places.file) as file:
            return tuple(sorted(file[family])) if is_complete(file.get("completion")) else parts

    def _records(self, family: str) -> Iterator[Record]:
        parts = self._places.part_names()[family]
        with opened(self._places.file) as file:
            ended = is_complete(file.get("completion"))
            if ended:
                for name in sorted(file[family]):
                    yield read_record(file, family, name)
        if not ended:
            for name in parts:
                yield read_stored_record(self._places, family, name)

    def _record(self, family: str, name: str) -> Record:
        names = self._names(family)
        if name not in names:
            raise StoreError(_absent(self.run_id, family, name, names))
        return read_stored_record(self._places, family, name)


def read_stored_record(places: Places, family: str, name: str) -> Record:
    """One record from its part or, when the run has ended meanwhile, from the run file."""
    with contextlib.suppress(FileNotFoundError), opened(places.part(family, name)) as file:
        return read_record(file, family, name)
    with opened(places.file) as file:
        return read_record(file, family, name)


def _absent(run_id: str, family: str, name: str, names: tuple[str, ...]) -> str:
    shown = difflib.get_close_matches(name, names, n=3, cutoff=0.0) or ["none"]
    return f"run '{run_id}' has no {family[:-1]} '{name}'; nearest: {', '.join(shown)}"
