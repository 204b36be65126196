"""Counting statistics of the open totally asymmetric exclusion process with unit rates."""

from __future__ import annotations

from fractions import Fraction
from math import factorial

from lbwork.exact.arguments import checked_count

__all__ = ["unit_rate_cumulants"]


def _series(sites: int, order: int) -> tuple[list[Fraction], list[Fraction]]:
    """Coefficients of B^k, k = 0..order, of -x and of -E (Lazarescu and Mallick)."""
    field, growth = [Fraction(0)], [Fraction(0)]
    for k in range(1, order + 1):
        weight = Fraction(factorial(2 * k), factorial(k) * 2 * k)
        one, two = k * (sites + 1), k * (sites + 2)
        field.append(weight * factorial(2 * one) / (factorial(one) * factorial(two)))
        growth.append(weight * factorial(2 * one - 2) / (factorial(one - 1) * factorial(two - 1)))
    return field, growth


def _product(first: list[Fraction], second: list[Fraction]) -> list[Fraction]:
    size = len(first)
    return [sum((first[i] * second[k - i] for i in range(k + 1)), Fraction(0)) for k in range(size)]


def unit_rate_cumulants(sites: int, order: int = 4) -> tuple[Fraction, ...]:
    """Cumulants 1..order per time of the particle current at entry = exit = bulk rate 1.

    With counting field x and growth rate E of ``<e^{x Q}>``, as series in B:

        x = - sum_k (2k)!/k! [2k(N+1)]! / ([k(N+1)]! [k(N+2)]!) B^k / (2k),
        E = - sum_k (2k)!/k! [2k(N+1)-2]! / ([k(N+1)-1]! [k(N+2)-1]!) B^k / (2k);

    eliminating B gives exact rational cumulants. Needs N >= 1, order 1..12; raises ModelError,
    CapacityError. A. Lazarescu, K. Mallick, Phys. Rev. Lett. 106, 180601 (2011), from memory.
    """
    sites = checked_count("sites", sites, 1, 2000)
    order = checked_count("order", order, 1, 12)
    field, growth = _series(sites, order)
    # Powers of x as series in B; then E = sum_k e_k x^k is solved from the lowest power up.
    powers = [[-value for value in field]]
    while len(powers) < order:
        powers.append(_product(powers[-1], powers[0]))
    rest = [-value for value in growth]
    cumulants = []
    for k in range(1, order + 1):
        coefficient = rest[k] / powers[k - 1][k]
        rest = [a - coefficient * b for a, b in zip(rest, powers[k - 1], strict=True)]
        cumulants.append(coefficient * factorial(k))
    return tuple(cumulants)
