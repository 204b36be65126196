"""Energy currents and their continuity equation, term by term.

The energy density of site j is the sum of the Hamiltonian's terms whose first site is j,
``e_j``. With ``F_ik = i <[e_i, e_k]>``, the energy that flows from density i to density k,

    ``d<e_j>/dt = J_(j-1) - J_j + s_j``

holds for every state, with ``s_j = sum_k g_k <l_k^dag e_j l_k - {l_k^dag l_k, e_j}/2>`` and
``J_j`` the sum of the flows that cross from densities up to j to later ones; on a ring each flow
takes the shorter way round.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork.generator import Lindbladian
from lbwork.generator.embedding import embed
from lbwork.model import Model
from lbwork.observables.local import reduced_density

__all__ = ["EnergyCurrents", "energy_continuity_error", "energy_currents"]

Piece = tuple[tuple[int, ...], np.ndarray]


@dataclass(frozen=True, eq=False)
class EnergyCurrents:
    """``density`` (L,): <e_j>; ``current`` (L-1,) or (L,) on a ring, positive to the right, None
    with ``reason`` where a ring is too short to tell its two ways apart; ``sources`` (L,)."""

    density: np.ndarray
    current: np.ndarray | None
    sources: np.ndarray
    reason: str


def _densities(model: Model) -> list[list[Piece]]:
    """Terms by their first site."""
    found: list[list[Piece]] = [[] for _ in range(model.sites)]
    for placed in model.placed_hamiltonian():
        found[placed.sites[0]].append((placed.sites, placed.matrix))
    return found


def _on_union(first: Piece, second: Piece, dimension: int) -> tuple[tuple[int, ...], list]:
    """Both operators as dense matrices on the union of their sites."""
    sites = tuple(sorted({*first[0], *second[0]}))
    place = {site: position for position, site in enumerate(sites)}
    matrices = [
        embed(matrix, tuple(place[site] for site in where), len(sites), dimension).toarray()
        for where, matrix in (first, second)
    ]
    return sites, matrices


def energy_currents(model: Model, density: np.ndarray) -> EnergyCurrents:
    """Energy densities, currents and sources of a density matrix (D, D), steady or not."""
    count, dimension = model.sites, model.local_dimension
    pieces = _densities(model)
    cache: dict[tuple[int, ...], np.ndarray] = {}

    def mean(sites: tuple[int, ...], operator: np.ndarray) -> complex:
        if sites not in cache:
            cache[sites] = reduced_density(density, sites, count, dimension)
        return complex(np.sum(cache[sites] * operator.T))

    values, sources = np.zeros(count), np.zeros(count)
    for site, terms in enumerate(pieces):
        for piece in terms:
            values[site] += mean(*piece).real
            for jump in model.placed_jumps():
                if not set(jump.sites) & set(piece[0]):
                    continue
                sites, (energy, operator) = _on_union(piece, (jump.sites, jump.matrix), dimension)
                dagger = operator.conj().T
                decay = dagger @ operator
                change = dagger @ energy @ operator - (decay @ energy + energy @ decay) / 2
                sources[site] += jump.rate * mean(sites, change).real
    ring = model.boundary == "periodic"
    current = np.zeros(count if ring else count - 1)
    for left in range(count):
        for right in range(left + 1, count):
            flow = sum(
                (1j * mean(sites, one @ other - other @ one)).real
                for first in pieces[left]
                for second in pieces[right]
                if set(first[0]) & set(second[0])
                for sites, (one, other) in [_on_union(first, second, dimension)]
            )
            if flow == 0:
                continue
            if not ring or 2 * (right - left) < count:
                current[left:right] += flow
            elif 2 * (right - left) > count:
                current[right:] -= flow
                current[:left] -= flow
            else:
                reason = f"a ring of {count} sites has no shorter way between its energy densities"
                return EnergyCurrents(values, None, sources, reason)
    return EnergyCurrents(values, current, sources, "")


def energy_continuity_error(
    generator: Lindbladian, density: np.ndarray, currents: EnergyCurrents
) -> float:
    """``max_j |d<e_j>/dt - (J_(j-1) - J_j + s_j)|``, the left side by applying L to the state."""
    if currents.current is None:
        raise ValueError(f"no energy current to check: {currents.reason}")
    model = generator.model
    count = model.sites
    image = generator.apply(density)
    ring = model.boundary == "periodic"
    worst = 0.0
    for site, terms in enumerate(_densities(model)):
        rate = sum(
            float(
                np.sum(reduced_density(image, sites, count, model.local_dimension) * matrix.T).real
            )
            for sites, matrix in terms
        )
        incoming = currents.current[site - 1] if site > 0 or ring else 0.0
        outgoing = currents.current[site] if site < count - 1 or ring else 0.0
        worst = max(worst, abs(rate - (incoming - outgoing + currents.sources[site])))
    return worst
