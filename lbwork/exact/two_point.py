"""The linear equation of two-point functions as one sparse real system.

    d Gamma/dt = X Gamma + Gamma X^T + sum_k B_k Gamma B_k^T + Y

for the covariance ``Gamma_mn = -i <w_m w_n>`` of a chain of :mod:`lbwork.exact.noise`. Only its
independent real entries are unknowns; for chains of neighbours they form a grid with a few entries
per row.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse
import scipy.sparse.linalg

from lbwork import defaults
from lbwork.errors import CapacityError
from lbwork.exact.noise import NoisyChain
from lbwork.exact.quadratic import conserves_particles, folded, unfolded

__all__ = ["TwoPointSystem", "factorised", "folded_noise", "largest_row", "two_point_system"]

MAX_UNKNOWNS = 600_000


@dataclass(frozen=True, eq=False)
class TwoPointSystem:
    """``d r/dt = matrix r + source`` for the independent real entries r of the covariance.

    conserving: the covariance is folded, complex anti-Hermitian (size, size); else real
    antisymmetric. r: imaginary parts of the diagonal (folded only), then the entries above it, row
    by row, real parts before imaginary parts.
    """

    matrix: sparse.csc_matrix
    source: np.ndarray
    conserving: bool
    size: int

    def covariance(self, entries: np.ndarray) -> np.ndarray:
        """Gamma, real (2L, 2L)."""
        rows, columns = np.triu_indices(self.size, 1)
        upper = np.zeros((self.size, self.size), dtype=complex if self.conserving else float)
        if not self.conserving:
            upper[rows, columns] = entries
            return np.asarray(upper - upper.T)
        levels, real, imaginary = np.split(entries, [self.size, self.size + rows.size])
        upper[rows, columns] = real + 1j * imaginary
        return unfolded(upper - upper.conj().T + np.diag(1j * levels))


def folded_noise(form: sparse.csr_matrix) -> sparse.csr_matrix | None:
    """Complex (L, L) matrix of a sparse form that conserves particles, None when it does not."""
    even, odd = form[::2], form[1::2]
    limit = defaults.CONSERVATION_TOLERANCE * abs(form).max()
    if max(abs(even[:, ::2] - odd[:, 1::2]).max(), abs(even[:, 1::2] + odd[:, ::2]).max()) > limit:
        return None
    return sparse.csr_matrix(even[:, ::2] + 1j * odd[:, ::2])


def two_point_system(noisy: NoisyChain) -> TwoPointSystem:
    """The equation of a noisy chain, folded where particles are conserved.

    Raises CapacityError beyond 600,000 unknowns.
    """
    chain = noisy.chain
    drift: np.ndarray = chain.drift()
    source: np.ndarray = chain.source()
    for form in noisy.noise:
        square = sparse.coo_matrix(form @ form)
        np.add.at(drift, (square.row, square.col), square.data / 2)
    thin = [folded_noise(form) for form in noisy.noise]
    conserving = conserves_particles(drift) and conserves_particles(source)
    conserving = conserving and all(form is not None for form in thin)
    size = chain.sites if conserving else 2 * chain.sites
    unknowns = size**2 if conserving else size * (size - 1) // 2
    if unknowns > MAX_UNKNOWNS:
        raise CapacityError(
            f"{chain.sites} sites give {unknowns} unknowns, more than {MAX_UNKNOWNS}; use a "
            "shorter chain"
        )
    noise = [form for form in thin if form is not None] if conserving else list(noisy.noise)
    if conserving:
        drift, source = folded(drift), folded(source)
    rows, columns = np.triu_indices(size, 1)
    level = np.arange(size) * (size + 1)
    above, below = rows * size + columns, columns * size + rows
    whole = _superoperator(sparse.csr_matrix(drift), noise)
    flat = source.ravel()
    if not conserving:
        # Columns: Gamma_ij with i < j enters with its mirror image -Gamma_ij.
        matrix = whole[above][:, above] - whole[above][:, below]
        return TwoPointSystem(sparse.csc_matrix(matrix), flat[above], False, size)
    upper = whole[above]
    diagonal = whole[level]
    blocks = [
        [
            part(1j * rows_of[:, level]),
            part(rows_of[:, above] - rows_of[:, below]),
            part(1j * (rows_of[:, above] + rows_of[:, below])),
        ]
        for part, rows_of in ((_imaginary, diagonal), (_real, upper), (_imaginary, upper))
    ]
    entries = np.concatenate([flat[level].imag, flat[above].real, flat[above].imag])
    matrix = sparse.csc_matrix(sparse.bmat(blocks))
    matrix.eliminate_zeros()
    return TwoPointSystem(matrix, entries, True, size)


def _real(matrix: sparse.csr_matrix) -> sparse.csr_matrix:
    return matrix.real


def _imaginary(matrix: sparse.csr_matrix) -> sparse.csr_matrix:
    return matrix.imag


def _superoperator(drift: sparse.csr_matrix, noise: list[sparse.csr_matrix]) -> sparse.csr_matrix:
    """``X G + G X^dag + sum_k B_k G B_k^dag`` on the row-major vector of G, sparse."""
    size = drift.shape[0]
    one = sparse.identity(size, format="csr")
    whole = sparse.kron(drift, one) + sparse.kron(one, drift.conj())
    rows, columns, values = [], [], []
    for form in map(sparse.coo_matrix, noise):
        rows.append(np.add.outer(form.row * size, form.row).ravel())
        columns.append(np.add.outer(form.col * size, form.col).ravel())
        values.append(np.outer(form.data, form.data.conj()).ravel())
    if noise:
        places = (np.concatenate(rows), np.concatenate(columns))
        whole = whole + sparse.coo_matrix((np.concatenate(values), places), shape=whole.shape)
    return sparse.csr_matrix(whole)


def factorised(matrix: sparse.csc_matrix) -> scipy.sparse.linalg.SuperLU:
    """LU factors; the weak pivoting asks for a refinement or a residual."""
    # The pattern is symmetric: an ordering made for that halves the fill.
    return scipy.sparse.linalg.splu(
        matrix,
        permc_spec="MMD_AT_PLUS_A",
        diag_pivot_thresh=0.01,
        options={"SymmetricMode": True},
    )


def largest_row(matrix: sparse.csc_matrix) -> float:
    """Largest sum of sizes along a row: the scale of the equation."""
    return max(float(scipy.sparse.linalg.norm(matrix, np.inf)), np.finfo(float).tiny)
