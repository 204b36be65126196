"""The magnetisation current per bond from the continuity equation.

Every term acts on consecutive sites. Where it conserves their total magnetisation it moves
magnetisation across the bonds inside its support: the flow across one of them is what the adjoint
of the term does to the magnetisation of its sites to the right of that bond. One-site terms are
sources. So ``d<m_j>/dt = j_{j-1} - j_j + s_j`` holds term by term, for any range, open or ring.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from lbwork import defaults
from lbwork.errors import UsageError
from lbwork.generator import Lindbladian
from lbwork.model import Model
from lbwork.observables.local import local_magnetisation, reduced_density

__all__ = ["Currents", "continuity_error", "spin_currents"]


@dataclass(frozen=True, eq=False)
class Currents:
    """Current per bond (L-1,) or (L,) on a ring, positive to the right, and sources (L,).

    ``current`` is None where some term does not conserve the magnetisation; ``reason`` names it.
    """

    current: np.ndarray | None
    sources: np.ndarray
    reason: str


def _adjoint_terms(model: Model) -> Iterator[tuple[tuple[int, ...], list[np.ndarray], list]]:
    """Hamiltonian parts and jumps grouped by the sites they act on, in order."""
    grouped: dict[tuple[int, ...], tuple[list[np.ndarray], list[tuple[np.ndarray, float]]]] = {}
    for term in model.placed_hamiltonian():
        grouped.setdefault(term.sites, ([], []))[0].append(term.matrix)
    for jump in model.placed_jumps():
        grouped.setdefault(jump.sites, ([], []))[1].append((jump.matrix, jump.rate))
    for sites, (operators, jumps) in grouped.items():
        yield sites, operators, jumps


def _adjoint(
    operators: list[np.ndarray], jumps: list[tuple[np.ndarray, float]], observable: np.ndarray
) -> np.ndarray:
    """``i[h, A] + sum g (l^dag A l - 1/2 {l^dag l, A})`` on the support of the terms."""
    result = np.zeros_like(observable, dtype=complex)
    for operator in operators:
        result += 1j * (operator @ observable - observable @ operator)
    for operator, rate in jumps:
        dagger = operator.conj().T
        decay = dagger @ operator
        result += rate * (
            dagger @ observable @ operator - (decay @ observable + observable @ decay) / 2
        )
    return result


def _partial_magnetisation(dimension: int, width: int, first: int) -> np.ndarray:
    """``sum_{u >= first} m_u`` on ``width`` sites, as a diagonal (d^k, d^k) matrix."""
    values = local_magnetisation(dimension)
    states = np.arange(dimension**width)
    total = np.zeros(states.size)
    for position in range(first, width):
        total += values[states // dimension ** (width - 1 - position) % dimension]
    return np.diag(total)


def spin_currents(model: Model, density: np.ndarray) -> Currents:
    """Magnetisation current and sources of a density matrix (D, D), steady or not."""
    count, dimension = model.sites, model.local_dimension
    bonds = count if model.boundary == "periodic" else count - 1
    current, sources = np.zeros(bonds), np.zeros(count)
    for sites, operators, jumps in _adjoint_terms(model):
        width = len(sites)
        local = reduced_density(density, sites, count, dimension)
        whole = _adjoint(operators, jumps, _partial_magnetisation(dimension, width, 0))
        if width == 1:
            sources[sites[0]] += float(np.trace(local @ whole).real)
            continue
        size = sum(np.linalg.norm(item, 2) for item in operators)
        size += sum(rate * np.linalg.norm(item, 2) ** 2 for item, rate in jumps)
        if np.abs(whole).max() > defaults.CONSERVATION_TOLERANCE * size * width * dimension:
            names = ", ".join(str(site + 1) for site in sites)
            reason = f"the terms on sites {names} together do not conserve the magnetisation"
            return Currents(None, sources, reason)
        for position in range(1, width):
            right = _adjoint(operators, jumps, _partial_magnetisation(dimension, width, position))
            current[sites[position - 1]] += float(np.trace(local @ right).real)
    return Currents(current, sources, "")


def continuity_error(generator: Lindbladian, density: np.ndarray, currents: Currents) -> float:
    """``max_j |d<m_j>/dt - (j_{j-1} - j_j + s_j)|``, the left side by applying L to the state."""
    if currents.current is None:
        raise UsageError(f"no current to check: {currents.reason}")
    model = generator.model
    count, dimension = model.sites, model.local_dimension
    change = np.diagonal(generator.apply(density)).real.reshape((dimension,) * count)
    values = local_magnetisation(dimension)
    worst = 0.0
    ring = model.boundary == "periodic"
    for site in range(count):
        others = tuple(other for other in range(count) if other != site)
        rate = float(change.sum(axis=others) @ values)
        incoming = currents.current[site - 1] if site > 0 or ring else 0.0
        outgoing = currents.current[site] if site < count - 1 or ring else 0.0
        worst = max(worst, abs(rate - (incoming - outgoing + currents.sources[site])))
    return worst
