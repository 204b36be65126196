"""Memory and time of a steady state, said before it is sought."""

from __future__ import annotations

from lbwork.errors import CapacityError
from lbwork.model import Model
from lbwork.provenance import usable_memory

__all__ = ["require_fit"]


def require_fit(model: Model) -> None:
    """Raise CapacityError when a density matrix and its image do not fit in memory."""
    needed = 2 * 16 * model.local_dimension ** (2 * model.sites)
    if needed > usable_memory():
        raise CapacityError(
            f"a density matrix of {model.sites} sites and its image need "
            f"{needed / 2**30:.1f} GiB, {usable_memory() / 2**30:.1f} GiB can be used; use fewer "
            "sites"
        )
