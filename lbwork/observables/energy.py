"""Energy currents and their continuity equation, term by term.

The energy density ``e_j`` of site j is the sum of the Hamiltonian's terms whose first site is j: a
one-site term of site j and the term of bond (j, j+1) both belong to ``e_j``; a term that wraps
around a ring belongs to the site it starts from. Terms that are Hermitian only together count with
their Hermitian parts, whose sum is H. With ``F_ik = i <[e_i, e_k]>``, the energy that
flows from density i to density k, which vanishes unless their terms overlap,

    ``d<e_j>/dt = J_(j-1) - J_j + s_j``

holds for every state, with ``s_j = sum_k g_k <l_k^dag e_j l_k - {l_k^dag l_k, e_j}/2>`` and
``J_j`` the sum of the flows that cross from densities up to j to later ones. For range 2 that is
``J_j = i <[e_j, e_(j+1)]>``; for longer terms it includes the flows that leap over a density. On a
ring each flow takes the shorter way round, so that a pair of densities half a ring apart that do
not commute leaves the current undefined.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork import defaults
from lbwork.errors import UsageError
from lbwork.generator import Lindbladian
from lbwork.generator.embedding import embed
from lbwork.model import Model
from lbwork.observables.local import reduced_density

__all__ = ["EnergyCurrents", "energy_continuity_error", "energy_currents"]

Piece = tuple[tuple[int, ...], np.ndarray]


@dataclass(frozen=True, eq=False)
class EnergyCurrents:
    """``density`` (L,): <e_j>; ``current`` (L-1,) or (L,) on a ring, positive to the right, None
    with ``reason`` where a ring is too short to tell its two ways apart; ``sources`` (L,).

    Element j - 1 of the current belongs to the flow from density j to density j + 1.
    """

    density: np.ndarray
    current: np.ndarray | None
    sources: np.ndarray
    reason: str


def _densities(model: Model) -> list[Piece]:
    """Per site the Hermitian sum of the terms that start there, on the sites of the longest."""
    terms: list[list[Piece]] = [[] for _ in range(model.sites)]
    for placed in model.placed_hamiltonian():
        terms[placed.sites[0]].append((placed.sites, placed.matrix))
    found = []
    for site, pieces in enumerate(terms):
        # Sites follow each other (around a ring), so that the longest support holds the others.
        sites = max((where for where, _ in pieces), key=len, default=(site,))
        total = np.zeros((model.local_dimension ** len(sites),) * 2, dtype=complex)
        for where, matrix in pieces:
            rest = model.local_dimension ** (len(sites) - len(where))
            total += np.kron(matrix, np.eye(rest))
        found.append((sites, (total + total.conj().T) / 2))
    return found


def _on_union(
    first: Piece, second: Piece, dimension: int
) -> tuple[tuple[int, ...], np.ndarray, np.ndarray]:
    """Both operators as dense matrices on the union of their sites."""
    sites = tuple(sorted({*first[0], *second[0]}))
    place = {site: position for position, site in enumerate(sites)}
    one, other = (
        embed(matrix, tuple(place[site] for site in where), len(sites), dimension).toarray()
        for where, matrix in (first, second)
    )
    return sites, one, other


def _flow_operator(first: Piece, second: Piece, dimension: int) -> Piece | None:
    """``i [e_i, e_k]`` on the union of the sites; None where the densities commute."""
    if not set(first[0]) & set(second[0]):
        return None
    sites, one, other = _on_union(first, second, dimension)
    product = one @ other
    # Both are Hermitian: the product backwards is its adjoint.
    commutator = product - product.conj().T
    scale = float(np.linalg.norm(one) * np.linalg.norm(other))
    if np.linalg.norm(commutator) <= defaults.CONSERVATION_TOLERANCE * scale:
        return None
    return sites, 1j * commutator


def energy_currents(model: Model, density: np.ndarray) -> EnergyCurrents:
    """Energy densities, currents and sources of a density matrix (D, D), steady or not.

    Only reduced density matrices on the sites of two overlapping terms are formed. Raises
    UsageError when the shape is not that of the model's states.
    """
    count, dimension = model.sites, model.local_dimension
    pieces = _densities(model)
    cache: dict[tuple[int, ...], np.ndarray] = {}

    def mean(sites: tuple[int, ...], operator: np.ndarray) -> float:
        if sites not in cache:
            cache[sites] = reduced_density(density, sites, count, dimension)
        return float(np.sum(cache[sites] * operator.T).real)

    values, sources = np.zeros(count), np.zeros(count)
    for site, piece in enumerate(pieces):
        values[site] = mean(*piece)
        for jump in model.placed_jumps():
            if not set(jump.sites) & set(piece[0]):
                continue
            sites, energy, operator = _on_union(piece, (jump.sites, jump.matrix), dimension)
            dagger = operator.conj().T
            decay = dagger @ operator
            change = dagger @ energy @ operator - (decay @ energy + energy @ decay) / 2
            sources[site] += jump.rate * mean(sites, change)
    ring = model.boundary == "periodic"
    current = np.zeros(count if ring else count - 1)
    for left in range(count):
        for right in range(left + 1, count):
            operator_there = _flow_operator(pieces[left], pieces[right], dimension)
            if operator_there is None:
                continue
            flow = mean(*operator_there)
            if not ring or 2 * (right - left) < count:
                current[left:right] += flow
            elif 2 * (right - left) > count:
                current[right:] -= flow
                current[:left] -= flow
            else:
                reason = (
                    f"on a ring of {count} sites the energy densities of sites {left + 1} and "
                    f"{right + 1} exchange energy both ways round; use a longer ring"
                )
                return EnergyCurrents(values, None, sources, reason)
    return EnergyCurrents(values, current, sources, "")


def energy_continuity_error(
    generator: Lindbladian, density: np.ndarray, currents: EnergyCurrents
) -> float:
    """``max_j |d<e_j>/dt - (J_(j-1) - J_j + s_j)|``, the left side by applying L to the state.

    Absolute, in units of energy times rate. Raises UsageError where there is no current.
    """
    if currents.current is None:
        raise UsageError(f"no energy current to check: {currents.reason}")
    model = generator.model
    count, dimension = model.sites, model.local_dimension
    image = generator.apply(density)
    outgoing = currents.current
    if model.boundary == "open":
        outgoing = np.append(outgoing, 0.0)
    rates = np.array(
        [
            np.sum(reduced_density(image, sites, count, dimension) * matrix.T).real
            for sites, matrix in _densities(model)
        ]
    )
    # Element -1 is the bond that closes a ring, and nothing on an open chain.
    expected = np.roll(outgoing, 1) - outgoing + currents.sources
    return float(np.abs(rates - expected).max())
