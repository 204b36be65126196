"""From sector vectors to density matrices, and to the copies of a sector."""

from __future__ import annotations

import numpy as np

from lbwork.errors import NotCertifiedError
from lbwork.generator import doubled_to_vector
from lbwork.model import Model
from lbwork.steady.zero_modes import SectorZeroModes
from lbwork.symmetry import SectorPlan
from lbwork.symmetry.local_basis import doubled_rotation
from lbwork.symmetry.monomials import MonomialMap
from lbwork.symmetry.sector_basis import digits_of, numbers_of

__all__ = ["all_copies", "as_matrix"]


def as_matrix(model: Model, doubled: np.ndarray) -> np.ndarray:
    """A vector in doubled-chain order (d**(2L),) as a complex (D, D) matrix."""
    size = model.local_dimension**model.sites
    flat = doubled_to_vector(doubled, model.sites, model.local_dimension)
    return np.asarray(flat.reshape(size, size), dtype=complex)


def _rotate(plan: SectorPlan, vector: np.ndarray, back: bool) -> np.ndarray:
    """Change between the written basis and the one the charges are diagonal in, site by site."""
    rotation = plan.symmetries.rotation
    if rotation is None:
        return vector
    base, sites = plan.symmetries.base, plan.model.sites
    tensor = vector.reshape((base,) * sites)
    for site in range(sites):
        local = doubled_rotation(rotation[site % len(rotation)])
        local = local.conj().T if back else local
        tensor = np.moveaxis(np.tensordot(local, tensor, axes=(1, site)), 0, site)
    return tensor.ravel()


def _act(plan: SectorPlan, operation: MonomialMap, vector: np.ndarray) -> np.ndarray:
    """A symmetry operation on a doubled-chain vector in the written basis."""
    base, sites = plan.symmetries.base, plan.model.sites
    inner = _rotate(plan, vector, True)
    if operation.antilinear:
        inner = inner.conj()
    states = np.arange(inner.size, dtype=np.uint64)
    digits, signs = operation.apply(digits_of(states, sites, base))
    moved = np.empty_like(inner)
    moved[numbers_of(digits, base).astype(np.int64)] = signs * inner
    return _rotate(plan, moved, False)


def _joined(basis: np.ndarray, vector: np.ndarray) -> np.ndarray | None:
    """The basis with the new direction of a unit vector added, None when there is none."""
    rest = vector.copy()
    for _ in range(2):
        rest = rest - basis @ (basis.conj().T @ rest)
    length = np.linalg.norm(rest)
    return None if length < 1e-6 else np.column_stack([basis, rest / length])


def all_copies(plan: SectorPlan, found: SectorZeroModes, *, left: bool) -> np.ndarray:
    """Orthonormal zero modes of a sector and of all its copies, complex (d**(2L), m).

    Symmetry operations and Hermiticity are applied until the space has the size that the sector's
    multiplicity asks for. Raises NotCertifiedError when it does not come out.
    """
    vectors = found.kernel.left() if left else found.kernel.right
    isometry = found.block.isometry
    basis = np.asarray(isometry @ vectors, dtype=complex)
    wanted = found.kernel.count * found.sector.multiplicity
    operations = [item.operation for item in plan.symmetries.symmetries]
    operations.append(plan.symmetries.hermiticity.operation)
    position = 0
    while position < basis.shape[1] < wanted:
        for operation in operations:
            larger = _joined(basis, _act(plan, operation, basis[:, position]))
            basis = basis if larger is None else larger
        position += 1
    if basis.shape[1] != wanted:
        raise NotCertifiedError(
            f"sector '{found.sector.label}': symmetries give {basis.shape[1]} zero modes, "
            f"{wanted} are expected from its {found.sector.multiplicity} copies"
        )
    return basis
