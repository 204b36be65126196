"""What a model is and what it will cost, before anything long is started."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from lbwork.generator import GeneratorCertificate, Lindbladian
from lbwork.model import Model
from lbwork.provenance import usable_memory
from lbwork.spectrum import SectorCost, cost_estimate, gap_cost
from lbwork.steady import steady_cost
from lbwork.symmetry import SectorPlan, plan_sectors

__all__ = ["Inspection", "TaskCost", "inspect_model"]


@dataclass(frozen=True)
class TaskCost:
    """Estimated time in seconds and peak memory in bytes of a task, and whether it fits.

    ``seconds`` is infinite for tasks that are too large to be estimated.
    """

    task: str
    seconds: float
    memory_bytes: int
    fits: bool

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of the four fields."""
        return {
            "task": self.task,
            "seconds": self.seconds if math.isfinite(self.seconds) else None,
            "memory_bytes": self.memory_bytes,
            "fits": self.fits,
        }


@dataclass(frozen=True, eq=False)
class Inspection:
    """A model with its generator certificate, sector plan and costs per sector and per task."""

    model: Model
    certificate: GeneratorCertificate
    plan: SectorPlan
    sector_costs: tuple[SectorCost, ...]
    tasks: tuple[TaskCost, ...]

    def to_dict(self) -> dict[str, Any]:
        """A JSON document: model, certificate, symmetries, sectors with their costs, tasks."""
        sectors = [
            {
                **sector.to_dict(),
                "memory_bytes": cost.memory_bytes,
                "seconds": cost.seconds,
            }
            for sector, cost in zip(self.plan.sectors, self.sector_costs, strict=True)
        ]
        return {
            "name": self.model.name,
            "identity": self.model.identity,
            "sites": self.model.sites,
            "local_dimension": self.model.local_dimension,
            "boundary": self.model.boundary,
            "parameters": {
                key: str(value) if isinstance(value, complex) else value
                for key, value in self.model.parameters.items()
            },
            "generator": self.certificate.to_dict(),
            "total_dimension": self.plan.total_dimension,
            "symmetries": self.plan.symmetries.to_dict(),
            "sectors": sectors,
            "tasks": [task.to_dict() for task in self.tasks],
        }


def _tasks(model: Model, plan: SectorPlan, costs: tuple[SectorCost, ...]) -> tuple[TaskCost, ...]:
    usable = usable_memory()
    largest = max(cost.memory_bytes for cost in costs)
    total = sum(cost.seconds for cost in costs)
    dimension = model.local_dimension**model.sites
    density = 16 * 6 * dimension**2
    spectrum = TaskCost("spectrum", total, largest, largest <= usable)
    gap = gap_cost(model, None, plan.symmetries)
    steady = steady_cost(model, plan.symmetries)
    audit = TaskCost("audit", 1.5 * total + 5, largest + density, largest + density <= usable)
    return (
        spectrum,
        TaskCost("gap", gap.seconds, gap.memory_bytes, gap.fits),
        TaskCost("steady", steady.seconds, steady.memory_bytes, steady.fits),
        audit,
    )


def inspect_model(model: Model) -> Inspection:
    """Check a model's generator, find its symmetries, list its sectors and estimate costs."""
    certificate = Lindbladian(model).certificate()
    plan = plan_sectors(model)
    costs = cost_estimate(plan)
    return Inspection(model, certificate, plan, costs, _tasks(model, plan, costs))
