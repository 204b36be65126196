"""Pauli strings as products of the Majorana operators w of a Jordan-Wigner transformation.

Sites j = 1..L: ``w_{2j-1} = (Z_1 ... Z_{j-1}) X_j``, ``w_{2j} = (Z_1 ... Z_{j-1}) Y_j``, so that
``w_m w_n + w_n w_m = 2 delta_mn``, ``Z_j = -i w_{2j-1} w_{2j}`` (P. Jordan, E. Wigner, Z. Phys. 47,
631 (1928)).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork.exact.pauli import PauliString

__all__ = ["Monomial", "add_bilinear", "monomial", "parity"]


@dataclass(frozen=True)
class Monomial:
    """``phase`` times the product of the w in ``mask`` (bit m for w_{m+1}) in ascending order."""

    mask: int
    phase: complex

    @property
    def degree(self) -> int:
        """Number of factors."""
        return self.mask.bit_count()

    def times(self, other: Monomial) -> Monomial:
        """The product self other."""
        swaps, rest = 0, other.mask
        while rest:
            low = rest & -rest
            # Every factor of self that stands above it has to be passed.
            swaps += (self.mask & ~(2 * low - 1)).bit_count()
            rest ^= low
        sign = -1 if swaps % 2 else 1
        return Monomial(self.mask ^ other.mask, sign * self.phase * other.phase)


def _letter(site: int, letter: str) -> Monomial:
    if letter == "Z":
        return Monomial(3 << 2 * site, -1j)
    string = Monomial((1 << 2 * site) - 1, (-1j) ** site)
    return string.times(Monomial((1 if letter == "X" else 2) << 2 * site, 1))


def monomial(string: PauliString) -> Monomial:
    """The product of w that a Pauli string is."""
    result = Monomial(0, 1)
    for site, letter in string:
        result = result.times(_letter(site, letter))
    return result


def parity(sites: int) -> Monomial:
    """``P = Z_1 ... Z_L``."""
    return Monomial((1 << 2 * sites) - 1, (-1j) ** sites)


def add_bilinear(matrix: np.ndarray, value: complex, product: Monomial) -> None:
    """Adds ``value`` times a product of two w to ``(i/4) sum B_mn w_m w_n``, antisymmetric B."""
    low = (product.mask & -product.mask).bit_length() - 1
    high = product.mask.bit_length() - 1
    # value phase w_low w_high = (i/4) (B_lh w_l w_h + B_hl w_h w_l).
    entry = -2j * value * product.phase
    matrix[low, high] += entry
    matrix[high, low] -= entry
