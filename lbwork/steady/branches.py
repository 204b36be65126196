"""Several steady states: the long-time limit of the maximally mixed one, and legal states.

On the support of that limit the conserved quantities (zero modes of the adjoint) are an algebra
under multiplication; the eigenprojectors of a generic Hermitian element cut the limit into density
matrices with orthogonal supports, each of them steady (B. Baumgartner, H. Narnhofer, J. Phys. A 41,
395303 (2008); from memory). Where the algebra does not commute (decoherence-free subspaces) these
states are one choice of many and the remaining zero modes are coherences between them.
"""

from __future__ import annotations

import numpy as np

from lbwork import defaults
from lbwork.errors import CapacityError, NotCertifiedError
from lbwork.generator import Lindbladian
from lbwork.steady.records import SteadyBranch
from lbwork.steady.space import all_copies, as_matrix
from lbwork.steady.zero_modes import ZeroModes, neutral
from lbwork.symmetry import SectorPlan
from lbwork.symmetry.charges import Charge, ChargeLabel, label_text, labels_of
from lbwork.symmetry.sector_basis import digits_of

__all__ = ["mixed_limit", "steady_branches"]


def _hermitian(matrix: np.ndarray) -> np.ndarray:
    return np.asarray((matrix + matrix.conj().T) / 2)


def mixed_limit(plan: SectorPlan, found: ZeroModes) -> tuple[np.ndarray, list[np.ndarray]]:
    """Limit of the maximally mixed state and a basis of conserved quantities, (D, D) each.

    The conserved quantities are those that commute with the strong charges: enough to tell steady
    states apart, and the states then have definite charges.
    ``lim exp(t L)(1/D) = sum_ab R_a (J^dag R)^-1_ab tr(J_b^dag 1/D)`` with right and left zero
    modes R and J. Raises CapacityError for chains too long to hold all modes, NotCertifiedError
    when left and right modes do not pair up.
    """
    if plan.total_dimension > defaults.STEADY_DEGENERATE_SPACE:
        raise CapacityError(
            f"{found.count} steady states of {plan.model.sites} sites cannot be told apart in "
            f"memory (limit d**(2L) = {defaults.STEADY_DEGENERATE_SPACE}); use fewer sites"
        )
    size = plan.model.local_dimension**plan.model.sites
    limit = np.zeros((size, size), dtype=complex)
    conserved: list[np.ndarray] = []
    # Sectors are orthogonal and invariant under L and its adjoint: they pair up one by one.
    for item in found.with_modes:
        if not neutral(plan, item.sector, ("strong ket", "strong bra")):
            continue
        right = [as_matrix(plan.model, vector) for vector in all_copies(plan, item, left=False).T]
        left = [as_matrix(plan.model, vector) for vector in all_copies(plan, item, left=True).T]
        overlap = np.array([[np.vdot(one, other) for other in right] for one in left])
        if np.linalg.cond(overlap) > 1e10:
            raise NotCertifiedError(
                f"left and right zero modes of sector '{item.sector.label}' do not pair up"
            )
        weights = np.linalg.solve(overlap, [np.trace(one).conj() / size for one in left])
        limit += sum(weight * mode for weight, mode in zip(weights, right, strict=True))
        conserved += left
    return limit, conserved


def _projectors(limit: np.ndarray, conserved: list[np.ndarray]) -> list[np.ndarray]:
    """Isometries (D, r) onto the orthogonal supports of the steady states."""
    weights, vectors = np.linalg.eigh(limit)
    kept = weights > defaults.STEADY_POSITIVE * weights[-1]
    support, weights = vectors[:, kept], weights[kept]
    generator = np.random.default_rng(7)
    generic = np.zeros((support.shape[1],) * 2, dtype=complex)
    for quantity in conserved:
        inner = support.conj().T @ quantity @ support
        generic += generator.normal() * _hermitian(inner) + generator.normal() * _hermitian(
            1j * inner
        )
    # Dropping what does not commute with the limit averages over the flow limit**(i t), which maps
    # the algebra onto itself: the states then add up to the limit.
    generic[np.abs(weights[:, None] - weights) > 1e-9 * weights[-1]] = 0
    values, columns = np.linalg.eigh(generic)
    steps = np.flatnonzero(np.diff(values) > 1e-7 * max(float(np.abs(values).max()), 1e-300))
    return [support @ part for part in np.split(columns, steps + 1, axis=1)]


def _strong_charges(plan: SectorPlan) -> list[Charge]:
    if plan.symmetries.rotation is not None:
        return []
    return [charge for charge in plan.symmetries.charges if charge.kind == "strong ket"]


def _charge_label(plan: SectorPlan, density: np.ndarray) -> ChargeLabel:
    """Strong charges that all populations of a state share; empty where they differ or for none."""
    strong = _strong_charges(plan)
    if not strong:
        return ()
    sites, dimension = plan.model.sites, plan.model.local_dimension
    occupied = np.flatnonzero(np.diagonal(density).real > defaults.STEADY_POSITIVE)
    ket = digits_of(occupied.astype(np.uint64), sites, dimension)
    labels = labels_of(strong, ket * (dimension + 1))
    return () if np.any(labels != labels[0]) else tuple(int(value) for value in labels[0])


def steady_branches(
    plan: SectorPlan, generator: Lindbladian, limit: np.ndarray, conserved: list[np.ndarray]
) -> tuple[SteadyBranch, ...]:
    """Steady density matrices with orthogonal supports; labelled by strong charges where they have
    definite ones. Raises NotCertifiedError when one is not steady."""
    mixed = _hermitian(limit)
    states = []
    for isometry in _projectors(mixed, conserved):
        inner = isometry.conj().T @ mixed @ isometry
        weight = float(np.trace(inner).real)
        density = isometry @ (inner / weight) @ isometry.conj().T
        residual = float(np.linalg.norm(generator.apply(density)) / np.linalg.norm(density))
        states.append((_charge_label(plan, density), density, residual, weight))
    states.sort(key=lambda state: state[0])
    limit_of_residual = defaults.STEADY_RESIDUAL_TOLERANCE * max(generator.norm_bound, 1e-300)
    worst = max(state[2] for state in states)
    if worst > limit_of_residual:
        raise NotCertifiedError(
            f"the steady states of {plan.model.name} could not be told apart: residual {worst:.1e}"
        )
    labels = [state[0] for state in states]
    branches = []
    for number, (label, density, residual, weight) in enumerate(states, start=1):
        text = label_text(_strong_charges(plan), label) if label else ""
        name = text if text and labels.count(label) == 1 else f"state {number} {text}".strip()
        branches.append(SteadyBranch(name, density, residual, weight))
    return tuple(branches)
