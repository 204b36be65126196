"""What matrix-free work costs on this machine, known before it starts.

One preconditioned application is four matrix products a block, a few passes over the vector for the
local terms, and the orthogonalisation. The rate of matrix products is measured once (milliseconds);
the rest are constants measured per entry (:mod:`lbwork.defaults`).
"""

from __future__ import annotations

import time
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from lbwork import defaults
from lbwork.iterative.products import multiply
from lbwork.iterative.resources import Resources, choose_resources
from lbwork.iterative.solver import ChainEquations
from lbwork.iterative.space import SectorSpace
from lbwork.provenance import limited_threads

__all__ = ["IterationCost", "iteration_cost", "product_rate"]


@dataclass(frozen=True)
class IterationCost:
    """``seconds`` of one application with orthogonalisation, ``setup_seconds`` for eigenvectors and
    tables; ``vector_bytes`` of a basis vector, ``fixed_bytes`` besides the basis; ``resources``."""

    seconds: float
    setup_seconds: float
    vector_bytes: int
    fixed_bytes: int
    resources: Resources


@lru_cache(maxsize=2)
def product_rate(precision: type = np.float64) -> float:
    """Operations per second of a matrix product of moderate size, shared out to the threads."""
    size = 384
    factor: np.ndarray = np.ones((size, size), dtype=precision)
    out = np.empty_like(factor)
    best = np.inf
    with limited_threads(1):
        for _ in range(4):
            started = time.perf_counter()
            multiply(factor, factor, out)
            best = min(best, time.perf_counter() - started)
    return float(2 * size**3 / best)


def iteration_cost(
    equations: ChainEquations, space: SectorSpace, *, splitting: str = "energy"
) -> IterationCost:
    """Cost of matrix-free work in one sector."""
    resources = choose_resources(space)
    real_hamiltonian = not np.any(equations.form.hamiltonian.data.imag)
    factor = 1 if space.hermitian and real_hamiltonian else (4 if not real_hamiltonian else 2)
    precision = resources.precision
    if splitting == "no-jump":
        factor, precision = 4, np.float64
    products = sum(4.0 * rows * columns * (rows + columns) for rows, columns in space.shapes)
    entry = np.dtype(space.dtype).itemsize
    # Rows of A from the left, from the right, and the jumps, thrice for the dissipator's series.
    per_entry = 2 * equations.form.no_jump.nnz / equations.groups.order.size
    per_entry += 1.0 * sum(
        np.count_nonzero(jump.superoperator) / jump.decay.shape[0] ** 2
        for jump in equations.form.jumps
    )
    local = space.size * (defaults.LOCAL_SECONDS * per_entry + defaults.PASS_SECONDS)
    orthogonal = space.size * entry / 8 * defaults.ORTHOGONAL_SECONDS * 25
    groups = {group for pair in space.pairs for group in pair}
    sizes = equations.groups.sizes[list(groups)]
    eigen = defaults.EIGEN_OPERATIONS * float(np.sum(sizes.astype(float) ** 3))
    eigen *= 8 if splitting == "no-jump" else (1 if real_hamiltonian else 3)
    vector = space.size * entry
    narrow = vector if precision is np.float64 else vector // 2
    return IterationCost(
        seconds=factor * products / product_rate(precision) + local + orthogonal,
        setup_seconds=eigen / product_rate() + space.size * 4e-8,
        vector_bytes=narrow,
        fixed_bytes=int(
            defaults.PROCESS_BYTES
            + 7 * vector
            + 5 * narrow
            + 8 * factor * float(np.sum(sizes.astype(float) ** 2))
        ),
        resources=resources,
    )
