"""Memory and time of a steady state, said before it is sought."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork import defaults
from lbwork.errors import CapacityError
from lbwork.iterative import ChainEquations, chain_equations, iteration_cost, whole_space
from lbwork.model import Model
from lbwork.provenance import usable_memory
from lbwork.symmetry import SymmetryReport

__all__ = ["SteadyCost", "steady_cost"]


@dataclass(frozen=True)
class SteadyCost:
    """``memory_bytes``: peak of the process; ``seconds``; ``applies``: assumed applications."""

    memory_bytes: int
    seconds: float
    applies: int
    fits: bool

    def require_fit(self, sites: int) -> None:
        """Raise CapacityError when the task does not fit in memory."""
        if not self.fits:
            raise CapacityError(
                f"the steady state of {sites} sites needs about {self.memory_bytes / 2**30:.1f} "
                f"GiB, {usable_memory() / 2**30:.1f} GiB can be used; use fewer sites"
            )


def steady_cost(
    model: Model, symmetries: SymmetryReport | None = None, *, splitting: str = "energy"
) -> SteadyCost:
    """Estimated cost of :func:`lbwork.steady_state`.

    The number of applications is typical of boundary-driven chains; strong interactions far from
    equilibrium can need a few times more.
    """
    dense = 16 * model.local_dimension ** (2 * model.sites)
    usable = usable_memory()
    if 2 * dense > usable:
        # Groups of kets of a chain that long would themselves not fit.
        return SteadyCost(2 * dense, float("inf"), 0, False)
    equations = chain_equations(model, symmetries)
    return _cost(equations, dense, usable, splitting)


def _cost(equations: ChainEquations, dense: int, usable: int, splitting: str) -> SteadyCost:
    model = equations.model
    space = whole_space(equations.groups)
    work = iteration_cost(equations, space, splitting=splitting)
    applies = 20 + int(2.5 * model.sites)
    if work.resources.precision is np.float32:
        applies = int(1.3 * applies)
    probe = 30
    basis = min(work.resources.restart, applies) * work.vector_bytes
    certificate = defaults.PROCESS_BYTES + 2 * dense + 3 * space.size * 8
    sizes = equations.groups.sizes.astype(float)
    weights = 6 * defaults.EIGEN_OPERATIONS * float(np.sum(sizes**3)) * defaults.EIGEN_SECONDS
    searched = applies + probe
    if any(equations.groups.strong) or np.any(equations.groups.moduli):
        # Sectors of coherences are searched as well, in complex numbers.
        searched += 5 * probe
    seconds = (
        defaults.PLAN_SECONDS
        + work.setup_seconds
        + searched * work.seconds
        + weights
        + dense * defaults.CERTIFICATE_SECONDS
    )
    memory = max(work.fixed_bytes + basis, certificate)
    return SteadyCost(memory, seconds, applies + probe, memory <= usable + defaults.PROCESS_BYTES)
