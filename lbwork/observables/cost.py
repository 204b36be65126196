"""What the entanglement of a state costs, before it is computed."""

from __future__ import annotations

from dataclasses import dataclass
from functools import reduce

import numpy as np

from lbwork.errors import CapacityError, UsageError
from lbwork.provenance import usable_memory

__all__ = ["EntanglementCost", "entanglement_cost"]

_COMPLEX_SECONDS = 4.2e-10
_REAL_SECONDS = 2.5e-10
_PRODUCT_SECONDS = 1e-10
_ENTRY_SECONDS = 2e-8
"""Measured on one core of a server: eigenvalues of a complex and of a real matrix per n**3, real
matrix products per multiplication, and rearranging per entry of the density matrix."""


@dataclass(frozen=True)
class EntanglementCost:
    """``memory_bytes`` besides the density matrix and ``seconds`` on one core, of the entropies,
    the operator-space entanglement and the negativity at all cuts of ``sites`` sites."""

    sites: int
    memory_bytes: int
    seconds: float

    def require_fit(self) -> None:
        """Raises CapacityError when the memory that can be used is less."""
        if self.memory_bytes > usable_memory():
            raise CapacityError(
                f"the entanglement of {self.sites} sites needs {self.memory_bytes / 2**30:.1f} "
                f"GiB, {usable_memory() / 2**30:.1f} GiB can be used; leave it out or use fewer "
                "sites"
            )


def entanglement_cost(count: int, dimension: int, *, charge: bool = False) -> EntanglementCost:
    """Cost for L = ``count`` sites of d = ``dimension`` states, complex density matrix.

    ``charge``: the state commutes with the total magnetisation, so that every matrix splits into
    blocks: of the size of the charge sectors for the partial transposes and the state itself, of
    pairs of opposite charge differences for the Schmidt matrices. Raises UsageError for count or
    dimension below 1.
    """
    if count < 1 or dimension < 1:
        raise UsageError(f"{count} sites of dimension {dimension}: both must be at least 1")
    size = dimension**count
    levels = np.ones(dimension if charge else 1)
    weight = 1.0 if charge else float(dimension)

    def sectors(sites: int) -> np.ndarray:
        """Sizes of the charge sectors of some sites."""
        return weight**sites * reduce(np.convolve, [levels] * sites, np.ones(1))

    seconds = (2 * count - 1) * _ENTRY_SECONDS * float(size) ** 2
    seconds += count * _COMPLEX_SECONDS * float(np.sum(sectors(count) ** 3))
    largest = float(sectors(count).max())
    for cut in range(1, count):
        seconds += _COMPLEX_SECONDS * float(np.sum(sectors(cut) ** 3))
        left, right = (
            np.convolve(part, part[::-1]) for part in (sectors(cut), sectors(count - cut))
        )
        # Differences q and -q of the ket's and the bra's charge share one real block.
        narrow, wide = sorted((left, right), key=len)
        wide = wide[(len(wide) - len(narrow)) // 2 :][: len(narrow)]
        middle = len(narrow) // 2
        small, large = np.minimum(narrow, wide)[middle:], np.maximum(narrow, wide)[middle:]
        factor = np.where(np.arange(len(small)) > 0, 2.0, 1.0)
        small, large = factor * small, factor * large
        seconds += float(np.sum(_REAL_SECONDS * small**3 + _PRODUCT_SECONDS * small**2 * large))
        largest = max(largest, float(small.max()) / 2)
    # The rearranged copy, the pattern of its entries, and a block with room to work in.
    memory = 17 * float(size) ** 2 + 32 * largest**2
    return EntanglementCost(count, int(memory), seconds)
