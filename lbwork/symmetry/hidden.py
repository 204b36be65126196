"""Symmetries that the chosen sectors cannot resolve, and what a user can do about them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from lbwork.symmetry.algebra import (
    GeneratorAlgebra,
    commuting_generators,
    diagonal_rank,
    superoperator_generators,
)
from lbwork.symmetry.canonical import CanonicalTerms
from lbwork.symmetry.charges import Charge

__all__ = ["UnresolvedSymmetry", "unresolved_symmetries"]


@dataclass(frozen=True)
class UnresolvedSymmetry:
    """A symmetry whose multiplets stay inside the sectors or link them.

    ``generators`` counts the independent generators that are not diagonal.
    """

    name: str
    generators: int
    description: str
    advice: str

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of the four fields."""
        return {
            "name": self.name,
            "generators": self.generators,
            "description": self.description,
            "advice": self.advice,
        }


_FIELD_ADVICE = (
    "levels come in multiplets: use only the highest-weight part (a sector minus its neighbour of "
    "higher charge), or add a weak generic field that keeps the charges"
)
_HIDDEN_ADVICE = (
    "sectors of equal charge still overlap in several multiplets: add a weak term that breaks it "
    "(a generic on-site field, or unequal rates) before reading level statistics as Poisson"
)


def _strings(charges: Sequence[Charge], dimension: int) -> list[tuple[str, np.ndarray]]:
    """On-site sign strings to try: parities of ket, bra and both that the charges imply."""
    ket, bra = np.divmod(np.arange(dimension**2), dimension)
    options = {
        "joint parity": (-1.0) ** (ket + bra),
        "ket parity": (-1.0) ** ket,
        "bra parity": (-1.0) ** bra,
    }
    kept = []
    for name, signs in options.items():
        if any(_implies(charge, signs) for charge in charges):
            kept.append((name, np.diag(signs)))
    pairs = {charge.kind for charge in charges}
    if {"strong ket", "strong bra"} <= pairs and not any(
        name == "joint parity" for name, _ in kept
    ):
        kept.insert(0, ("joint parity", np.diag(options["joint parity"])))
    return kept


def _implies(charge: Charge, signs: np.ndarray) -> bool:
    """True when ``(-1)**charge`` is the sign pattern, up to a constant on each site."""
    if charge.modulus % 2:
        return False
    pattern = (-1.0) ** charge.values
    relative = pattern * pattern[:, :1]
    return bool(np.all(relative == signs * signs[0]))


def _bulk(terms: CanonicalTerms) -> CanonicalTerms:
    """Terms whose support is contiguous: a ring cut open between its last and first site."""
    return {
        support: matrix
        for support, matrix in terms.items()
        if support[-1] - support[0] == len(support) - 1
    }


def _off_diagonal(algebra: GeneratorAlgebra | None) -> int:
    if algebra is None:
        return 0
    return algebra.dimension - diagonal_rank(algebra.elements)


def unresolved_symmetries(
    terms: CanonicalTerms,
    charges: Sequence[Charge],
    weak: GeneratorAlgebra | None,
    dimension: int,
    sublattices: int,
) -> tuple[UnresolvedSymmetry, ...]:
    """Non-Abelian on-site symmetries, then hidden ones with a parity string.

    ``terms`` are the generator in the basis in which the charges are diagonal, ``weak`` its weak
    on-site generators (basis independent count). The hidden ones are sought in the bulk of the
    chain; on a ring they hold up to a twist of the boundary.
    """
    if not terms:
        return ()
    found = []
    weak_count = 0 if weak is None else weak.dimension
    weak_rank = _torus_rank(charges, dimension)
    if weak_count > weak_rank:
        count = weak_count - weak_rank
        name = (
            "SU(2)" if weak_count == 3 else f"non-Abelian weak symmetry of dimension {weak_count}"
        )
        found.append(
            UnresolvedSymmetry(
                name, count, "on-site rotations of ket and bra together", _FIELD_ADVICE
            )
        )
    generators = superoperator_generators(dimension)
    general = commuting_generators(terms, generators, sublattices=sublattices)
    if general is None:
        found.append(
            UnresolvedSymmetry(
                "hidden symmetries not searched",
                0,
                "the linear solve for general on-site superoperators is too large here",
                "repeat on a shorter chain or with a smaller local dimension",
            )
        )
        return tuple(found)
    extra = _off_diagonal(general) - (weak_count - weak_rank if weak_count > weak_rank else 0)
    if extra > 0:
        found.append(
            UnresolvedSymmetry(
                f"{extra} off-diagonal on-site superoperators",
                extra,
                "they commute with the generator but are not of the form ket plus bra",
                _HIDDEN_ADVICE,
            )
        )
    bulk = _bulk(terms)
    if len(bulk) == 0 or any(len(support) > 2 for support in bulk):
        return tuple(found)
    for name, string in _strings(charges, dimension):
        hidden = commuting_generators(bulk, generators, string=string, sublattices=2)
        count = _off_diagonal(hidden)
        if count > 0:
            found.append(
                UnresolvedSymmetry(
                    f"hidden symmetry with {name} string",
                    count,
                    f"{count} off-diagonal generators sum_j s_1..s_(j-1) q_j, exact in the bulk",
                    _HIDDEN_ADVICE,
                )
            )
    return tuple(found)


def _torus_rank(charges: Sequence[Charge], dimension: int) -> int:
    """Number of independent U(1) charges of the weak form ``f(ket) - f(bra)``."""
    ket, bra = np.divmod(np.arange(dimension**2), dimension)
    rows = [charge.values for charge in charges if not charge.modulus]
    if not rows:
        return 0
    # A combination is weak when it equals f(ket) - f(bra); solve for the intersection of spans.
    table = np.array(
        [
            values[:2].ravel() - np.repeat(values[:2, :1], values.shape[1], 1).ravel()
            for values in rows
        ],
        dtype=float,
    )
    blocks = table.shape[1] // dimension**2
    weak = []
    for block in range(blocks):
        for level in range(1, dimension):
            pattern = np.zeros((blocks, dimension**2))
            pattern[block] = (ket == level) * 1.0 - (bra == level) * 1.0
            weak.append(pattern.ravel())
    weak_table = np.array(weak)
    rank_sum = np.linalg.matrix_rank(np.concatenate([table, weak_table]))
    return int(np.linalg.matrix_rank(table) + np.linalg.matrix_rank(weak_table) - rank_sum)
