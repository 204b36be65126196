"""Operators at their places: a term with ``on = "bonds"`` becomes one matrix per bond."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from lbwork.errors import ModelError
from lbwork.model.expressions import LocalOperator
from lbwork.model.sources import resolve_operator, scalar
from lbwork.model.terms import Jump, Term
from lbwork.model.words import shown

__all__ = ["Chain", "PlacedJump", "PlacedOperator", "place_jumps", "place_terms"]

MAX_MAGNITUDE = 1e100
"""Larger matrix entries and rates are refused, since their products overflow a double."""

MAX_ENTRIES = 4_000_000
"""Largest number of matrix entries, summed over all places of a term."""


@dataclass(frozen=True, eq=False)
class PlacedOperator:
    """An operator on given sites: 0-based ``sites`` in tensor order, complex128 ``matrix``.

    The matrix is read-only and may be shared between places.
    """

    sites: tuple[int, ...]
    matrix: np.ndarray


@dataclass(frozen=True, eq=False)
class PlacedJump:
    """A jump operator on given sites with its rate > 0; the matrix is read-only.

    ``number``: of the model's jump entry that it comes from, counted from 1.
    """

    sites: tuple[int, ...]
    matrix: np.ndarray
    rate: float
    number: int = 0


@dataclass(frozen=True)
class Chain:
    """What a term must know about the chain it is placed on."""

    sites: int
    local_dimension: int
    ring: bool
    names: Mapping[str, complex]

    def __str__(self) -> str:
        return f"this {'ring' if self.ring else 'open chain'} of {self.sites} sites"


@dataclass(frozen=True, eq=False)
class _At:
    """One place of a term: sites, matrix with its coefficient, and what its rate must know."""

    sites: tuple[int, ...]
    matrix: np.ndarray
    index: int
    count: int


def place_terms(chain: Chain, terms: Sequence[Term]) -> tuple[tuple[int, PlacedOperator], ...]:
    """Pairs (1-based number of the term, placed operator); zero coefficients are left out."""
    return tuple(
        (number, PlacedOperator(at.sites, at.matrix))
        for number, term in enumerate(terms, start=1)
        for at in _spread(chain, term, f"hamiltonian term {number}")
        if at.matrix.any()
    )


def place_jumps(chain: Chain, jumps: Sequence[Jump]) -> tuple[PlacedJump, ...]:
    """Placed jumps; those with zero rate or zero matrix are left out."""
    placed = []
    for number, jump in enumerate(jumps, start=1):
        for at in _spread(chain, jump, f"jump {number}"):
            rate = _rate(chain, jump, at, f"jump {number}: rate")
            if rate > 0 and at.matrix.any():
                placed.append(PlacedJump(at.sites, at.matrix, rate, number))
    return tuple(placed)


def _spread(chain: Chain, item: Term | Jump, place: str) -> Iterator[_At]:
    operator = resolve_operator(item.operator, chain.local_dimension, chain.names, place)
    firsts = _first_sites(chain, item, operator.count, place)
    if operator.matrix.size * len(firsts) > MAX_ENTRIES:
        raise ModelError(
            f"{place}: {len(firsts)} matrices of size {operator.matrix.shape[0]} have more than "
            f"{MAX_ENTRIES} entries; use a shorter chain or an operator on fewer sites"
        )
    _check_list(item.coefficient, len(firsts), f"{place}: coefficient")
    scaled: dict[complex, np.ndarray] = {}
    for index, first in enumerate(firsts):
        sites = tuple((first + offset) % chain.sites for offset in range(operator.count))
        value = _value(chain, item.coefficient, index, first, f"{place}: coefficient")
        if value not in scaled:
            scaled[value] = _scaled(operator, value, place)
        yield _At(sites, scaled[value], index, len(firsts))


def _scaled(operator: LocalOperator, value: complex, place: str) -> np.ndarray:
    with np.errstate(all="ignore"):
        matrix = value * operator.matrix
    # Written so that a NaN from an overflow is refused as well.
    if not np.all(np.abs(matrix) <= MAX_MAGNITUDE):
        raise ModelError(
            f"{place}: an entry of coefficient times operator is larger than {MAX_MAGNITUDE:g}; "
            "rescale the units"
        )
    matrix.setflags(write=False)
    return matrix


def _check_list(value: Any, count: int, place: str) -> None:
    if isinstance(value, tuple) and len(value) != count:
        raise ModelError(
            f"{place}: {len(value)} values for {count} places; give one per place or a single one"
        )


def _value(chain: Chain, value: Any, index: int, first: int, place: str) -> complex:
    entry = value[index] if isinstance(value, tuple) else value
    return scalar(entry, {**chain.names, "j": complex(first + 1)}, place)


def _rate(chain: Chain, jump: Jump, at: _At, place: str) -> float:
    _check_list(jump.rate, at.count, place)
    value = _value(chain, jump.rate, at.index, at.sites[0], place)
    where = f"{place} {shown(value)} at place {at.sites[0] + 1}"
    if abs(value.imag) > 1e-14 * abs(value):
        raise ModelError(f"{where} is complex; a rate is a real number >= 0")
    if value.real < 0:
        raise ModelError(
            f"{where} is negative; a rate is >= 0 (put signs and phases into the coefficient)"
        )
    if value.real > MAX_MAGNITUDE:
        raise ModelError(f"{where} is larger than {MAX_MAGNITUDE:g}; rescale the units")
    return value.real


def _first_sites(chain: Chain, item: Term | Jump, count: int, place: str) -> list[int]:
    """0-based first sites of all places of an operator on ``count`` sites."""
    if count > chain.sites:
        raise ModelError(
            f"{place}: an operator on {count} sites does not fit on {chain.sites} site(s); use a "
            "longer chain"
        )
    # A one-site operator has a last site on a ring as well; a longer one wraps around there.
    last = chain.sites - 1 if chain.ring and count > 1 else chain.sites - count
    if isinstance(item.on, str):
        wanted = {"sites": 1, "bonds": 2, "triples": 3}.get(item.on, count)
        if wanted != count:
            raise ModelError(
                f"{place}: on = '{item.on}' needs an operator on {wanted} site(s), not on "
                f"{count}; use on = 'all' for every place where it fits"
            )
        if item.on == "first":
            return [0]
        return [last] if item.on == "last" else list(range(last + 1))
    for number in item.on:
        if not 1 <= number <= last + 1:
            raise ModelError(
                f"{place}: place {shown(number)} is outside 1 to {last + 1} on {chain}; choose "
                "the number of the operator's first site in that range"
            )
    return [number - 1 for number in item.on]
