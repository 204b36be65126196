"""What a full sector spectrum costs, known before it starts.

Peak memory is two complex triangles beside the chunk of vectors; time follows the cube of the
dimension with constants measured on one core (:mod:`lbwork.defaults`). Both are upper bounds: a
block that falls into irreducible parts is cheaper.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from lbwork import defaults
from lbwork.errors import CapacityError
from lbwork.provenance import usable_memory
from lbwork.symmetry import SectorPlan

__all__ = ["SectorCost", "cost_estimate", "dense_memory", "require_memory"]


@dataclass(frozen=True)
class SectorCost:
    """Estimated peak memory in bytes and time in seconds of one sector on one core."""

    label: str
    dimension: int
    multiplicity: int
    real_matrix: bool
    memory_bytes: int
    seconds: float

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of all fields."""
        return {
            "label": self.label,
            "dimension": self.dimension,
            "multiplicity": self.multiplicity,
            "real_matrix": self.real_matrix,
            "memory_bytes": self.memory_bytes,
            "seconds": self.seconds,
        }


def dense_memory(dimension: int, real: bool) -> int:
    """Peak bytes of :func:`lbwork.spectrum.dense.dense_levels` for one part of this size."""
    entries = defaults.DENSE_BYTES_REAL if real else defaults.DENSE_BYTES_COMPLEX
    return entries * dimension**2 + defaults.DENSE_BYTES_LINEAR * dimension


def cost_estimate(plan: SectorPlan) -> tuple[SectorCost, ...]:
    """The cost of each sector of a plan, in its order."""
    return tuple(
        SectorCost(
            label=sector.label,
            dimension=sector.dimension,
            multiplicity=sector.multiplicity,
            real_matrix=sector.self_conjugate,
            memory_bytes=dense_memory(sector.dimension, sector.self_conjugate),
            seconds=sector.dimension**3
            * (
                defaults.DENSE_SECONDS_REAL
                if sector.self_conjugate
                else defaults.DENSE_SECONDS_COMPLEX
            ),
        )
        for sector in plan.sectors
    )


def require_memory(dimension: int, real: bool, label: str) -> None:
    """Raise CapacityError when a dense part of this size does not fit in memory."""
    needed, usable = dense_memory(dimension, real), usable_memory()
    if needed > usable:
        raise CapacityError(
            f"sector '{label}': a dense part of size {dimension} needs {needed / 1e9:.1f} GB, "
            f"{usable / 1e9:.1f} GB can be used; use fewer sites or a smaller sector"
        )
