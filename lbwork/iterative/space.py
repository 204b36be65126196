"""Where operators of one charge difference live: dense blocks between groups of kets.

A sector with charge difference q holds the blocks (ket group a, bra group b) with label a - label b
= q, each ket group at most once, one after the other in a flat vector. With q = 0 the blocks are
Hermitian matrices X, stored as the real matrices ``R = Re X + Im X``: an isometry onto real
vectors, on which the generator is a real matrix. Other sectors are complex.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from lbwork.iterative.groups import KetGroups

__all__ = [
    "SectorSpace",
    "differences",
    "hermitian_from_real",
    "real_from_hermitian",
    "whole_space",
]


def real_from_hermitian(block: np.ndarray) -> np.ndarray:
    """``R = Re X + Im X`` of a Hermitian X."""
    return np.asarray(block.real + block.imag)


def hermitian_from_real(block: np.ndarray) -> np.ndarray:
    """``X = (R + R^T)/2 + i (R - R^T)/2``, complex128."""
    result = np.empty(block.shape, dtype=np.result_type(block.dtype, np.complex64))
    result.real = (block + block.T) / 2
    result.imag = (block - block.T) / 2
    return result


@dataclass(frozen=True, eq=False)
class SectorSpace:
    """``pairs``: (ket group, bra group) of each block. ``hermitian``: stored as real matrices."""

    groups: KetGroups
    difference: tuple[int, ...]
    pairs: tuple[tuple[int, int], ...]
    hermitian: bool

    @cached_property
    def shapes(self) -> tuple[tuple[int, int], ...]:
        """Shape of each block."""
        sizes = self.groups.sizes
        return tuple((int(sizes[a]), int(sizes[b])) for a, b in self.pairs)

    @cached_property
    def offsets(self) -> np.ndarray:
        """Where each block begins in the flat vector, and its end; int64 (blocks + 1,)."""
        return np.concatenate([[0], np.cumsum([rows * columns for rows, columns in self.shapes])])

    @property
    def size(self) -> int:
        """Number of entries of a vector."""
        return int(self.offsets[-1])

    @property
    def copies(self) -> int:
        """Sectors of equal spectrum up to conjugation: 1, or 2 where the adjoints are another."""
        return 1 if self.groups.mirrored(self.difference) == self.difference else 2

    @property
    def dtype(self) -> type:
        """float64 for Hermitian sectors, else complex128."""
        return np.float64 if self.hermitian else np.complex128

    def blocks(self, vector: np.ndarray) -> Iterator[np.ndarray]:
        """Views of the blocks of a vector, in the order of ``pairs``."""
        for index, shape in enumerate(self.shapes):
            yield vector[self.offsets[index] : self.offsets[index + 1]].reshape(shape)

    def kets(self, group: int) -> np.ndarray:
        """Basis states of a group."""
        return self.groups.order[self.groups.bounds[group] : self.groups.bounds[group + 1]]

    def identity(self) -> np.ndarray:
        """The identity operator on the kets of the sector, as a vector (Hermitian sectors)."""
        vector: np.ndarray = np.zeros(self.size, dtype=self.dtype)
        for block, (ket, bra) in zip(self.blocks(vector), self.pairs, strict=True):
            if ket == bra:
                np.fill_diagonal(block, 1.0)
        return vector

    def trace(self, vector: np.ndarray) -> complex:
        """Sum of the diagonal entries."""
        total = sum(
            np.trace(block)
            for block, (ket, bra) in zip(self.blocks(vector), self.pairs, strict=True)
            if ket == bra
        )
        return complex(total)

    def to_matrix(self, vector: np.ndarray) -> np.ndarray:
        """A vector as an operator, complex128 (D, D)."""
        size = self.groups.order.size
        result = np.zeros((size, size), dtype=complex)
        for block, (ket, bra) in zip(self.blocks(vector), self.pairs, strict=True):
            full = hermitian_from_real(block) if self.hermitian else block
            result[np.ix_(self.kets(ket), self.kets(bra))] = full
        return result

    def from_matrix(self, matrix: np.ndarray) -> np.ndarray:
        """The part of an operator (D, D) that lies in the sector; Hermitian where the sector is."""
        vector: np.ndarray = np.empty(self.size, dtype=self.dtype)
        for block, (ket, bra) in zip(self.blocks(vector), self.pairs, strict=True):
            part = matrix[np.ix_(self.kets(ket), self.kets(bra))]
            block[:] = real_from_hermitian(part) if self.hermitian else part
        return vector

    def with_pairs(self, chosen: Sequence[int]) -> SectorSpace:
        """The same sector cut down to some of its blocks."""
        pairs = tuple(self.pairs[index] for index in chosen)
        return SectorSpace(self.groups, self.difference, pairs, self.hermitian)


def _by_size(difference: tuple[int, ...]) -> tuple[int, tuple[int, ...]]:
    return sum(map(abs, difference)), difference


def differences(groups: KetGroups) -> list[tuple[int, ...]]:
    """All charge differences, one of each Hermitian pair (q, -q), zero first."""
    labels = groups.labels
    count, charges = labels.shape
    gaps = groups.reduced(labels[:, None, :] - labels[None, :, :]).reshape(count**2, charges)
    found: list[tuple[int, ...]] = []
    taken: set[tuple[int, ...]] = set()
    for gap in sorted(map(tuple, np.unique(gaps, axis=0).tolist()), key=_by_size):
        if groups.mirrored(gap) not in taken:
            taken.add(gap)
            found.append(gap)
    return found


def whole_space(groups: KetGroups, difference: tuple[int, ...] | None = None) -> SectorSpace:
    """All blocks with one charge difference; zero (the Hermitian sector) by default."""
    labels = groups.labels
    wanted = (0,) * labels.shape[1] if difference is None else tuple(difference)
    index = {tuple(label): number for number, label in enumerate(labels.tolist())}
    pairs = []
    for ket, label in enumerate(labels):
        bra = index.get(tuple(groups.reduced(label - np.array(wanted, dtype=np.int64)).tolist()))
        if bra is not None:
            pairs.append((ket, bra))
    return SectorSpace(groups, wanted, tuple(pairs), hermitian=not any(wanted))
