"""Memory and time of a gap, said before it is sought."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork import defaults
from lbwork.errors import CapacityError
from lbwork.iterative import chain_equations, iteration_cost, whole_space
from lbwork.model import Model
from lbwork.provenance import usable_memory
from lbwork.spectrum.cost import cost_estimate
from lbwork.spectrum.options import GapOptions, gap_method
from lbwork.symmetry import SymmetryReport, plan_sectors

__all__ = ["GapCost", "gap_cost"]


@dataclass(frozen=True)
class GapCost:
    """``memory_bytes``: peak of the process; ``seconds``; ``method``: the one that will be used."""

    memory_bytes: int
    seconds: float
    method: str
    fits: bool

    def require_fit(self, sites: int) -> None:
        """Raise CapacityError when the task does not fit in memory."""
        if not self.fits:
            raise CapacityError(
                f"the gap of {sites} sites needs about {self.memory_bytes / 2**30:.1f} GiB, "
                f"{usable_memory() / 2**30:.1f} GiB can be used; use fewer sites"
            )


def _exhaustive(model: Model, options: GapOptions) -> tuple[int, float]:
    """Bytes and seconds of searching every sector: dense up to a size, a Krylov search beyond."""
    plan = plan_sectors(model)
    seconds, largest = defaults.PLAN_SECONDS, 0
    for sector, cost in zip(plan.sectors, cost_estimate(plan), strict=True):
        dense = sector.dimension <= options.dense_dimension
        seconds += defaults.SECTOR_SECONDS
        seconds += cost.seconds if dense else defaults.SEARCH_SECONDS * sector.dimension
        bytes_needed = cost.memory_bytes if dense else defaults.SEARCH_BYTES * sector.dimension
        largest = max(largest, bytes_needed)
    return defaults.SECTOR_PROCESS_BYTES + largest, seconds


def gap_cost(
    model: Model, options: GapOptions | None = None, symmetries: SymmetryReport | None = None
) -> GapCost:
    """Estimated cost of :func:`lbwork.spectral_gap`, typical of boundary-driven chains."""
    options = options or GapOptions()
    usable = usable_memory()
    method = gap_method(model, options)
    dense = 16 * model.local_dimension ** (2 * model.sites)
    if 2 * dense > usable:
        return GapCost(2 * dense, float("inf"), method, False)
    if method == "exhaustive":
        memory, seconds = _exhaustive(model, options)
        return GapCost(memory, seconds, method, memory <= usable)
    equations = chain_equations(model, symmetries)
    space = whole_space(equations.groups)
    work = iteration_cost(equations, space)
    vectors = 2 * defaults.DAVIDSON_CAPACITY + 8
    vector = space.size * np.dtype(space.dtype).itemsize
    memory = max(work.fixed_bytes + vectors * vector, defaults.PROCESS_BYTES + 3 * dense)
    applies = max(2, options.starts) * (25 + 5 * model.sites)
    factor = 1.0
    if options.populations_only is False:
        # Charged sectors are complex; their sizes add up to about that of the neutral one per site.
        factor += 3.0 * model.sites
    seconds = (
        defaults.PLAN_SECONDS
        + work.setup_seconds
        + factor * applies * work.seconds
        + dense * defaults.CERTIFICATE_SECONDS
    )
    return GapCost(memory, seconds, method, memory <= usable + defaults.PROCESS_BYTES)
