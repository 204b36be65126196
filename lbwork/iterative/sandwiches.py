"""Local superoperators on sector vectors: which rows feed which, and with what weights.

A superoperator on a few sites is ``X -> sum E(a, a') X C(a, a')^T`` over the local ket
transitions a' -> a, with the matrix ``C(a, a')[b, b'] = M[a, b, a', b']`` acting on the bra.
Entries with a = a' and b = b' multiply elements of X and are gathered in a table; the rest are, for
each row of a block, a few source rows with a list (target column, source column, weight) shared by
many rows.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from lbwork import defaults
from lbwork.errors import SymmetryError
from lbwork.iterative.space import SectorSpace

__all__ = ["LocalTerm", "Rows", "Sandwiches", "elementwise", "rows_of", "sandwiches"]

LocalTerm = tuple[tuple[int, ...], np.ndarray]
"""Sorted 0-based sites and ``M[a, b, a', b']`` of shape (d**k,) * 4."""


@dataclass(frozen=True, eq=False)
class Rows:
    """Rows of all blocks. ``ket`` (n,): sorted ket of each row; ``start``, ``length``: where its
    entries lie in the vector; ``first_bra``: sorted bra of its first entry. ``of_ket`` (D,): row of
    each sorted ket, -1 where the sector has none; ``pair`` (n,): block of each row."""

    ket: np.ndarray
    start: np.ndarray
    length: np.ndarray
    first_bra: np.ndarray
    pair: np.ndarray
    of_ket: np.ndarray


@dataclass(frozen=True, eq=False)
class Sandwiches:
    """``out[row, target] += value * x[source, origin]`` for the entries of the lists of a row.

    Contributions of row r: ``pointer[r]`` to ``pointer[r + 1]``, each a ``source`` row and a list;
    list l: ``bounds[l]`` to ``bounds[l + 1]`` of ``target``, ``origin``, ``value``.
    """

    pointer: np.ndarray
    source: np.ndarray
    list_of: np.ndarray
    bounds: np.ndarray
    target: np.ndarray
    origin: np.ndarray
    value: np.ndarray

    @property
    def empty(self) -> bool:
        """Whether there is nothing to add."""
        return self.source.size == 0

    def arrays(self) -> tuple[np.ndarray, ...]:
        """All arrays in the order of the kernels' arguments."""
        return (
            self.pointer,
            self.source,
            self.list_of,
            self.bounds,
            self.target,
            self.origin,
            self.value,
        )


def rows_of(space: SectorSpace) -> Rows:
    """The rows of a sector's blocks in the order of the vector."""
    bounds = space.groups.bounds
    kets, starts, lengths, bras, pairs = [], [], [], [], []
    for index, ((ket, bra), (count, width)) in enumerate(
        zip(space.pairs, space.shapes, strict=True)
    ):
        kets.append(np.arange(bounds[ket], bounds[ket + 1]))
        starts.append(space.offsets[index] + width * np.arange(count))
        lengths.append(np.full(count, width))
        bras.append(np.full(count, bounds[bra]))
        pairs.append(np.full(count, index))
    ket_of_row = np.concatenate(kets).astype(np.int64)
    of_ket = np.full(space.groups.order.size, -1, dtype=np.int64)
    of_ket[ket_of_row] = np.arange(ket_of_row.size)
    return Rows(
        ket_of_row,
        np.concatenate(starts).astype(np.int64),
        np.concatenate(lengths).astype(np.int64),
        np.concatenate(bras).astype(np.int64),
        np.concatenate(pairs).astype(np.int64),
        of_ket,
    )


def local_states(
    space: SectorSpace, sites: tuple[int, ...], count: int, dimension: int
) -> tuple[np.ndarray, np.ndarray]:
    """Local state of each sorted ket on ``sites``, and the sorted kets it can be exchanged for.

    Returns ``state`` (D,) and ``exchanged`` (D, d**k): the ket with the local state replaced.
    """
    order, position = space.groups.order, space.groups.position
    weights = np.array([dimension ** (count - 1 - site) for site in sites], dtype=np.int64)
    powers = dimension ** np.arange(len(sites) - 1, -1, -1)
    digits = order[:, None] // weights % dimension
    state = digits @ powers
    base = order - digits @ weights
    steps = (np.arange(dimension ** len(sites))[:, None] // powers % dimension) @ weights
    return state, position[base[:, None] + steps[None, :]]


def elementwise(
    space: SectorSpace, terms: Sequence[LocalTerm], count: int, dimension: int
) -> np.ndarray | None:
    """Table (size,) that multiplies the elements of a vector, None when it vanishes."""
    table = None
    for sites, tensor in terms:
        size = tensor.shape[0]
        diagonal = np.einsum("abab->ab", tensor)
        if not np.any(diagonal):
            continue
        state = local_states(space, sites, count, dimension)[0].astype(np.int64)
        table = np.zeros(space.size, dtype=tensor.dtype) if table is None else table
        bounds = space.groups.bounds
        for block, (ket, bra) in zip(space.blocks(table), space.pairs, strict=True):
            rows = state[bounds[ket] : bounds[ket + 1]]
            columns = state[bounds[bra] : bounds[bra + 1]]
            for local in range(size):
                block[rows == local] += diagonal[local, columns]
    return table


def sandwiches(
    space: SectorSpace, rows: Rows, terms: Sequence[LocalTerm], count: int, dimension: int
) -> Sandwiches:
    """The contributions of local terms that are not elementwise.

    Raises SymmetryError when a term leads out of the sector.
    """
    group_of, bounds = space.groups.group_of, space.groups.bounds
    bra_of = {ket: bra for ket, bra in space.pairs}
    into: list[np.ndarray] = []
    sources: list[np.ndarray] = []
    numbers: list[np.ndarray] = []
    lists: list[tuple[np.ndarray, np.ndarray, np.ndarray]] = []
    kind = np.result_type(*(tensor.dtype for _, tensor in terms)) if terms else float
    for sites, tensor in terms:
        size = tensor.shape[0]
        state, exchanged = local_states(space, sites, count, dimension)
        tiny = defaults.SYMMETRY_TOLERANCE * float(np.abs(tensor).max(initial=0.0))
        for ket, bra in space.pairs:
            kets = np.arange(bounds[ket], bounds[ket + 1])
            bras = np.arange(bounds[bra], bounds[bra + 1])
            for final in range(size):
                chosen = kets[state[kets] == final]
                if chosen.size == 0:
                    continue
                for initial in range(size):
                    weights = tensor[final, :, initial, :].copy()
                    if final == initial:
                        np.fill_diagonal(weights, 0)
                    if not np.any(weights):
                        continue
                    source = exchanged[chosen, initial]
                    source_bra = bra_of.get(int(group_of[source[0]]), -1)
                    found = _column_list(
                        weights, bras, state[bras], exchanged[bras], group_of, source_bra, tiny
                    )
                    if found is None:
                        continue
                    target, origin, value = found
                    target, origin = target - bounds[bra], origin - bounds[source_bra]
                    numbers.append(np.full(chosen.size, len(lists)))
                    lists.append((target, origin, value))
                    into.append(rows.of_ket[chosen])
                    sources.append(rows.of_ket[source])
    row_count = rows.ket.size
    if not lists:
        none = np.zeros(0, dtype=np.int64)
        pointer = np.zeros(row_count + 1, dtype=np.int64)
        return Sandwiches(pointer, none, none, none, none, none, np.zeros(0, dtype=kind))
    row = np.concatenate(into)
    order = np.argsort(row, kind="stable")
    return Sandwiches(
        pointer=np.concatenate([[0], np.cumsum(np.bincount(row, minlength=row_count))]),
        source=np.concatenate(sources)[order],
        list_of=np.concatenate(numbers)[order],
        bounds=np.concatenate([[0], np.cumsum([item[0].size for item in lists])]),
        target=np.concatenate([item[0] for item in lists]),
        origin=np.concatenate([item[1] for item in lists]),
        value=np.concatenate([item[2] for item in lists]).astype(kind),
    )


def _column_list(
    weights: np.ndarray,
    bras: np.ndarray,
    state: np.ndarray,
    exchanged: np.ndarray,
    group_of: np.ndarray,
    source_bra: int,
    tiny: float,
) -> tuple[np.ndarray, np.ndarray, np.ndarray] | None:
    """Target and source columns (sorted bras) with weights, for one local ket transition."""
    final, initial = np.nonzero(weights)
    targets, origins, values = [], [], []
    for after, before in zip(final, initial, strict=True):
        target = bras[state == after]
        if target.size == 0:
            continue
        origin = exchanged[state == after, before]
        if int(group_of[origin[0]]) != source_bra:
            if abs(weights[after, before]) <= tiny:
                continue
            raise SymmetryError(
                "a local term leads out of its charge sector; the charges found do not hold"
            )
        targets.append(target)
        origins.append(origin)
        values.append(np.full(target.size, weights[after, before]))
    if not targets:
        return None
    return np.concatenate(targets), np.concatenate(origins), np.concatenate(values)
