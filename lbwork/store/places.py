"""Where the files of one run lie.

``<id>.h5``     the run file: header only while the run is unfinished, everything once it is
``<id>.parts/`` one small HDF5 file per finished record of an unfinished run; gone afterwards
``<id>.lock``   held by the process that writes the run
"""

from __future__ import annotations

import contextlib
import os
from dataclasses import dataclass
from pathlib import Path

from lbwork.store.schema import FAMILIES, SUFFIX

__all__ = ["Places"]


@dataclass(frozen=True)
class Places:
    """Paths of the run ``run_id`` in the run folder ``folder``."""

    folder: Path
    run_id: str

    @property
    def file(self) -> Path:
        """The run file."""
        return self.folder / (self.run_id + SUFFIX)

    @property
    def parts(self) -> Path:
        """The folder of finished records while the run is unfinished."""
        return self.folder / (self.run_id + ".parts")

    @property
    def lock(self) -> Path:
        """The file whose lock the writing process holds."""
        return self.folder / (self.run_id + ".lock")

    def part(self, family: str, name: str) -> Path:
        """The file of one finished record."""
        return self.parts / f"{family}-{name}{SUFFIX}"

    def part_names(self) -> dict[str, tuple[str, ...]]:
        """Names of the finished records per family, sorted; empty when there is no folder."""
        found: dict[str, list[str]] = {family: [] for family in FAMILIES}
        # The folder of a finished run vanishes, possibly under the eyes of a reader.
        with contextlib.suppress(FileNotFoundError):
            for entry in os.listdir(self.parts):
                family, _, name = entry.removesuffix(SUFFIX).partition("-")
                if entry.endswith(SUFFIX) and family in found and name:
                    found[family].append(name)
        return {family: tuple(sorted(names)) for family, names in found.items()}
