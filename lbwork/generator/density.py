"""The two-site density of a translation-invariant generator, or of the bulk of an open chain."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from lbwork import defaults
from lbwork.errors import ModelError
from lbwork.generator.terms import SuperTerm, superoperator_terms
from lbwork.model import Model

__all__ = ["BulkDensity", "bulk_two_site_density", "two_site_density"]


@dataclass(frozen=True, eq=False)
class BulkDensity:
    """``L = sum_j q_{j,j+1} + boundary``, with the sum over all bonds of the chain.

    ``matrix``: q, complex128 (d**4, d**4), order (a1 b1 a2 b2). ``left_out``: the boundary
    superoperators, empty for a ring.
    """

    matrix: np.ndarray
    left_out: tuple[SuperTerm, ...]

    @property
    def sentence(self) -> str:
        """Where the boundary terms are, in words; sites and bonds are counted from 1."""
        if not self.left_out:
            return "nothing is left out"
        places = [
            f"{'site' if len(term.sites) == 1 else 'bond'} {term.sites[0] + 1}"
            for term in self.left_out
        ]
        return f"boundary terms are left out at {', '.join(places)}"


def _bonds_and_fields(model: Model) -> tuple[list[np.ndarray], list[np.ndarray]]:
    """Sums of the two-site terms per bond and of the one-site terms per site."""
    base = model.local_dimension**2
    bonds = [
        np.zeros((base**2, base**2), dtype=complex)
        for _ in range(model.sites if model.boundary == "periodic" else model.sites - 1)
    ]
    fields = [np.zeros((base, base), dtype=complex) for _ in range(model.sites)]
    for term in superoperator_terms(model):
        if len(term.sites) > 2:
            raise ModelError(
                f"model '{model.name}' has a term on {len(term.sites)} sites; group pairs of sites "
                "into one before asking for a two-site density"
            )
        if len(term.sites) == 1:
            fields[term.sites[0]] += term.matrix
        else:
            bonds[term.sites[0]] += term.matrix
    return bonds, fields


def _scale(matrices: Sequence[np.ndarray]) -> float:
    return max(max(float(np.abs(matrix).max()) for matrix in matrices), 1e-300)


def _require_equal(
    model: Model, kind: str, matrices: Sequence[np.ndarray], places: Sequence[int], scale: float
) -> None:
    """ModelError unless the matrices at the 0-based ``places`` agree."""
    first = places[0]
    for place in places[1:]:
        if np.abs(matrices[place] - matrices[first]).max() > defaults.GENERATOR_TOLERANCE * scale:
            raise ModelError(
                f"model '{model.name}' is not translation invariant: {kind} {place + 1} differs "
                f"from {kind} {first + 1}"
            )


def _density(bond: np.ndarray, field: np.ndarray) -> np.ndarray:
    one = np.eye(field.shape[0])
    return np.asarray(bond + 0.5 * (np.kron(field, one) + np.kron(one, field)))


def two_site_density(model: Model) -> np.ndarray:
    """Superoperator ``q`` with ``L = sum_j q_{j,j+1}``: complex (d**4, d**4), order (a1 b1 a2 b2).

    One-site terms are shared equally between the two bonds of their site. The model must be a
    translation-invariant ring of range at most 2; ModelError says what it has instead.
    """
    if model.boundary != "periodic":
        raise ModelError(
            f"model '{model.name}' is an open chain; a two-site density needs a ring "
            "(boundary = periodic), or ask for the density of its bulk"
        )
    bonds, fields = _bonds_and_fields(model)
    scale = _scale([*bonds, *fields])
    _require_equal(model, "bond", bonds, range(model.sites), scale)
    _require_equal(model, "site", fields, range(model.sites), scale)
    return _density(bonds[0], fields[0])


def bulk_two_site_density(model: Model) -> BulkDensity:
    """The density of the bulk, with the boundary terms that it leaves out.

    A ring gives :func:`two_site_density` and leaves nothing out. On an open chain the bulk is the
    one-site terms of sites 2..L-1 and the bonds 2..L-2 (both bonds for L = 3); each must be the
    same at every place, else ModelError. What remains at the ends is left out, so that the sum of
    q over all bonds and of the terms left out is L; that includes the half of a uniform one-site
    term that the missing bond outside an end would carry. ModelError for fewer than 3 sites or a
    range above 2.
    """
    if model.boundary == "periodic":
        return BulkDensity(two_site_density(model), ())
    if model.sites < 3:
        raise ModelError(
            f"model '{model.name}' has {model.sites} sites and no bulk; use at least 3 sites"
        )
    bonds, fields = _bonds_and_fields(model)
    scale = _scale([*bonds, *fields])
    last = model.sites - 1
    inner = range(1, last - 1) if model.sites > 3 else range(last)
    _require_equal(model, "bond", bonds, inner, scale)
    _require_equal(model, "site", fields, range(1, last), scale)
    bond, field = bonds[inner[0]], fields[1]
    remainders = [
        SuperTerm((0,), fields[0] - 0.5 * field),
        SuperTerm((last,), fields[last] - 0.5 * field),
        SuperTerm((0, 1), bonds[0] - bond),
        SuperTerm((last - 1, last), bonds[last - 1] - bond),
    ]
    left_out = tuple(
        term
        for term in remainders
        if np.abs(term.matrix).max() > defaults.GENERATOR_TOLERANCE * scale
    )
    return BulkDensity(_density(bond, field), left_out)
