"""Classical processes of particles on sites: their moves, and the Markov matrix of all of them.

A configuration is numbered like a basis state of the chain: site 1 is the most significant digit,
digit 0 is an occupied site (spin up). So the populations of a density matrix, its diagonal, are a
distribution over configurations in the same order.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import scipy.sparse as sparse

from lbwork import defaults
from lbwork.errors import CapacityError, ModelError
from lbwork.exact.arguments import checked_count, checked_finite, checked_rate
from lbwork.model import Model

__all__ = [
    "Move",
    "OccupationProcess",
    "configurations",
    "exclusion_process",
    "markov_generator",
    "occupation_process",
    "occupations",
]

MAX_CONFIGURATIONS = 2**21
"""A chain of 20 sites fits in about 1 GB."""


@dataclass(frozen=True)
class Move:
    """The digits ``before`` on 0-based ``sites`` become ``after`` at ``rate`` > 0.

    bond: the bond that the move crosses, 1..L-1 inside the chain and L on a ring, 0 for the left
    reservoir and L for the right one, None for neither. transfer: particles it takes to the right.
    """

    sites: tuple[int, ...]
    before: tuple[int, ...]
    after: tuple[int, ...]
    rate: float
    bond: int | None = None
    transfer: int = 0


@dataclass(frozen=True)
class OccupationProcess:
    """A classical Markov process on ``sites`` two-state sites with independent local moves."""

    sites: int
    moves: tuple[Move, ...]

    @property
    def conserves_particles(self) -> bool:
        """Whether no move changes the number of particles."""
        return all(sum(move.before) == sum(move.after) for move in self.moves)


def _hops(pair: tuple[int, int], bond: int, right: float, left: float) -> list[Move]:
    hops = [Move(pair, (0, 1), (1, 0), right, bond, 1), Move(pair, (1, 0), (0, 1), left, bond, -1)]
    return [move for move in hops if move.rate > 0]


def exclusion_process(
    sites: int,
    right: float = 1.0,
    left: float = 0.0,
    *,
    periodic: bool = False,
    enter_left: float = 0.0,
    leave_left: float = 0.0,
    enter_right: float = 0.0,
    leave_right: float = 0.0,
) -> OccupationProcess:
    """Exclusion with hopping rates ``right`` and ``left`` and, if open, two reservoirs.

    ``right=1, left=0`` is the totally asymmetric, ``right == left`` the symmetric process. All
    rates >= 0. Raises ModelError for bad numbers and for a ring with reservoirs or of 2 sites.
    """
    sites = checked_count("sites", sites, 3 if periodic else 1)
    right, left = checked_rate("right", right, True), checked_rate("left", left, True)
    ends = {
        "enter_left": (0, 1, 0, enter_left, 0, 1),
        "leave_left": (0, 0, 1, leave_left, 0, -1),
        "enter_right": (sites - 1, 1, 0, enter_right, sites, -1),
        "leave_right": (sites - 1, 0, 1, leave_right, sites, 1),
    }
    moves: list[Move] = []
    for name, (site, before, after, value, bond, transfer) in ends.items():
        rate = checked_rate(name, value, True)
        if rate > 0 and periodic:
            raise ModelError(f"{name} = {rate:g} on a ring, which has no ends; leave it out")
        if rate > 0:
            moves.append(Move((site,), (before,), (after,), rate, bond, transfer))
    for site in range(sites if periodic else sites - 1):
        moves += _hops((site, (site + 1) % sites), site + 1, right, left)
    return OccupationProcess(sites, tuple(moves))


def occupation_process(model: Model) -> OccupationProcess:
    """The classical process that the populations of a model follow by themselves.

    Needs spin-1/2, a diagonal Hamiltonian, and jumps that take basis states to multiples of basis
    states and different ones to different ones (``S+``, ``S- S+``, ``Z``, a permutation, ...):
    the diagonal of the density matrix is then closed under the generator whatever the coherences
    are. Raises ModelError with the reason otherwise.
    """
    if model.local_dimension != 2:
        raise ModelError(
            f"model '{model.name}': local dimension {model.local_dimension} is not 2; occupation "
            "processes have two states per site"
        )
    for term in model.placed_hamiltonian():
        rest = term.matrix - np.diag(np.diagonal(term.matrix))
        if np.abs(rest).max() > defaults.CONSERVATION_TOLERANCE * np.abs(term.matrix).max():
            raise ModelError(
                f"model '{model.name}': the Hamiltonian on site {term.sites[0] + 1} moves "
                "populations coherently; only a diagonal one gives a classical process"
            )
    moves: list[Move] = []
    for jump in model.placed_jumps():
        moves += _jump_moves(model, jump.sites, jump.matrix, jump.rate)
    return OccupationProcess(model.sites, tuple(moves))


def _jump_moves(
    model: Model, sites: tuple[int, ...], matrix: np.ndarray, rate: float
) -> list[Move]:
    large = np.abs(matrix) > defaults.CONSERVATION_TOLERANCE * np.abs(matrix).max()
    if large.sum(axis=0).max() > 1 or large.sum(axis=1).max() > 1:
        raise ModelError(
            f"model '{model.name}': the jump on site {sites[0] + 1} makes coherences out of "
            "populations; a classical process needs jumps between basis states"
        )
    width, moves = len(sites), []
    for row, column in zip(*np.nonzero(large), strict=True):
        if row == column:
            continue
        after, before = (
            tuple(int(index) >> shift & 1 for shift in range(width - 1, -1, -1))
            for index in (row, column)
        )
        strength = rate * float(abs(matrix[row, column])) ** 2
        moves.append(Move(sites, before, after, strength, *_crossing(model, sites, before, after)))
    return moves


def _crossing(
    model: Model, sites: tuple[int, ...], before: tuple[int, ...], after: tuple[int, ...]
) -> tuple[int | None, int]:
    """Bond and transfer of a move: neighbouring hops, and one-site moves at the ends."""
    # Digit 1 is an empty site.
    change = [first - last for first, last in zip(before, after, strict=True)]
    if len(sites) == 2 and sum(change) == 0:
        return sites[0] + 1, change[1]
    if len(sites) == 1 and model.boundary == "open":
        if sites[0] == 0:
            return 0, change[0]
        if sites[0] == model.sites - 1:
            return model.sites, -change[0]
    return None, 0


def configurations(process: OccupationProcess, particles: int | None = None) -> np.ndarray:
    """Numbers of the configurations, int64, ascending: all 2^L or those with ``particles``.

    Raises ModelError when ``particles`` is given and not conserved or out of range, CapacityError
    beyond 2^21 configurations.
    """
    count = process.sites
    if count > 40 or (particles is None and 2**count > MAX_CONFIGURATIONS):
        raise CapacityError(
            f"{count} sites have more than {MAX_CONFIGURATIONS} configurations; use a shorter chain"
        )
    if particles is None:
        return np.arange(2**count)
    particles = checked_count("particles", particles, 0)
    if particles > count:
        raise ModelError(f"particles = {particles} do not fit on {count} sites; give at most that")
    if not process.conserves_particles:
        raise ModelError(
            f"particles = {particles} of a process that does not conserve them; leave it out"
        )
    return _with_holes(count, count - particles)


def _with_holes(count: int, holes: int) -> np.ndarray:
    """Ascending numbers below 2^count with ``holes`` binary digits 1, by Pascal's recursion."""
    rows = [np.zeros(1, dtype=np.int64)] + [np.empty(0, dtype=np.int64)] * holes
    for site in range(count):
        rows = [
            np.concatenate([rows[k], rows[k - 1] + (1 << site)]) if k else rows[0]
            for k in range(holes + 1)
        ]
        if max(row.size for row in rows) > MAX_CONFIGURATIONS:
            raise CapacityError(
                f"{count} sites with {holes} holes have more than {MAX_CONFIGURATIONS} "
                "configurations; use a shorter chain"
            )
    return rows[holes]


def occupations(states: np.ndarray, sites: int) -> np.ndarray:
    """Occupation of each site in each configuration, float64 (states, L)."""
    return 1.0 - ((states[:, None] >> np.arange(sites - 1, -1, -1)) & 1)


def markov_generator(
    process: OccupationProcess,
    particles: int | None = None,
    *,
    field: float = 0.0,
    bond: int = 0,
) -> sparse.csr_matrix:
    """The matrix W of ``dP/dt = W P`` on :func:`configurations`, float64, columns add up to 0.

    With a counting field x, every move across ``bond`` carries ``exp(x transfer)`` outside the
    diagonal: the largest eigenvalue is then the growth rate of ``<exp(x Q)>``, where Q counts
    particles that cross the bond to the right. Raises ModelError, CapacityError.
    """
    states = configurations(process, particles)
    field = checked_finite("field", field)
    bond = checked_count("bond", bond, 0)
    if field != 0 and not any(move.bond == bond for move in process.moves):
        raise ModelError(f"bond = {bond} is crossed by no move; give one from 0 to {process.sites}")
    rows, columns, values = [], [], []
    leaving = np.zeros(states.size)
    for move in process.moves:
        shifts = [process.sites - 1 - site for site in move.sites]
        fits = np.ones(states.size, dtype=bool)
        for shift, digit in zip(shifts, move.before, strict=True):
            fits &= ((states >> shift) & 1) == digit
        step = sum(
            (new - old) << shift
            for shift, old, new in zip(shifts, move.before, move.after, strict=True)
        )
        sources = np.flatnonzero(fits)
        weight = np.exp(field * move.transfer) if move.bond == bond else 1.0
        rows.append(np.searchsorted(states, states[sources] + step))
        columns.append(sources)
        values.append(np.full(sources.size, move.rate * weight))
        leaving[sources] += move.rate
    every = np.arange(states.size)
    entries = (
        np.concatenate([*values, -leaving]),
        (np.concatenate([*rows, every]), np.concatenate([*columns, every])),
    )
    return sparse.csr_matrix(sparse.coo_matrix(entries, shape=(states.size, states.size)))
