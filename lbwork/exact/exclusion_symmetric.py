"""The symmetric exclusion process between two reservoirs: everything known in closed form.

Particles hop both ways at rate 1; a reservoir of density rho fills an empty end site at rate rho
and empties an occupied one at rate 1 - rho. B. Derrida, B. Douçot, P.-E. Roche, J. Stat. Phys. 115,
717 (2004). Its counting statistics depend on the reservoirs only through

    omega = rho_a (1 - rho_b) (e^x - 1) + rho_b (1 - rho_a) (e^-x - 1),

so that the generating function is ``sum_k c_k(N) omega^k`` and four numbers give four cumulants.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from lbwork.exact.arguments import checked_count, checked_density

__all__ = [
    "omega_coefficients",
    "symmetric_cumulants",
    "symmetric_current",
    "symmetric_gap",
    "symmetric_profile",
    "symmetric_ring_gap",
]

_SHORT_THIRD = {1: 1 / 16}
_SHORT_FOURTH = {1: -5 / 128, 2: -475 / 17496}
_FOURTH = (864, -4252, 7712, -6565, 2726, -523, 38)


def symmetric_current(sites: int, left: float, right: float) -> float:
    """Particle current ``(rho_a - rho_b) / (N + 1)``. Raises ModelError."""
    sites = checked_count("sites", sites, 1)
    return (checked_density("left", left) - checked_density("right", right)) / (sites + 1)


def symmetric_profile(sites: int, left: float, right: float) -> npt.NDArray[np.float64]:
    """Occupations on the straight line from rho_a to rho_b, float64 (N,). Raises ModelError."""
    sites = checked_count("sites", sites, 1)
    left, right = checked_density("left", left), checked_density("right", right)
    return np.asarray(left + (right - left) * np.arange(1, sites + 1) / (sites + 1))


def symmetric_gap(sites: int) -> float:
    """Gap of the open process, ``2 (1 - cos(pi/(N+1)))``, for any reservoirs. Raises ModelError.

    The slowest mode is that of one particle with absorbing ends.
    """
    return float(4 * np.sin(np.pi / (2 * (checked_count("sites", sites, 1) + 1))) ** 2)


def symmetric_ring_gap(sites: int) -> float:
    """Gap on a ring in every filling 1..L-1, ``2 (1 - cos(2 pi/L))``. Raises ModelError."""
    return float(4 * np.sin(np.pi / checked_count("sites", sites, 2)) ** 2)


def omega_coefficients(sites: int) -> npt.NDArray[np.float64]:
    """``c_1..c_4`` of the generating function ``sum_k c_k omega^k``, float64 (4,).

    Found by exact rational perturbation theory of the dual process (particles that enter at one end
    with amplitude omega, leave at both, and count at the other) for N = 1..13; the rational
    functions reproduce more lengths than they have coefficients, and ``N c_k`` tends to the series
    of ``arcsinh(sqrt(omega))^2``, as in Derrida et al. (2004). The shortest chains, which cannot
    hold the dual particles of that order, are exceptions. Raises ModelError.
    """
    sites = checked_count("sites", sites, 1)
    m = sites + 1.0
    second = -(2 * m - 1) / (6 * m**2)
    third = (2 * m - 1) * (4 * m - 1) / (45 * m**3)
    if sites in _SHORT_THIRD:
        third = _SHORT_THIRD[sites]
    if sites in _SHORT_FOURTH:
        fourth = _SHORT_FOURTH[sites]
    else:
        fourth = -float(np.polyval(_FOURTH, m)) / (7560 * m**4 * (m - 1) ** 2 * (m - 2))
    return np.array([1 / m, second, third, fourth])


def symmetric_cumulants(sites: int, left: float, right: float) -> npt.NDArray[np.float64]:
    """First four cumulants per time of the particles transferred to the right, float64 (4,).

    Needs reservoir densities in [0, 1]; raises ModelError. Derrida et al. (2004).
    """
    left, right = checked_density("left", left), checked_density("right", right)
    forth, back = left * (1 - right), right * (1 - left)
    factorials = np.array([1.0, 1.0, 2.0, 6.0, 24.0])
    # omega as a series in the counting field x, up to x^4.
    omega = np.array([0.0] + [(forth + (-1) ** k * back) / factorials[k] for k in range(1, 5)])
    series, power = np.zeros(5), np.array([1.0, 0, 0, 0, 0])
    for coefficient in omega_coefficients(sites):
        power = np.convolve(power, omega)[:5]
        series += coefficient * power
    return np.asarray((series * factorials)[1:])
