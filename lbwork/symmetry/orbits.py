"""How symmetries that do not commute with the chosen ones relate sectors to each other.

For a commuting group with characters, an operation S maps the eigenspace of ``g`` with eigenvalue
``lambda`` to another one: ``g (S v) = S (S^-1 g S) v``. When ``S^-1 g S`` is, up to a sign that is
constant on the charge sector, again an element of the group, the new eigenvalue follows from the
characters (conjugated when S is antilinear).
"""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass

import numpy as np

from lbwork.symmetry.characters import AbelianGroup, GroupGenerator, group_from_generators
from lbwork.symmetry.monomials import MonomialMap, compose, inverse

__all__ = [
    "IrrepRelation",
    "action_on_irreps",
    "choose_generators",
    "is_independent",
    "square_on_irreps",
    "translation_generator",
]


@dataclass(frozen=True, eq=False)
class IrrepRelation:
    """Image of every irrep under one operation: int64 (irreps,), and whether it is antilinear."""

    image: np.ndarray
    antilinear: bool


def _value_on_state(operation: MonomialMap, state: np.ndarray) -> tuple[np.ndarray, int]:
    digits, signs = operation.apply(state[None, :])
    return digits[0], int(signs[0])


def _as_group_element(
    operation: MonomialMap, group: AbelianGroup, state: np.ndarray
) -> tuple[int, int] | None:
    """(element index, relative sign on ``state``) when the permutation part is in the group."""
    index = group.index_of.get(operation.permutation_key)
    if index is None:
        return None
    sign = _value_on_state(operation, state)[1] * _value_on_state(group.elements[index], state)[1]
    return index, sign


def action_on_irreps(
    operation: MonomialMap, group: AbelianGroup, state: np.ndarray
) -> IrrepRelation | None:
    """Permutation of the irreps by an operation that keeps the charge sector of ``state``.

    ``state`` are the digits of any basis state of the sector. None when the operation does not
    normalise the group.
    """
    characters = group.characters()
    back = inverse(operation)
    wanted = []
    for generator in group.generators:
        conjugated = compose(back, compose(generator.operation, operation))
        element = _as_group_element(conjugated, group, state)
        if element is None:
            return None
        index, sign = element
        values = sign * characters[:, index]
        wanted.append(values.conj() if operation.antilinear else values)
    irreps = group.irreps()
    image = np.zeros_like(irreps)
    for column, (generator, values) in enumerate(zip(group.generators, wanted, strict=True)):
        turns = np.angle(values) / (2 * np.pi) * generator.order
        if np.abs(turns - np.rint(turns)).max() > 1e-6:
            return None
        image[:, column] = np.rint(turns).astype(np.int64) % generator.order
    orders = [generator.order for generator in group.generators]
    flat = np.zeros(len(irreps), dtype=np.int64)
    for column, order in enumerate(orders):
        flat = flat * order + image[:, column]
    return IrrepRelation(flat, operation.antilinear)


def square_on_irreps(
    operation: MonomialMap, group: AbelianGroup, state: np.ndarray
) -> np.ndarray | None:
    """Value of ``S**2`` on every irrep, complex (irreps,); None when it is not in the group."""
    element = _as_group_element(compose(operation, operation), group, state)
    if element is None:
        return None
    index, sign = element
    return np.asarray(sign * group.characters()[:, index])


def _commute(one: MonomialMap, two: MonomialMap, state: np.ndarray) -> bool:
    left, right = compose(one, two), compose(two, one)
    if left.permutation_key != right.permutation_key:
        return False
    return _value_on_state(left, state)[1] == _value_on_state(right, state)[1]


def _order(operation: MonomialMap, state: np.ndarray, limit: int) -> int | None:
    """Smallest power that is +1 on the charge sector of ``state``; None when above ``limit``."""
    current = operation
    plain = np.arange(operation.sites)
    for count in range(1, limit + 1):
        if current.keeps_digits and np.array_equal(current.site_map, plain):
            if _value_on_state(current, state)[1] == 1:
                return count
        current = compose(operation, current)
    return None


def choose_generators(
    chosen_before: Sequence[GroupGenerator],
    candidates: Sequence[tuple[str, MonomialMap]],
    state: np.ndarray,
) -> list[GroupGenerator]:
    """Extend commuting generators by candidates; a large commuting set on one charge sector.

    ``state`` are the digits of a basis state of the sector, which all candidates must keep. Those
    that commute with all chosen before and are not products of them are added in turn: on-site
    operations first, higher orders first.
    """
    chosen = list(chosen_before)
    sites = state.size
    ranked = []
    for position, (name, operation) in enumerate(candidates):
        order = _order(operation, state, 24)
        if order is not None and order > 1:
            ranked.append((operation.moves_sites, -order, position, name, operation, order))
    if not ranked:
        return chosen
    base = ranked[0][4].digit_map.shape[1]
    known = _closure(chosen, sites, base)
    for _, _, _, name, operation, order in sorted(ranked, key=lambda item: item[:3]):
        if operation.permutation_key in known:
            continue
        if all(_commute(operation, other.operation, state) for other in chosen):
            generator = GroupGenerator(name, operation, order)
            if is_independent(generator, known, sites, base):
                chosen.append(generator)
                known = _closure(chosen, sites, base)
    return chosen


def is_independent(
    generator: GroupGenerator, known: Collection[bytes], sites: int, base: int
) -> bool:
    """True when adding the generator gives a direct product with the permutations ``known``.

    The new cyclic group must meet the old group in the identity only, and its powers must differ as
    permutations (or by one overall sign, when ``S**n = -1``).
    """
    powers = _closure([generator], sites, base)
    shared = sum(key in known for key in powers)
    return shared == 1 and len(powers) in (generator.order, generator.order // 2)


def translation_generator(
    name: str, operation: MonomialMap, state: np.ndarray
) -> GroupGenerator | None:
    """The translation as a generator on the charge sector of ``state``; None when it is trivial."""
    order = _order(operation, state, 2 * state.size)
    return GroupGenerator(name, operation, order) if order is not None and order > 1 else None


def _closure(generators: Sequence[GroupGenerator], sites: int, base: int) -> set[bytes]:
    """Permutation parts of all products of commuting generators."""
    return set(group_from_generators(generators, sites, base).index_of)
