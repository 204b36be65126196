"""Which precision and how many basis vectors a sector gets: decided by the memory they need."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork import defaults
from lbwork.iterative.space import SectorSpace
from lbwork.provenance import usable_memory

__all__ = ["Resources", "choose_resources"]


@dataclass(frozen=True)
class Resources:
    """``precision`` of basis and preconditioner, ``restart``: basis vectors of one Krylov cycle."""

    precision: type
    restart: int


def choose_resources(space: SectorSpace) -> Resources:
    """Double precision and an unrestarted basis where that is small, else single precision."""
    double = space.size * np.dtype(space.dtype).itemsize
    full = defaults.ITERATIVE_RESTART
    if (full + 1) * double <= defaults.ITERATIVE_BASIS_BYTES:
        return Resources(np.float64, full)
    single = double // 2
    fits = defaults.ITERATIVE_BASIS_BYTES // single
    # A short cycle converges slowly; some memory is worth giving for the shortest useful one.
    affordable = int(0.35 * usable_memory()) // single
    return Resources(np.float32, max(10, min(full, max(fits, min(42, affordable)))))
