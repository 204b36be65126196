"""What the store hands out: frozen records of plain content."""

from __future__ import annotations

import hashlib
from collections import Counter
from collections.abc import Mapping
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

import numpy as np

from lbwork.errors import StoreError
from lbwork.store.document import document_text, read_document
from lbwork.store.schema import sector_name

__all__ = ["Record", "RunHeader", "RunSummary", "planned_indices"]


@dataclass(frozen=True)
class Record:
    """One sector, result, figure or resumption: a JSON document and named arrays.

    elapsed: seconds of work on the run when the record was finished, earlier stretches of
        a resumed run included.
    peak_memory: largest resident size of the writing processes until then, bytes.
    """

    name: str
    document: dict[str, Any]
    arrays: Mapping[str, np.ndarray]
    elapsed: float = 0.0
    peak_memory: int = 0


@dataclass(frozen=True)
class RunHeader:
    """What is known of a run before it starts: it never changes afterwards.

    created: UTC, ISO 8601 with seconds. seed: None when nothing random is used.
    options_text, plan_text, provenance_text: canonical JSON texts.
    """

    run_id: str
    kind: str
    created: str
    version: str
    model_name: str
    model_toml: str
    canonical_json: str
    identity: str
    options_text: str
    plan_text: str
    provenance_text: str
    seed: int | None

    def texts(self) -> dict[str, str]:
        """The fields that go into datasets, by their path in the run file."""
        return {
            "model/name": self.model_name,
            "model/toml": self.model_toml,
            "model/canonical_json": self.canonical_json,
            "model/identity": self.identity,
            "options/json": self.options_text,
            "plan/json": self.plan_text,
            "provenance/json": self.provenance_text,
        }

    @property
    def plan(self) -> Any:
        """The plan as a document."""
        return read_document(self.plan_text, "the plan")

    def seal(self) -> str:
        """SHA-256 over every field, hex: tells a header that was damaged or edited."""
        text = document_text(asdict(self), "the run header")
        return hashlib.sha256(text.encode("utf-8")).hexdigest()


@dataclass(frozen=True)
class RunSummary:
    """One line of the list of runs.

    status: "complete", "uncertified" or "failed" for ended runs; "running" while a process writes
    it; "unfinished" when it can be resumed; "newer" when it needs a later lbwork; "damaged".
    reason: why it is damaged or newer, else empty. Fields that could not be read are empty or zero.
    schema is the number on the disk, wall_time in seconds, peak_memory in bytes, created and
    finished in UTC (ISO 8601).
    """

    run_id: str
    path: Path
    status: str
    reason: str = ""
    kind: str = ""
    created: str = ""
    finished: str = ""
    version: str = ""
    schema: int = 0
    model_name: str = ""
    identity: str = ""
    seed: int | None = None
    sectors_done: int = 0
    sectors_planned: int = 0
    results: tuple[str, ...] = ()
    wall_time: float = 0.0
    peak_memory: int = 0

    @property
    def readable(self) -> bool:
        """Whether the run can be opened."""
        return self.status not in ("damaged", "newer")

    def to_dict(self) -> dict[str, Any]:
        """All fields as a JSON document."""
        return asdict(self) | {"path": str(self.path), "results": list(self.results)}


def planned_indices(plan: Any) -> tuple[int, ...]:
    """Sector indices (0-based) that a plan asks for, in its order.

    A plan is a list of sectors or a dict with such a list under "sectors"; a sector that is a dict
    with an integer "index" has this index, any other counts by its place. Raises StoreError when a
    sector is planned twice or its index is out of range.
    """
    sectors = plan.get("sectors", []) if isinstance(plan, dict) else plan
    if not isinstance(sectors, list):
        raise StoreError(
            f"the plan is a {type(sectors).__name__}; pass a list of sectors, or a dict with it"
        )
    indices = []
    for place, sector in enumerate(sectors):
        index = sector.get("index") if isinstance(sector, dict) else None
        indices.append(index if isinstance(index, int) else place)
    for index in indices:
        sector_name(index)
    index, times = Counter(indices).most_common(1)[0] if indices else (0, 0)
    if times > 1:
        raise StoreError(f"the plan names sector {index} {times} times; name each sector once")
    return tuple(indices)
