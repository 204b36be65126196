"""All levels and the gap of a quadratic chain, for operators of even and of odd parity.

T. Prosen, New J. Phys. 10, 043026 (2008). An operator is even or odd under ``P A P``,
``P = Z_1 ... Z_L``; the generator keeps the two kinds apart. Even operators: minus the sums of an
even number of rapidities. Odd operators: minus the sums of an odd number, when all jumps are of one
kind (at the first site, or at the last). With both kinds, P in the jumps at the last site changes
the sign of their ``l rho l^dag`` on odd operators relative to the others, and a second set of
numbers takes over (derived here, checked against dense generators):

with ``L_m rho = w_m rho`` and ``Q_m rho = i (P rho P) w_m``, 4L anticommuting operators c, c^2 = 1,
the generator is ``c^T S c / 4 - tr N`` with antisymmetric S. Its eigenvalues are pairs +-nu, its
levels ``-tr N + sum_j (+-nu_j)/2``, and the sign of the Pfaffian of S tells which half of them is
odd.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations

import numpy as np
import numpy.typing as npt

from lbwork import defaults
from lbwork.errors import CapacityError, ModelError
from lbwork.exact.majorana import QuadraticChain
from lbwork.exact.quadratic import rapidities

__all__ = ["QuadraticGap", "QuadraticLevels", "quadratic_gap", "quadratic_levels"]

MAX_LEVEL_SITES = 8
MAX_ODD_SITES = 250
MAX_UNDAMPED = 12


@dataclass(frozen=True, eq=False)
class QuadraticLevels:
    """All 4^L eigenvalues of the generator: half on even, half on odd operators, complex."""

    even: npt.NDArray[np.complex128]
    odd: npt.NDArray[np.complex128]


@dataclass(frozen=True)
class QuadraticGap:
    """Slowest decay rates that are not zero modes.

    gap: the smaller of even_gap (operators of even parity: all magnetisations, currents and
    correlations of two of the same kind) and odd_gap, which is None (and left out of gap) for long
    chains with jumps at both ends. zero_modes: on even operators.
    """

    gap: float
    even_gap: float
    odd_gap: float | None
    zero_modes: int


def _sums(numbers: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Sums over all subsets of even and of odd size, complex (2^(n-1),) each."""
    even, odd = np.zeros(1, dtype=complex), np.zeros(0, dtype=complex)
    for number in numbers:
        even, odd = np.concatenate([even, odd + number]), np.concatenate([odd, even + number])
    return even, odd


def _both_ends(chain: QuadraticChain) -> bool:
    return bool(chain.left.any() and chain.right.any())


def _odd_structure(chain: QuadraticChain) -> np.ndarray:
    """S on odd operators, complex antisymmetric (4L, 4L)."""
    left = chain.left.conj().T @ chain.left
    right = chain.right.conj().T @ chain.right
    twist = 2j * (left + right).imag
    jumps = -2j * (right - left).conj()
    return np.block([[chain.hamiltonian - twist, jumps], [-jumps.T, chain.hamiltonian + twist]])


def _positive_half(structure: np.ndarray) -> np.ndarray:
    """One of each pair +-nu: those on the right of the imaginary axis, or above zero on it."""
    values = np.linalg.eigvals(structure)
    limit = defaults.GENERATOR_TOLERANCE * np.abs(values).max()
    real = np.where(np.abs(values.real) > limit, values.real, 0.0)
    order = np.lexsort((values.imag, real))
    return np.asarray(values[order[values.size // 2 :]])


def _pfaffian_phase(matrix: np.ndarray) -> complex:
    """Phase of the Pfaffian of an antisymmetric matrix (2n, 2n), 0 where it vanishes.

    Elimination of two rows at a time with pivoting (B. Parlett, J. Reid, BIT 10, 386 (1970)).
    """
    work = np.array(matrix, dtype=complex)
    size, phase = work.shape[0], 1 + 0j
    for k in range(0, size, 2):
        pivot = k + 1 + int(np.argmax(np.abs(work[k, k + 1 :])))
        if pivot != k + 1:
            work[[k + 1, pivot]] = work[[pivot, k + 1]]
            work[:, [k + 1, pivot]] = work[:, [pivot, k + 1]]
            phase = -phase
        value = work[k, k + 1]
        if value == 0:
            return 0j
        phase *= value / abs(value)
        column = work[k, k + 2 :] / value
        row = work[k + 1, k + 2 :].copy()
        work[k + 2 :, k + 2 :] += np.outer(row, column) - np.outer(column, row)
    return phase


def _odd_numbers(chain: QuadraticChain) -> tuple[np.ndarray, float, bool]:
    """nu (2L,), the decay rate of the level with all signs +, and whether that level is odd."""
    structure = _odd_structure(chain)
    numbers = _positive_half(structure)
    rate = float(np.trace(chain.bath()).real - numbers.sum().real / 2)
    size = 2 * chain.sites
    phase = _pfaffian_phase(structure) / np.prod(numbers / np.abs(numbers))
    # Reference: uniform damping without H has all nu = 1 and an even level with all signs +.
    reference = (-1) ** (size * (size - 1) // 2) * (-1j) ** size
    return numbers, rate, bool((phase / reference).real < 0)


def quadratic_levels(chain: QuadraticChain) -> QuadraticLevels:
    """The whole spectrum of the generator, for chains of up to 8 sites.

    Raises CapacityError beyond. Prosen (2008).
    """
    if chain.sites > MAX_LEVEL_SITES:
        raise CapacityError(
            f"{chain.sites} sites have 4^{chain.sites} levels; use up to {MAX_LEVEL_SITES} sites, "
            "or the rapidities"
        )
    even, odd = _sums(rapidities(chain))
    if not _both_ends(chain):
        return QuadraticLevels(-even, -odd)
    numbers = _odd_numbers(chain)
    flipped = _sums(numbers[0])
    start = numbers[0].sum() / 2 - np.trace(chain.bath()).real
    return QuadraticLevels(-even, start - flipped[0 if numbers[2] else 1])


def _even_gap(decay: np.ndarray) -> tuple[float, int]:
    """Gap and number of zero modes on even operators from all rapidities, ascending real parts."""
    limit = defaults.GENERATOR_TOLERANCE * max(np.abs(decay).max(), np.finfo(float).tiny)
    undamped = decay[decay.real <= limit]
    if undamped.size > MAX_UNDAMPED:
        raise ModelError(
            f"{undamped.size} modes are undamped, which makes zero modes without number; add jumps"
        )
    damped = decay[undamped.size :].real
    still = [
        len(chosen) % 2
        for count in range(undamped.size + 1)
        for chosen in combinations(undamped.imag, count)
        if abs(sum(chosen)) <= limit
    ]
    zero_modes = still.count(0)
    if 2 ** max(undamped.size - 1, 0) > zero_modes:
        return 0.0, zero_modes
    if undamped.size:
        return float(damped[0]) if damped.size else 0.0, zero_modes
    return float(damped[:2].sum()), zero_modes


def quadratic_gap(chain: QuadraticChain) -> QuadraticGap:
    """Gap of the generator: on even operators the sum of the two smallest rapidities.

    A level without decay that is not a zero mode (undamped oscillation) makes the gap 0. Costs
    (2L)^3, or L^3 with conserved particles; odd operators with jumps at both ends (4L)^3, up to 250
    sites. Raises ModelError when more than 12 modes are undamped. Prosen (2008).
    """
    decay = rapidities(chain)
    even, zero_modes = _even_gap(decay)
    odd: float | None = float(decay[0].real)
    if _both_ends(chain):
        odd = None
        if chain.sites <= MAX_ODD_SITES:
            numbers, rate, all_plus = _odd_numbers(chain)
            odd = rate if all_plus else rate + float(numbers.real.min())
    # Rounding may leave an undamped mode slightly negative.
    slowest = even if odd is None else max(min(even, odd), 0.0)
    return QuadraticGap(slowest, even, odd, zero_modes)
