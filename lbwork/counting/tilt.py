"""What is counted, as derivatives of the tilted generator with respect to the counting field.

Jumps: ``L_chi = L + sum_k (exp(chi nu_k) - 1) g_k l_k . l_k^dag`` with weights nu_k. A bond:
``L_chi`` has every local term T that straddles the bond replaced by ``exp(chi M) T exp(-chi M)``
with ``M rho = (m rho + rho m)/2`` and m the magnetisation of the term's sites to the right of the
bond, so that what crosses the bond to the right is counted, whether coherently or by jumps.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from lbwork.errors import ModelError, UsageError
from lbwork.generator import SuperTerm, superoperator_terms
from lbwork.iterative.local_form import sorted_sites, turned_operator
from lbwork.iterative.sandwiches import LocalTerm
from lbwork.model import Model
from lbwork.observables.local import local_magnetisation

__all__ = ["Tilt", "bond_tilt", "jump_tilt", "local_terms"]


@dataclass(frozen=True, eq=False)
class Tilt:
    """``name``: what is counted. ``terms``: local superoperators (interleaved ket and bra digits)
    with the generator ``G`` of the tilt: the n-th derivative at zero field is ``ad_G^n T`` for a
    bond; for jumps ``nu^n T``."""

    name: str
    terms: tuple[tuple[SuperTerm, np.ndarray | float], ...]

    def derivative(self, order: int) -> tuple[SuperTerm, ...]:
        """The terms of ``d^n L_chi / d chi^n`` at chi = 0, n >= 1."""
        found = []
        for term, weight in self.terms:
            matrix = term.matrix
            if isinstance(weight, float):
                matrix = weight**order * matrix
            else:
                matrix = (weight[:, None] - weight[None, :]) ** order * matrix
            found.append(SuperTerm(term.sites, matrix))
        return tuple(found)

    def difference(self, field: float) -> tuple[SuperTerm, ...]:
        """The terms of ``L_chi - L``."""
        found = []
        for term, weight in self.terms:
            if isinstance(weight, float):
                matrix = np.expm1(field * weight) * term.matrix
            else:
                matrix = np.expm1(field * (weight[:, None] - weight[None, :])) * term.matrix
            found.append(SuperTerm(term.sites, matrix))
        return tuple(found)


def jump_tilt(model: Model, weights: Mapping[int, float]) -> Tilt:
    """Count jumps: ``weights[n]`` is added whenever a jump of the model's entry n (from 1) fires.

    Raises UsageError for an entry that the model does not have, or weights that are all zero.
    """
    entries = len(model.jumps)
    for number, weight in weights.items():
        if not 1 <= number <= entries:
            raise UsageError(
                f"jump {number} is not one of the {entries} jump entries of {model.name}"
            )
        if not np.isfinite(weight):
            raise UsageError(f"weight {weight} of jump {number} is not a number")
    chosen = {number: float(weight) for number, weight in weights.items() if weight}
    if not chosen:
        raise UsageError("nothing is counted; give at least one jump a weight that is not zero")
    terms: list[tuple[SuperTerm, np.ndarray | float]] = []
    dimension = model.local_dimension
    for jump in model.placed_jumps():
        if jump.number in chosen:
            matrix = jump.rate * _doubled(jump.matrix, len(jump.sites), dimension)
            terms.append((SuperTerm(jump.sites, matrix), chosen[jump.number]))
    words = ", ".join(f"{weight:+g} for jump {number}" for number, weight in chosen.items())
    return Tilt(words, tuple(terms))


def _doubled(jump: np.ndarray, count: int, dimension: int) -> np.ndarray:
    """``l kron l*`` with ket and bra digits interleaved site by site."""
    tensor = np.kron(jump, jump.conj()).reshape((dimension,) * (4 * count))
    order = [axis for site in range(count) for axis in (site, count + site)]
    tensor = tensor.transpose([*order, *(2 * count + axis for axis in order)])
    return np.asarray(tensor.reshape((dimension ** (2 * count),) * 2))


def bond_tilt(model: Model, bond: int) -> Tilt:
    """Count the magnetisation that crosses a bond (from 1) of an open chain to the right.

    Raises UsageError for a bond that the chain does not have, ModelError on rings, where a current
    that goes around has no two sides.
    """
    if model.boundary == "periodic":
        raise ModelError(
            f"{model.name} is a ring; count jumps instead, a bond of a ring has no two sides"
        )
    if not 1 <= bond < model.sites:
        raise UsageError(f"bond {bond} is not one of the bonds 1..{model.sites - 1}")
    dimension = model.local_dimension
    values = local_magnetisation(dimension)
    both = (values[:, None] + values[None, :]).ravel() / 2
    terms: list[tuple[SuperTerm, np.ndarray | float]] = []
    for term in superoperator_terms(model):
        if not min(term.sites) < bond <= max(term.sites):
            continue
        weight = np.zeros(1)
        for site in term.sites:
            local = both if site >= bond else np.zeros(dimension**2)
            weight = (weight[:, None] + local[None, :]).ravel()
        terms.append((term, weight))
    return Tilt(f"magnetisation across bond {bond}", tuple(terms))


def local_terms(
    terms: tuple[SuperTerm, ...], rotation: np.ndarray | None, dimension: int
) -> list[LocalTerm]:
    """Superoperators as ``M[a, b, a', b']`` on sorted sites, in the basis of the charges."""
    gathered: dict[tuple[int, ...], np.ndarray] = {}
    for term in terms:
        count = len(term.sites)
        tensor = term.matrix.reshape((dimension,) * (4 * count))
        kets, bras = list(range(0, 2 * count, 2)), list(range(1, 2 * count, 2))
        order = [*kets, *bras, *(2 * count + axis for axis in kets)]
        order += [2 * count + axis for axis in bras]
        size = dimension**count
        matrix = tensor.transpose(order).reshape(size**2, size**2)
        turn = turned_operator(rotation, term.sites, dimension)
        if turn is not None:
            full = np.kron(turn, turn.conj())
            matrix = full.conj().T @ matrix @ full
        position = [int(index) for index in np.argsort(term.sites)]
        axes = [*position, *(count + index for index in position)]
        tensor = matrix.reshape((dimension,) * (4 * count))
        tensor = tensor.transpose([*axes, *(2 * count + axis for axis in axes)])
        support = sorted_sites(term.sites)
        ordered = np.ascontiguousarray(tensor).reshape((size,) * 4)
        ordered[np.abs(ordered) < 1e-14 * np.abs(ordered).max(initial=0.0)] = 0
        gathered[support] = gathered[support] + ordered if support in gathered else ordered
    return list(gathered.items())
