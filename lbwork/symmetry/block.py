"""The matrix of the generator in one symmetry sector.

With the isometry ``V`` of a sector (``L V = V B``) the block is read off the rows of L that belong
to orbit representatives: ``B[r', r(s)] += L[r', s] V[s] / V[r']``, so the cost is the number of
non-zeros of those rows and the whole superoperator is never formed.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import scipy.sparse as sparse

from lbwork.errors import SymmetryError
from lbwork.symmetry.canonical import CanonicalTerms, local_digits
from lbwork.symmetry.monomials import MonomialMap
from lbwork.symmetry.sector_basis import digits_of, numbers_of

__all__ = [
    "LocalRows",
    "OrbitBasis",
    "assemble_block",
    "local_rows",
    "real_form",
    "sector_isometry",
]

_CHUNK_ENTRIES = 4_000_000


class OrbitBasis:
    """Representatives of a sector and the amplitudes of basis states on them.

    Parameters: a QuSpin basis, whether it has symmetry maps, number of sites, states per site.
    """

    def __init__(self, basis: Any, mapped: bool, sites: int, base: int) -> None:
        self._basis = basis
        self._mapped = mapped
        self.sites = sites
        self.base = base
        states = np.asarray(basis.states, dtype=np.uint64)
        self._order = np.argsort(states, kind="stable")
        self.states = states[self._order]
        self.amplitudes = self.locate(self.states)[1]

    @property
    def dimension(self) -> int:
        """Number of basis vectors of the sector."""
        return int(self.states.size)

    def locate(self, states: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Index of the orbit of each state and its amplitude there; (n,) int64, (n,) complex128.

        A state with amplitude 0 is not part of the sector; its index is then meaningless (0).
        """
        if not self._mapped:
            index = np.searchsorted(self.states, states)
            index = np.minimum(index, self.states.size - 1)
            return index, (self.states[index] == states).astype(complex)
        representatives = np.array(states, dtype=np.uint64)
        amplitudes = np.zeros(states.size, dtype=complex)
        unique, back = np.unique(representatives, return_inverse=True)
        values = np.atleast_1d(
            self._basis.get_amp(unique, out=np.zeros(unique.size, complex), mode="full_basis")
        )
        index = np.minimum(np.searchsorted(self.states, unique), self.states.size - 1)
        inside = self.states[index] == unique
        values = np.where(inside, values, 0)
        amplitudes = values[back]
        return index[back], amplitudes


@dataclass(frozen=True, eq=False)
class LocalRows:
    """One local term by rows: its diagonal and the csr arrays of the rest."""

    support: tuple[int, ...]
    diagonal: np.ndarray
    pointers: np.ndarray
    columns: np.ndarray
    values: np.ndarray


def local_rows(terms: CanonicalTerms) -> tuple[LocalRows, ...]:
    """Prepare the terms of a generator for :func:`rows_of_terms`, once for all sectors."""
    prepared = []
    for support, matrix in terms.items():
        diagonal = matrix.diagonal().copy()
        rest = sparse.csr_matrix(matrix - np.diag(diagonal))
        prepared.append(LocalRows(support, diagonal, rest.indptr, rest.indices, rest.data))
    return tuple(prepared)


def rows_of_terms(
    terms: Sequence[LocalRows], states: np.ndarray, sites: int, base: int
) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    """Non-zeros of L in the rows ``states``: (row positions, column states, values, diagonal).

    The diagonal, complex (n,), comes apart since it needs no look-up; the other three, unsorted,
    are off the diagonal. The identity component of L is not among ``terms``.
    """
    digits = digits_of(states, sites, base)
    diagonal = np.zeros(states.size, dtype=complex)
    nothing = np.zeros(0, dtype=np.int64)
    parts = [(nothing, nothing.astype(np.uint64), nothing.astype(complex))]
    for term in terms:
        count = len(term.support)
        powers = base ** np.arange(count - 1, -1, -1)
        local_of = digits[:, list(term.support)]
        local = local_of @ powers
        diagonal += term.diagonal[local]
        if term.values.size == 0:
            continue
        weights = np.array([base ** (sites - 1 - site) for site in term.support], dtype=np.int64)
        rest = states.astype(np.int64) - local_of @ weights
        placed = local_digits(base, count) @ weights
        lengths = np.diff(term.pointers)[local]
        rows = np.repeat(np.arange(states.size), lengths)
        within = np.arange(rows.size) - np.repeat(np.cumsum(lengths) - lengths, lengths)
        entries = term.pointers[local][rows] + within
        columns = rest[rows] + placed[term.columns[entries]]
        parts.append((rows, columns.astype(np.uint64), term.values[entries]))
    rows, columns, values = (np.concatenate(arrays) for arrays in zip(*parts, strict=True))
    return rows, columns, values, diagonal


def entry_scale(terms: Sequence[LocalRows]) -> float:
    """Largest modulus of an entry of the local terms, 1 for the zero generator."""
    sizes = [float(np.abs(part).max(initial=0)) for t in terms for part in (t.diagonal, t.values)]
    return max(sizes, default=1.0)


def _entries_per_row(terms: Sequence[LocalRows]) -> int:
    """Largest possible number of non-zeros that all terms together put into one row."""
    return 1 + sum(int(np.diff(term.pointers).max()) for term in terms)


def assemble_block(
    terms: Sequence[LocalRows], constant: complex, orbit_basis: OrbitBasis
) -> sparse.csr_matrix:
    """Complex sector matrix B with ``L V = V B``; ``constant`` is the identity component of L."""
    dimension = orbit_basis.dimension
    step = max(_CHUNK_ENTRIES // _entries_per_row(terms), 1)
    slabs, diagonals = [], []
    for begin in range(0, dimension, step):
        states = orbit_basis.states[begin : begin + step]
        rows, columns, values, diagonal = rows_of_terms(
            terms, states, orbit_basis.sites, orbit_basis.base
        )
        diagonals.append(diagonal)
        index, amplitudes = orbit_basis.locate(columns)
        entries = values * amplitudes / orbit_basis.amplitudes[begin + rows]
        slabs.append(
            sparse.csr_matrix(
                (entries, (rows, index)), shape=(states.size, dimension), dtype=complex
            )
        )
    block = sparse.csr_matrix(sparse.vstack(slabs, format="csr"))
    block = block + sparse.diags_array(constant + np.concatenate(diagonals), format="csr")
    block.data[np.abs(block.data) < 1e-15 * entry_scale(terms)] = 0
    block.eliminate_zeros()
    block.sort_indices()
    return block


def antilinear_action(
    operation: MonomialMap, orbit_basis: OrbitBasis
) -> tuple[np.ndarray, np.ndarray]:
    """Action ``A e_r = phase_r e_{image_r}`` of an antilinear symmetry on the sector's basis."""
    digits = digits_of(orbit_basis.states, orbit_basis.sites, orbit_basis.base)
    moved, signs = operation.apply(digits)
    index, amplitudes = orbit_basis.locate(numbers_of(moved, orbit_basis.base))
    if np.any(amplitudes == 0):
        raise SymmetryError("an antilinear symmetry leads out of its sector")
    return index, orbit_basis.amplitudes.conj() * signs / amplitudes


def real_form(
    block: sparse.csr_matrix, operation: MonomialMap, orbit_basis: OrbitBasis, scale: float
) -> tuple[sparse.csr_matrix, sparse.csr_matrix]:
    """Real matrix ``U^dag B U`` and the unitary U whose columns an antilinear symmetry fixes.

    Needs ``A B = B A`` with ``A**2 = 1``: columns are ``(e_r + A e_r)/sqrt 2``,
    ``i (e_r - A e_r)/sqrt 2`` for pairs and ``sqrt(phase) e_r`` for single states. ``scale`` is the
    size of the generator's entries, against which imaginary parts are judged: a block may vanish.
    Raises SymmetryError when the result is not real.
    """
    image, phase = antilinear_action(operation, orbit_basis)
    dimension = orbit_basis.dimension
    indices = np.arange(dimension)
    single = indices[image == indices]
    first = indices[image > indices]
    second = image[first]
    half = np.sqrt(0.5)
    rows = np.concatenate([single, first, second, first, second])
    columns = np.concatenate([single, first, first, second, second])
    values = np.concatenate(
        [
            np.exp(0.5j * np.angle(phase[single])),
            np.full(first.size, half),
            half * phase[first],
            np.full(first.size, 1j * half),
            -1j * half * phase[first],
        ]
    )
    unitary = sparse.csr_matrix((values, (rows, columns)), shape=(dimension, dimension))
    rotated = (unitary.conj().T @ block @ unitary).tocsr()
    imaginary = float(np.abs(rotated.data.imag).max(initial=0.0))
    if imaginary > 1e-11 * scale:
        raise SymmetryError(
            f"a sector that should be real has imaginary entries of relative size "
            f"{imaginary / scale:.1e}"
        )
    real = sparse.csr_matrix(
        (np.ascontiguousarray(rotated.data.real), rotated.indices, rotated.indptr),
        shape=rotated.shape,
    )
    real.data[np.abs(real.data) < 1e-15 * scale] = 0
    real.eliminate_zeros()
    real.sort_indices()
    return real, unitary


def sector_isometry(orbit_basis: OrbitBasis, states: np.ndarray) -> sparse.csr_matrix:
    """Columns are the sector's basis vectors on the doubled chain: csr (base**L, n).

    ``states`` are all basis states with the sector's charges.
    """
    index, amplitudes = orbit_basis.locate(states)
    inside = amplitudes != 0
    return sparse.csr_matrix(
        (amplitudes[inside], (states[inside].astype(np.int64), index[inside])),
        shape=(orbit_basis.base**orbit_basis.sites, orbit_basis.dimension),
    )


def check_block(
    terms: Sequence[LocalRows],
    constant: complex,
    block: sparse.csr_matrix,
    orbit_basis: OrbitBasis,
    images: Sequence[MonomialMap],
) -> float:
    """Largest sampled mismatch of ``L V x = V B x`` relative to the generator for a seeded x.

    Rows of L at a few states other than the representatives are evaluated directly; ``images`` are
    the operations that produce them.
    """
    generator = np.random.default_rng(20240611)
    dimension = orbit_basis.dimension
    vector = generator.normal(size=dimension) + 1j * generator.normal(size=dimension)
    product = block @ vector
    # The generator's own size counts: on a steady sector the product vanishes.
    scale = max(float(np.abs(product).max(initial=0.0)), entry_scale(terms))
    chosen = generator.choice(dimension, size=min(dimension, 24), replace=False)
    digits = digits_of(orbit_basis.states[chosen], orbit_basis.sites, orbit_basis.base)
    worst = 0.0
    for operation in images:
        states = numbers_of(operation.apply(digits)[0], orbit_basis.base)
        index, amplitudes = orbit_basis.locate(states)
        rows, columns, values, diagonal = rows_of_terms(
            terms, states, orbit_basis.sites, orbit_basis.base
        )
        result = (constant + diagonal) * amplitudes * vector[index]
        column_index, column_amplitudes = orbit_basis.locate(columns)
        contribution = values * column_amplitudes * vector[column_index]
        result += np.bincount(rows, contribution.real, states.size)
        result += 1j * np.bincount(rows, contribution.imag, states.size)
        mismatch = np.abs(result - amplitudes * product[index])
        worst = max(worst, float(mismatch.max(initial=0.0)) / scale)
    return worst
