"""Sizes of symmetry sectors from characters, without listing a single basis state.

The number of states of charge ``q`` on which a commuting group G acts with character chi is
``1/|G| sum_g conj(chi(g)) tr_q(g)``; for monomial operations the trace is a sum over basis states
that an operation sends to themselves, which factorises over the cycles of its site map.
"""

from __future__ import annotations

import itertools
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from lbwork.errors import SymmetryError
from lbwork.symmetry.charges import Charge, ChargeLabel
from lbwork.symmetry.monomials import MonomialMap, compose, identity_map

__all__ = ["AbelianGroup", "GroupGenerator", "group_from_generators", "traces_by_label"]


@dataclass(frozen=True, eq=False)
class GroupGenerator:
    """A generator of the commuting group: ``operation**order`` is the identity on the sector."""

    name: str
    operation: MonomialMap
    order: int


@dataclass(frozen=True, eq=False)
class AbelianGroup:
    """All products of commuting generators.

    ``exponents`` is int64 (|G|, generators); ``elements`` the operations in the same order;
    ``index_of`` finds an element by its permutation part.
    """

    generators: tuple[GroupGenerator, ...]
    exponents: np.ndarray
    elements: tuple[MonomialMap, ...]
    index_of: dict[bytes, int]

    @property
    def order(self) -> int:
        """Number of elements."""
        return len(self.elements)

    def characters(self) -> np.ndarray:
        """All irreducible characters: complex (irreps, |G|), irreps in the order of ``irreps``."""
        orders = np.array([generator.order for generator in self.generators], dtype=float)
        phases = (self.irreps() / orders) @ self.exponents.T if orders.size else np.zeros((1, 1))
        return np.asarray(np.exp(2j * np.pi * phases))

    def irreps(self) -> np.ndarray:
        """Labels of the irreps, one integer below its order for each generator."""
        ranges = [range(generator.order) for generator in self.generators]
        combinations = list(itertools.product(*ranges))
        return np.array(combinations, dtype=np.int64).reshape(len(combinations), len(ranges))


def group_from_generators(
    generators: Sequence[GroupGenerator], sites: int, base: int
) -> AbelianGroup:
    """Multiply the generators out; raises SymmetryError when two products coincide."""
    exponents: list[tuple[int, ...]] = [()]
    elements = [identity_map(sites, base)]
    for generator in generators:
        grown_exponents, grown = [], []
        for exponent, element in zip(exponents, elements, strict=True):
            current = element
            for count in range(generator.order):
                grown_exponents.append((*exponent, count))
                grown.append(current)
                current = compose(generator.operation, current)
        exponents, elements = grown_exponents, grown
    index_of: dict[bytes, int] = {}
    for index, element in enumerate(elements):
        index_of.setdefault(element.permutation_key, index)
    table = np.array(exponents, dtype=np.int64).reshape(len(elements), len(generators))
    return AbelianGroup(tuple(generators), table, tuple(elements), index_of)


def _cycles(site_map: np.ndarray) -> list[list[int]]:
    seen: set[int] = set()
    cycles = []
    for start in range(site_map.size):
        if start in seen:
            continue
        cycle, site = [], start
        while site not in seen:
            seen.add(site)
            cycle.append(site)
            site = int(site_map[site])
        cycles.append(cycle)
    return cycles


def traces_by_label(operation: MonomialMap, charges: Sequence[Charge]) -> dict[ChargeLabel, int]:
    """``sum_x <x|S|x>`` over the basis states of each charge label; empty ones are absent."""
    base = operation.digit_map.shape[1]
    moduli = [charge.modulus for charge in charges]
    totals: dict[ChargeLabel, int] = {(0,) * len(moduli): 1}
    for cycle in _cycles(operation.site_map):
        contributions: dict[ChargeLabel, int] = {}
        for start in range(base):
            digit, sign = start, 1
            change = [0] * len(moduli)
            for site in cycle:
                sign *= int(operation.signs[site, digit])
                for index, charge in enumerate(charges):
                    change[index] += int(charge.values[site, digit])
                digit = int(operation.digit_map[site, digit])
            if digit == start:
                key = tuple(c % m if m else c for c, m in zip(change, moduli, strict=True))
                contributions[key] = contributions.get(key, 0) + sign
        grown: dict[ChargeLabel, int] = {}
        for label, total in totals.items():
            for change_label, count in contributions.items():
                target = tuple(
                    (a + b) % m if m else a + b
                    for a, b, m in zip(label, change_label, moduli, strict=True)
                )
                grown[target] = grown.get(target, 0) + total * count
        totals = grown
    return totals


def irrep_dimensions(
    group: AbelianGroup,
    label: ChargeLabel,
    traces: Sequence[dict[ChargeLabel, int]],
    members: np.ndarray,
) -> np.ndarray:
    """Dimension of every irrep of ``group`` within one charge label; int64 (irreps,).

    ``traces`` holds :func:`traces_by_label` of each group element. Where the group contains a
    reflection beside a translation, only irreps of momentum 0 or pi (``members``) are meaningful;
    the others are returned as 0. Raises SymmetryError when a
    dimension does not come out as a whole number, which means that the group law is broken.
    """
    character = np.array([trace.get(label, 0) for trace in traces], dtype=float)
    dimensions = np.zeros(len(group.irreps()), dtype=complex)
    dimensions[members] = group.characters()[members].conj() @ character / group.order
    rounded = np.rint(dimensions.real).astype(np.int64)
    if np.abs(dimensions - rounded).max() > 1e-6 or rounded.min() < 0:
        raise SymmetryError(
            f"sector sizes at charge label {label} are not whole numbers: {dimensions.tolist()}; "
            "the chosen symmetries do not commute on it"
        )
    return rounded
