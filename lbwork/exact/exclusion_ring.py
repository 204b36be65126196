"""Gap of the totally asymmetric exclusion process on a ring from its Bethe equations.

With n particles on L sites and hopping rate 1 the equations decouple (L.-H. Gwa, H. Spohn, Phys.
Rev. A 46, 844 (1992); O. Golinelli, K. Mallick, J. Phys. A 37, 3321 (2004)): all roots solve

    (1 - Z)^n (1 + Z)^(L-n) = Y,   Y = -2^L prod_j (Z_j - 1)/(Z_j + 1),   2 E = -n + sum_j Z_j.

The L solutions lie on an oval around +1 and -1 with a waist at ``Z_c = (L - 2n)/L``. Numbered
anticlockwise from the lower half of the waist, 1..n lie around +1: they are the stationary state,
and {1..n-1, n+1} is the slowest mode. One complex unknown, log Y, is left, whatever the length.
"""

from __future__ import annotations

import cmath
import math

from lbwork.errors import NotCertifiedError
from lbwork.exact.arguments import checked_count

__all__ = ["asymmetric_ring_eigenvalue"]

_WAIST_EXCESS = 1.119068802804474 * math.pi
"""``log |Y/Y_c|`` in the limit of long rings (Golinelli and Mallick): the start of the search."""

_STEPS = 60
_TOLERANCE = 1e-14


class _Oval:
    """Roots of ``n log(1-Z) + (L-n) log(1+Z) = w`` near the waist and outwards from it."""

    def __init__(self, sites: int, particles: int) -> None:
        self.particles, self.holes = particles, sites - particles
        self.waist = (sites - 2 * particles) / sites
        self.height = self.value(complex(self.waist))
        self.curvature = sites**2 / 4 * (1 / self.particles + 1 / self.holes)

    def value(self, z: complex) -> complex:
        return self.particles * cmath.log(1 - z) + self.holes * cmath.log(1 + z)

    def slope(self, z: complex) -> complex:
        return -self.particles / (1 - z) + self.holes / (1 + z)

    def polished(self, z: complex, w: complex) -> complex:
        """Newton's method; the step is bounded by the distance to the branch points +1 and -1."""
        for _ in range(_STEPS):
            # On the branch of log(1-Z) that leads to w: the middle root lies beyond Z = 1.
            sheet = round((w - self.value(z)).imag / (2 * math.pi * self.particles))
            step = (w - self.value(z) - 2j * math.pi * self.particles * sheet) / self.slope(z)
            bound = min(abs(1 - z), abs(1 + z)) / 2
            if abs(step) > bound:
                step *= bound / abs(step)
            z += step
            if abs(step) < _TOLERANCE * abs(z - self.waist):
                return z
        # The last steps of a converged root are rounding; the residual of the whole is checked.
        return z

    def chain(self, first: complex, turn: complex, count: int, side: int) -> list[complex]:
        """Roots at ``w = first, first + turn, ...`` going out from the waist.

        ``side`` is +1 around Z = 1, -1 around Z = -1. Z is a smooth function of
        ``s = sqrt(height - w)``, also across the waist: each root is guessed from the last in s.
        """
        roots: list[complex] = []
        z, root = complex(self.waist), 0j
        for index in range(count):
            w = first + index * turn
            new = cmath.sqrt(self.height - w)
            if index == 0:
                guess = self.waist + side * new * math.sqrt(2 / self.curvature)
            else:
                # dZ/ds = dw/ds / (dw/dZ) = -2 s / slope.
                guess = z - 2 * root * (new - root) / self.slope(z)
            z, root = self.polished(guess, w), new
            roots.append(z)
        return roots


def _slow_roots(oval: _Oval, log_y: complex) -> list[complex]:
    """Roots number 1..n-1 and n+1 for a trial value of log Y with imaginary part in (0, 2 pi)."""
    n, turn = oval.particles, 2j * math.pi
    below = (n + 1) // 2
    lower = oval.chain(log_y, turn, below, 1)
    upper = oval.chain(log_y - turn, -turn, n - below, 1)
    beyond = oval.chain(log_y, turn, 1, -1)
    # Number n, the first above the waist, is the one that has moved to n + 1.
    return lower + upper[1:] + beyond


def asymmetric_ring_eigenvalue(sites: int, particles: int) -> complex:
    """Slowest decaying eigenvalue E of the Markov matrix; the gap is ``-Re E``, its partner ``E*``.

    Returned with ``Im E >= 0``. Needs 2..20000 sites and 1..sites-1 particles; costs sites per step
    of Newton's method. Raises ModelError, CapacityError, and NotCertifiedError when the equations
    are not solved to 1e-9. Gwa and Spohn (1992), Golinelli and Mallick (2004), from memory;
    ``L^{3/2}`` times the gap tends to 6.509189337 at half filling.
    """
    sites = checked_count("sites", sites, 2, 20_000)
    particles = checked_count("particles", particles, 1)
    checked_count("holes", sites - particles, 1)
    # Holes hop to the left at the same rates: complex conjugate spectra.
    few = min(particles, sites - particles)
    if few == 1:
        return cmath.exp(2j * math.pi / sites) - 1
    oval = _Oval(sites, few)
    log_y = oval.height + _WAIST_EXCESS + 1j * math.pi
    energy, defect = 0j, math.inf
    for _ in range(_STEPS):
        roots = _slow_roots(oval, log_y)
        total = sites * math.log(2) + 1j * math.pi
        total += sum(cmath.log((z - 1) / (z + 1)) for z in roots)
        miss = total - log_y
        miss -= 2j * math.pi * round(miss.imag / (2 * math.pi))
        energy, defect = (sum(roots) - few) / 2, abs(miss)
        if defect < 1e-13 * sites:
            break
        slope = sum(2 / ((z * z - 1) * oval.slope(z)) for z in roots)
        log_y += miss / (1 - slope)
    if not defect < 1e-9:
        raise NotCertifiedError(
            f"the Bethe equations of {few} particles on {sites} sites are not solved: residual "
            f"{defect:.1e}; use the Markov matrix",
            energy,
        )
    return complex(energy.real, abs(energy.imag))
