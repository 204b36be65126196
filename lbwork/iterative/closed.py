"""Chains without dissipation: everything follows from the energies."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork.iterative.hamiltonian import energy_basis
from lbwork.iterative.solver import ChainEquations
from lbwork.iterative.space import whole_space

__all__ = ["ClosedChain", "closed_chain"]


@dataclass(frozen=True)
class ClosedChain:
    """``levels -i (E_i - E_j)``: ``zero_modes`` of them vanish, ``smallest`` is the least non-zero
    ``|E_i - E_j|`` (infinity if there is none)."""

    zero_modes: int
    smallest: float


def closed_chain(equations: ChainEquations, zero: float) -> ClosedChain | None:
    """Zero modes of a chain whose dissipator vanishes; None where it does not.

    ``zero``: energies closer than this are degenerate. Operators between degenerate energies do not
    move, so a level of multiplicity n has ``n**2`` zero modes.
    """
    if equations.form.jumps:
        return None
    basis = energy_basis(equations.form.hamiltonian, whole_space(equations.groups))
    energies = np.sort(np.concatenate(basis.energies))
    steps = np.diff(energies)
    apart = steps > zero
    edges = np.flatnonzero(apart) + 1
    sizes = np.diff(np.concatenate([[0], edges, [energies.size]]))
    smallest = float(steps[apart].min()) if np.any(apart) else np.inf
    return ClosedChain(int(np.sum(sizes.astype(np.int64) ** 2)), smallest)
