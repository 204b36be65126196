"""The Lindblad generator of a model: sparse matrix, matrix-free action, effective Hamiltonian."""

from __future__ import annotations

from functools import cached_property

import numpy as np
import numpy.typing as npt
import scipy.sparse as sparse

from lbwork.errors import CapacityError, ModelError, UsageError
from lbwork.generator.action import apply_tables
from lbwork.generator.certificates import GeneratorCertificate, certify_generator
from lbwork.generator.embedding import embed
from lbwork.generator.tables import ActionTables, action_tables
from lbwork.generator.terms import superoperator_terms
from lbwork.model import Model
from lbwork.provenance import usable_memory

__all__ = ["Lindbladian"]

_BYTES_PER_ENTRY = 60
"""Peak bytes per non-zero while a sparse superoperator is put together (measured)."""


class Lindbladian:
    """``L(rho) = -i[H, rho] + sum_k g_k (l_k rho l_k^dag - 1/2 {l_k^dag l_k, rho})``.

    ``dimension`` is D = d**L. Operators are complex csr (D, D); density matrices complex128 (D, D).
    Raises CapacityError when the D x D operators cannot fit in memory.
    """

    def __init__(self, model: Model) -> None:
        self.model = model
        self.dimension = model.local_dimension**model.sites
        if 64 * self.dimension > usable_memory():
            raise CapacityError(
                f"{model.sites} sites give operators of dimension {self.dimension}, more than the "
                "memory holds; use fewer sites"
            )

    def _embedded(self, sites: tuple[int, ...], matrix: np.ndarray) -> sparse.csr_matrix:
        return embed(matrix, sites, self.model.sites, self.model.local_dimension)

    @cached_property
    def _hamiltonian(self) -> sparse.csr_matrix:
        total = sparse.csr_matrix((self.dimension, self.dimension), dtype=complex)
        for placed in self.model.placed_hamiltonian():
            total = total + self._embedded(placed.sites, placed.matrix)
        return total

    def hamiltonian(self) -> sparse.csr_matrix:
        """H, csr (D, D)."""
        return self._hamiltonian.copy()

    @cached_property
    def _jumps(self) -> list[sparse.csr_matrix]:
        return [
            np.sqrt(jump.rate) * self._embedded(jump.sites, jump.matrix)
            for jump in self.model.placed_jumps()
        ]

    def jump_operators(self) -> list[sparse.csr_matrix]:
        """``sqrt(g_k) l_k`` for every jump, csr (D, D)."""
        return [jump.copy() for jump in self._jumps]

    @cached_property
    def _effective_hamiltonian(self) -> sparse.csr_matrix:
        total = self._hamiltonian
        for jump in self.model.placed_jumps():
            decay = jump.matrix.conj().T @ jump.matrix
            total = total - 0.5j * jump.rate * self._embedded(jump.sites, decay)
        return total.tocsr()

    def effective_hamiltonian(self) -> sparse.csr_matrix:
        """``Heff = H - i/2 sum_k g_k l_k^dag l_k``, csr (D, D)."""
        return self._effective_hamiltonian.copy()

    @cached_property
    def _forward(self) -> ActionTables:
        return action_tables((-1j * self._effective_hamiltonian).tocsr(), self._jumps)

    @cached_property
    def _backward(self) -> ActionTables:
        adjoint = (1j * self._effective_hamiltonian.conj().T).tocsr()
        return action_tables(adjoint, [jump.conj().T.tocsr() for jump in self._jumps])

    @property
    def action_bytes(self) -> int:
        """Bytes of the tables behind :meth:`apply`, besides its input and output."""
        return self._forward.nbytes

    def _checked(self, values: npt.ArrayLike) -> np.ndarray:
        matrix = np.asarray(values)
        if matrix.shape != (self.dimension, self.dimension):
            raise ModelError(
                f"an array of shape {matrix.shape} is not an operator of this chain; it must "
                f"be ({self.dimension}, {self.dimension})"
            )
        return matrix

    def _run(self, tables: ActionTables, matrix: np.ndarray, out: np.ndarray | None) -> np.ndarray:
        # The compiled kernel trusts its arguments: a short ``out`` would be overrun, one that
        # overlaps the input would be read after it was written.
        if out is not None:
            legal = out.dtype == np.complex128 and out.flags.c_contiguous and out.flags.writeable
            if not legal or out.shape != matrix.shape:
                raise UsageError(
                    f"out is {out.dtype} of shape {out.shape}; it must be a writable C-contiguous "
                    f"complex128 array of shape {matrix.shape}, or be left out"
                )
            if np.may_share_memory(out, matrix):
                raise UsageError(
                    "out shares memory with the operator that the generator is applied to; give "
                    "another array, or leave it out"
                )
        return apply_tables(tables, matrix, out)

    def apply(self, rho: npt.ArrayLike, out: np.ndarray | None = None) -> np.ndarray:
        """``L(rho)`` without forming L; any numeric (D, D) array, Hermitian or not.

        ``rho`` is copied when it is not C-contiguous complex128. ``out`` may be a C-contiguous
        complex128 (D, D) array, apart from ``rho``, that takes the result; UsageError otherwise.
        CapacityError when the tables of the diagonal jumps do not fit in memory.
        """
        checked = self._checked(rho)
        return self._run(self._forward, checked, out)

    def apply_adjoint(self, operator: npt.ArrayLike, out: np.ndarray | None = None) -> np.ndarray:
        """``L^dag(X) = i[H, X] + sum_k g_k (l_k^dag X l_k - 1/2 {l_k^dag l_k, X})``.

        Arguments and errors are those of :meth:`apply`.
        """
        checked = self._checked(operator)
        return self._run(self._backward, checked, out)

    def jump_part(self, rho: npt.ArrayLike) -> np.ndarray:
        """``sum_k g_k l_k rho l_k^dag``, complex (D, D)."""
        matrix = self._checked(rho)
        result = np.zeros(matrix.shape, dtype=complex)
        for jump in self._jumps:
            result += (jump.conj() @ (jump @ matrix).T).T
        return result

    def no_jump_part(self, rho: npt.ArrayLike) -> np.ndarray:
        """``-i (Heff rho - rho Heff^dag)``, complex (D, D)."""
        matrix, heff = self._checked(rho), self._effective_hamiltonian
        return np.asarray(-1j * (heff @ matrix - (heff.conj() @ matrix.T).T))

    def matrix(self) -> sparse.csr_matrix:
        """L as csr (D**2, D**2) on row-major ``vec(rho)``, index ket * D + bra.

        Raises CapacityError when it would not fit in memory.
        """
        sites, dimension = self.model.sites, self.model.local_dimension
        terms = superoperator_terms(self.model)
        per_row = sum(np.count_nonzero(term.matrix) / term.matrix.shape[0] for term in terms)
        needed = int(_BYTES_PER_ENTRY * per_row * self.dimension**2)
        if needed > usable_memory():
            raise CapacityError(
                f"the superoperator of {sites} sites needs about {needed / 2**30:.1f} GiB, "
                f"{usable_memory() / 2**30:.1f} GiB can be used; use sectors or fewer sites"
            )
        total = sparse.csr_matrix((self.dimension**2, self.dimension**2), dtype=complex)
        for term in terms:
            count = len(term.sites)
            tensor = term.matrix.reshape((dimension,) * (4 * count))
            order = [*range(0, 2 * count, 2), *range(1, 2 * count, 2)]
            tensor = tensor.transpose([*order, *(2 * count + axis for axis in order)])
            positions = (*term.sites, *(sites + site for site in term.sites))
            total = total + embed(
                tensor.reshape(term.matrix.shape), positions, 2 * sites, dimension
            )
        return total

    @cached_property
    def norm_bound(self) -> float:
        """An upper bound of the operator norm of L: the sum of the norms of its local terms."""
        return float(
            sum(np.linalg.norm(term.matrix, 2) for term in superoperator_terms(self.model))
        )

    def certificate(self) -> GeneratorCertificate:
        """Trace and Hermiticity preservation and positivity, recomputed from the local terms."""
        return certify_generator(self.model)
