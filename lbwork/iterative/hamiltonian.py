"""``(s + i ad_H)^-1`` from the eigenvectors of H in each charge group."""

from __future__ import annotations

from dataclasses import dataclass

import numba
import numpy as np
import scipy.linalg
import scipy.sparse as sparse

from lbwork.iterative.action import sorted_operator
from lbwork.iterative.kernels import divide_complex, divide_real
from lbwork.iterative.products import multiply
from lbwork.iterative.space import SectorSpace, hermitian_from_real, real_from_hermitian
from lbwork.provenance import limited_threads

THREADED = 1000
"""Dimension from which an eigen-decomposition is worth a second thread."""

__all__ = ["EnergyBasis", "HamiltonianResolvent", "energy_basis"]


@dataclass(frozen=True, eq=False)
class EnergyBasis:
    """``energies[g]`` and eigenvectors ``vectors[g]`` of H in each charge group, real with H."""

    energies: tuple[np.ndarray, ...]
    vectors: tuple[np.ndarray, ...]


def energy_basis(
    hamiltonian: sparse.csr_matrix, space: SectorSpace, precision: type = np.float64
) -> EnergyBasis:
    """Eigenvectors of H (csr (D, D), basis of the charges), group by group.

    Computed in double precision, kept in ``precision`` (float64 or float32).
    """
    ordered = sorted_operator(hamiltonian, space)
    real = not np.any(ordered.data.imag)
    bounds = space.groups.bounds
    used = {group for pair in space.pairs for group in pair}
    kind = precision if real else np.result_type(precision, np.complex64)
    energies, vectors = [], []
    for group in range(bounds.size - 1):
        if group not in used:
            energies.append(np.zeros(0))
            vectors.append(np.zeros((0, 0)))
            continue
        inside = slice(bounds[group], bounds[group + 1])
        block = ordered[inside, inside].toarray()
        block = block.real.copy() if real else block
        # No compiled loop runs meanwhile, so BLAS may have the threads.
        with limited_threads(numba.get_num_threads() if block.shape[0] > THREADED else 1):
            values, columns = scipy.linalg.eigh(block, driver="evd", overwrite_a=True)
        energies.append(values)
        vectors.append(np.ascontiguousarray(columns, dtype=kind))
    return EnergyBasis(tuple(energies), tuple(vectors))


class HamiltonianResolvent:
    """``X -> (s + i ad_H)^-1 X`` on vectors of a sector: four matrix products a block."""

    def __init__(self, space: SectorSpace, basis: EnergyBasis, shift: float) -> None:
        self._space = space
        self._basis = basis
        self._shift = shift
        self._real = not any(np.iscomplexobj(columns) for columns in basis.vectors)

    def apply(self, vector: np.ndarray) -> np.ndarray:
        """The image of a vector, in the precision of the vector."""
        result = np.empty_like(vector)
        for (ket, bra), block, out in zip(
            self._space.pairs,
            self._space.blocks(vector),
            self._space.blocks(result),
            strict=True,
        ):
            if self._space.hermitian and self._real:
                self._real_block(block, out, ket)
            elif self._space.hermitian:
                full = hermitian_from_real(block)
                out[:] = real_from_hermitian(self._complex_block(full, ket, bra))
            else:
                out[:] = self._complex_block(block, ket, bra)
        return result

    def _real_block(self, block: np.ndarray, out: np.ndarray, group: int) -> None:
        columns, energies = self._basis.vectors[group], self._basis.energies[group]
        spare = multiply(columns.T, block)
        multiply(spare, columns, out)
        shift = out.dtype.type(self._shift)
        divide_real(out.reshape(-1), 0, energies.astype(out.dtype), shift)
        multiply(columns, out, spare)
        multiply(spare, columns.T, out)

    def _complex_block(self, block: np.ndarray, ket: int, bra: int) -> np.ndarray:
        left, right = self._basis.vectors[ket], self._basis.vectors[bra]
        inner = _product(left.conj().T, block, right)
        divide_complex(
            inner, self._basis.energies[ket], self._basis.energies[bra], float(self._shift)
        )
        return _product(left, inner, right.conj().T)


def _product(left: np.ndarray, block: np.ndarray, right: np.ndarray) -> np.ndarray:
    """``left block right``; real factors multiply real and imaginary part on their own."""
    if np.iscomplexobj(left):
        return multiply(multiply(left, block), right)
    result = np.empty((left.shape[0], right.shape[1]), dtype=block.dtype)
    result.real = multiply(multiply(left, np.ascontiguousarray(block.real)), right)
    result.imag = multiply(multiply(left, np.ascontiguousarray(block.imag)), right)
    return result
