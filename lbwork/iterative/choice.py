"""Which splitting: tried on shorter chains before the work starts."""

from __future__ import annotations

import numpy as np

from lbwork import defaults
from lbwork.errors import LbworkError
from lbwork.iterative.solver import (
    SPLITTINGS,
    ChainEquations,
    SectorSolver,
    chain_equations,
    part_generators,
)
from lbwork.iterative.space import whole_space

__all__ = ["choose_splitting", "trial_applies"]


def trial_applies(equations: ChainEquations, splitting: str) -> int:
    """Applications that the steady state of a short chain takes in its largest component."""
    parts = part_generators(equations, whole_space(equations.groups))
    largest = max(parts, key=lambda part: part.space.size)
    solver = SectorSolver(equations, largest.space, generator=largest, splitting=splitting)
    start = solver.space.identity()
    size = float(np.linalg.norm(start))
    right = -solver.apply(start)
    if np.linalg.norm(right) <= defaults.ITERATIVE_TOLERANCE * size:
        return 0
    limit = defaults.ITERATIVE_TRIAL_LIMIT
    solved = solver.solve(
        right, defaults.ITERATIVE_TOLERANCE, limit=limit, restart=limit, start=start
    )
    return solved.applies if solved.converged else 2 * limit


def choose_splitting(equations: ChainEquations) -> str:
    """The splitting with the lower extrapolated cost, from two shorter chains of the same model.

    A Sylvester solve with Heff costs several times a solve with H: on long chains it must save that
    much, on short ones the lower count wins. ``energy`` where the chain is short already or cannot
    be shortened.
    """
    model = equations.model
    base = np.log(model.local_dimension)
    lengths = [
        max(2, int(np.log(size) / base + 1e-9)) for size in defaults.ITERATIVE_TRIAL_DIMENSIONS
    ]
    if model.sites <= lengths[1] or lengths[0] == lengths[1]:
        return SPLITTINGS[0]
    counts = {}
    try:
        short = [chain_equations(model.replace(sites=length)) for length in lengths]
        for splitting in SPLITTINGS:
            counts[splitting] = [trial_applies(item, splitting) for item in short]
    except (LbworkError, np.linalg.LinAlgError):
        return SPLITTINGS[0]
    expected = {}
    for splitting, (first, second) in counts.items():
        growth = max(1.0, second / max(first, 1)) ** (1 / (lengths[1] - lengths[0]))
        expected[splitting] = second * growth ** (model.sites - lengths[1])
    small = model.local_dimension**model.sites <= defaults.ITERATIVE_COUNT_DIMENSION
    share = 0.9 if small else 0.3
    better = expected["no-jump"] < share * expected["energy"]
    return "no-jump" if better else "energy"
