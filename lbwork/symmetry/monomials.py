"""Symmetry operations that permute basis states of the doubled chain, with signs.

A monomial operation sends the basis state with digits ``a_1 .. a_L`` to the one whose digit at
site ``site_map[j]`` is ``digit_map[j, a_j]``, times ``prod_j signs[j, a_j]``. Translation,
reflection, on-site permutations, staggered signs, the swap of ket and bra and all products are of
this form; followed by complex conjugation it is antilinear.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from lbwork.symmetry.canonical import CanonicalTerms, local_digits, permute_sites

__all__ = [
    "MonomialMap",
    "compose",
    "identity_map",
    "image_of_term",
    "inverse",
    "on_site_map",
    "power",
    "reflection_map",
    "translation_map",
]


@dataclass(frozen=True, eq=False)
class MonomialMap:
    """One operation: ``site_map`` (L,), ``digit_map`` and ``signs`` (L, d**2), and linearity.

    ``signs`` holds +1 and -1. ``antilinear`` means that complex conjugation is applied first.
    """

    site_map: np.ndarray
    digit_map: np.ndarray
    signs: np.ndarray
    antilinear: bool = False

    @property
    def sites(self) -> int:
        """Number of sites."""
        return int(self.site_map.size)

    @property
    def permutation_key(self) -> bytes:
        """Identifies the permutation part, signs and conjugation left out."""
        return self.site_map.tobytes() + self.digit_map.tobytes()

    @property
    def moves_sites(self) -> bool:
        """True when some site is sent to another."""
        return bool(np.any(self.site_map != np.arange(self.sites)))

    @property
    def keeps_digits(self) -> bool:
        """True when no digit is changed."""
        return bool(np.all(self.digit_map == np.arange(self.digit_map.shape[1])))

    def apply(self, digits: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Image of basis states: ``digits`` (n, L) -> (image digits (n, L), signs (n,))."""
        image = np.empty_like(digits)
        columns = np.arange(self.sites)
        image[:, self.site_map] = self.digit_map[columns, digits]
        return image, self.signs[columns, digits].prod(axis=1)


def identity_map(sites: int, base: int) -> MonomialMap:
    """The operation that does nothing."""
    return on_site_map(sites, np.tile(np.arange(base), (sites, 1)))


def on_site_map(sites: int, digit_map: np.ndarray, signs: np.ndarray | None = None) -> MonomialMap:
    """Digits are permuted site by site: ``digit_map`` and ``signs`` are (L, d**2)."""
    digit_map = np.ascontiguousarray(digit_map, dtype=np.int64)
    if signs is None:
        signs = np.ones(digit_map.shape, dtype=np.int8)
    return MonomialMap(np.arange(sites), digit_map, np.ascontiguousarray(signs, dtype=np.int8))


def translation_map(sites: int, base: int, step: int = 1) -> MonomialMap:
    """Every digit moves ``step`` sites to the right around the ring."""
    plain = identity_map(sites, base)
    return MonomialMap((np.arange(sites) + step) % sites, plain.digit_map, plain.signs)


def reflection_map(sites: int, base: int) -> MonomialMap:
    """Site j goes to L + 1 - j."""
    plain = identity_map(sites, base)
    return MonomialMap(np.arange(sites)[::-1].copy(), plain.digit_map, plain.signs)


def compose(second: MonomialMap, first: MonomialMap) -> MonomialMap:
    """The operation that applies ``first`` and then ``second``."""
    rows = first.site_map[:, None]
    digit_map = second.digit_map[rows, first.digit_map]
    signs = first.signs * second.signs[rows, first.digit_map]
    return MonomialMap(
        second.site_map[first.site_map],
        digit_map,
        signs.astype(np.int8),
        first.antilinear != second.antilinear,
    )


def inverse(operation: MonomialMap) -> MonomialMap:
    """The operation that undoes ``operation`` (signs are their own inverses)."""
    sites, base = operation.digit_map.shape
    site_map = np.empty_like(operation.site_map)
    site_map[operation.site_map] = np.arange(sites)
    digit_map = np.empty_like(operation.digit_map)
    signs = np.empty_like(operation.signs)
    for site in range(sites):
        target = operation.site_map[site]
        digit_map[target, operation.digit_map[site]] = np.arange(base)
        signs[target, operation.digit_map[site]] = operation.signs[site]
    return MonomialMap(site_map, digit_map, signs, operation.antilinear)


def power(operation: MonomialMap, exponent: int) -> MonomialMap:
    """``operation`` applied ``exponent`` >= 0 times."""
    result = identity_map(*operation.digit_map.shape)
    for _ in range(exponent):
        result = compose(operation, result)
    return result


def image_of_term(
    operation: MonomialMap, support: tuple[int, ...], matrix: np.ndarray, *, signed: bool = True
) -> tuple[tuple[int, ...], np.ndarray]:
    """``S M_A S^-1`` for a local operator: its new (sorted) support and matrix.

    With ``signed`` false the signs of the operation are taken as +1. An antilinear operation
    conjugates the matrix.
    """
    base = operation.digit_map.shape[1]
    count = len(support)
    digits = local_digits(base, count)
    powers = base ** np.arange(count - 1, -1, -1)
    columns = np.asarray(support)
    target = (operation.digit_map[columns[None, :], digits] * powers).sum(axis=1)
    moved = np.empty_like(matrix)
    source = matrix.conj() if operation.antilinear else matrix
    if signed:
        signs = operation.signs[columns[None, :], digits].prod(axis=1).astype(float)
        source = source * np.outer(signs, signs)
    moved[np.ix_(target, target)] = source
    places = operation.site_map[columns]
    order = np.argsort(places)
    return tuple(int(site) for site in places[order]), permute_sites(moved, base, order)


def images_agree(
    operation: MonomialMap,
    terms: CanonicalTerms,
    tolerance: float,
    target: CanonicalTerms | None = None,
) -> float:
    """Largest ``||S M_A S^-1 - T_S(A)||`` over the supports, relative to the largest ``||M||``.

    ``target`` T is the generator itself unless given. Stops at the first support where the mismatch
    exceeds ``tolerance`` and returns that value.
    """
    wanted = terms if target is None else target
    scale = max((float(np.linalg.norm(matrix)) for matrix in terms.values()), default=1.0)
    worst = 0.0
    for support, matrix in terms.items():
        place, image = image_of_term(operation, support, matrix)
        other = wanted.get(place)
        difference = image if other is None else image - other
        worst = max(worst, float(np.linalg.norm(difference)) / scale)
        if worst > tolerance:
            return worst
    return worst
