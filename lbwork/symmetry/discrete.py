"""Search for discrete symmetries: permutations of sites and digits, signs solved for.

Candidates are products of a site map (none, translation, reflection) and an on-site permutation
of ket and bra levels, with or without the swap of ket and bra, possibly different on the two
sublattices. For each the signs that make ``S L S^-1 = L`` hold are found by linear algebra modulo 2
and the result is checked against the generator term by term; nothing is taken on trust.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from lbwork import defaults
from lbwork.symmetry.canonical import CanonicalTerms, local_digits, sublattice_count
from lbwork.symmetry.monomials import (
    MonomialMap,
    compose,
    identity_map,
    image_of_term,
    images_agree,
    inverse,
    on_site_map,
    reflection_map,
    translation_map,
)

__all__ = ["DiscreteSymmetry", "find_point_symmetries", "find_translation", "hermiticity_map"]

_MAX_PERMUTED_PAIRS = 72


@dataclass(frozen=True, eq=False)
class DiscreteSymmetry:
    """A validated operation; ``residual`` is the largest relative mismatch of a local term."""

    name: str
    operation: MonomialMap
    residual: float


def hermiticity_map(sites: int, dimension: int) -> MonomialMap:
    """``rho -> rho^dag`` on the doubled chain: digits (a, b) -> (b, a), then conjugation."""
    swapped = np.arange(dimension**2).reshape(dimension, dimension).T.ravel()
    plain = on_site_map(sites, np.tile(swapped, (sites, 1)))
    return MonomialMap(plain.site_map, plain.digit_map, plain.signs, antilinear=True)


def _digit_permutations(dimension: int) -> list[tuple[str, np.ndarray]]:
    """On-site permutations (a, b) -> (p a, p' b), with and without swapping ket and bra."""
    permutations = list(itertools.permutations(range(dimension)))
    identity = permutations[0]
    pairs = list(itertools.product(permutations, permutations))
    if len(pairs) > _MAX_PERMUTED_PAIRS:
        pairs = [
            (ket, bra) for ket, bra in pairs if ket == bra or ket == identity or bra == identity
        ]
    ket_digit, bra_digit = np.divmod(np.arange(dimension**2), dimension)
    found = []
    for ket, bra in pairs:
        for swap in (False, True):
            ket_image, bra_image = np.array(ket)[ket_digit], np.array(bra)[bra_digit]
            image = bra_image * dimension + ket_image if swap else ket_image * dimension + bra_image
            found.append((_permutation_name(ket, bra, identity, swap), image))
    return found


def _permutation_name(
    ket: tuple[int, ...], bra: tuple[int, ...], identity: tuple[int, ...], swap: bool
) -> str:
    if len(identity) == 2:
        words = {(False, False): "", (True, True): "spin flip"}
        words |= {(True, False): "ket spin flip", (False, True): "bra spin flip"}
        name = words[ket != identity, bra != identity]
    elif ket == bra:
        name = "" if ket == identity else f"levels {'-'.join(map(str, ket))}"
    else:
        name = f"ket levels {'-'.join(map(str, ket))}, bra levels {'-'.join(map(str, bra))}"
    if swap:
        name = f"{name} with transposition" if name else "transposition"
    return name


def _site_maps(sites: int, base: int, site_centred: bool) -> Iterator[tuple[str, MonomialMap]]:
    yield "", identity_map(sites, base)
    if sites > 1:
        yield "reflection", reflection_map(sites, base)
    if sites > 2 and site_centred:
        back = translation_map(sites, base, sites - 1)
        yield "reflection about a site", compose(back, reflection_map(sites, base))


def _solve_signs(
    operation: MonomialMap, terms: CanonicalTerms, sublattices: int, transpose: bool
) -> np.ndarray | None:
    """Signs (L, d**2) such that the signed operation maps the terms onto themselves, or None.

    Every matrix element gives one equation modulo 2: the sign of the element against that of its
    image. Elements whose moduli differ, or differ by a phase, rule the operation out.
    """
    sites, base = operation.digit_map.shape
    width = sublattices * base
    scale = max(float(np.abs(matrix).max()) for matrix in terms.values())
    tolerance = 1e-10 * scale
    back = inverse(replace(operation, antilinear=False))
    equations: set[bytes] = set()
    for support, matrix in terms.items():
        place, image = image_of_term(operation, support, matrix, signed=False)
        other = terms.get(place)
        if other is None:
            return None
        target = other.T if transpose else other
        if np.abs(np.abs(image) - np.abs(target)).max() > tolerance:
            return None
        # Work in the digits before the map, where the unknown signs live.
        _, wanted = image_of_term(back, place, target, signed=False)
        source = matrix.conj() if operation.antilinear else matrix
        present = np.abs(source) > tolerance
        same = np.abs(wanted - source) <= tolerance
        opposite = np.abs(wanted + source) <= tolerance
        if np.any(present & ~same & ~opposite):
            return None
        rows, columns = np.nonzero(present)
        digits = local_digits(base, len(support))
        equation = np.zeros((rows.size, width + 1), dtype=np.uint8)
        index = np.arange(rows.size)
        for position, site in enumerate(support):
            offset = (site % sublattices) * base
            for chosen in (rows, columns):
                np.bitwise_xor.at(equation, (index, offset + digits[chosen, position]), 1)
        equation[:, width] = ~same[rows, columns]
        equations.update(row.tobytes() for row in np.unique(equation, axis=0))
    matrix = np.array([np.frombuffer(row, dtype=np.uint8) for row in sorted(equations)])
    solution = _solve_modulo_two(matrix, width)
    if solution is None:
        return None
    bits = solution.reshape(sublattices, base)[np.arange(sites) % sublattices]
    return (1 - 2 * bits.astype(np.int8)).astype(np.int8)


def _solve_modulo_two(equations: np.ndarray, width: int) -> np.ndarray | None:
    """One solution of ``A x = b`` over two elements, free unknowns zero; None if there is none."""
    matrix = equations.reshape(-1, width + 1).copy()
    pivots: list[int] = []
    for column in range(width):
        rank = len(pivots)
        below = np.nonzero(matrix[rank:, column])[0]
        if below.size == 0:
            continue
        matrix[[rank, rank + below[0]]] = matrix[[rank + below[0], rank]]
        others = np.nonzero(matrix[:, column])[0]
        others = others[others != rank]
        matrix[others] ^= matrix[rank]
        pivots.append(column)
    if np.any(matrix[len(pivots) :, width]):
        return None
    solution = np.zeros(width, dtype=np.uint8)
    solution[pivots] = matrix[: len(pivots), width]
    return solution


def _signed(
    operation: MonomialMap, terms: CanonicalTerms, sublattices: int, transpose: bool
) -> tuple[MonomialMap, float] | None:
    signs = _solve_signs(operation, terms, sublattices, transpose)
    if signs is None:
        return None
    candidate = MonomialMap(operation.site_map, operation.digit_map, signs, operation.antilinear)
    target = {place: matrix.T for place, matrix in terms.items()} if transpose else None
    residual = images_agree(candidate, terms, defaults.SYMMETRY_TOLERANCE, target)
    return (candidate, residual) if residual <= defaults.SYMMETRY_TOLERANCE else None


def find_translation(terms: CanonicalTerms, sites: int, base: int) -> DiscreteSymmetry | None:
    """The shortest translation of a ring that commutes with the generator, signs included."""
    for step in range(1, sites // 2 + 1):
        if sites % step:
            continue
        plain = translation_map(sites, base, step)
        found = _signed(plain, terms, sublattice_count(sites, True), transpose=False)
        if found is not None:
            operation, residual = found
            word = "translation" if step == 1 else f"translation by {step} sites"
            return DiscreteSymmetry(word, operation, residual)
    return None


def find_point_symmetries(
    terms: CanonicalTerms,
    sites: int,
    dimension: int,
    ring: bool,
    *,
    site_centred: bool = False,
    transpose: bool = False,
) -> tuple[DiscreteSymmetry, ...]:
    """All validated operations that are a reflection or none, times an on-site permutation.

    With ``transpose`` the condition is ``S L^T S^-1 = L`` instead: the transposition symmetries
    that decide the random-matrix class. Diagonal operations are charges and are left out, except
    the plain identity when ``transpose`` asks for it. ``site_centred`` adds reflections about a
    site, which on a ring differ from the others when single-site translation is broken.
    """
    base = dimension**2
    if not terms:
        return ()
    sublattices = sublattice_count(sites, ring)
    permutations = _digit_permutations(dimension)
    patterns = [(name, (image, image)) for name, image in permutations]
    if sublattices == 2 and dimension == 2:
        patterns += [
            (f"{first or 'nothing'} / {second or 'nothing'} alternating", (one, two))
            for (first, one), (second, two) in itertools.permutations(permutations, 2)
        ]
    found = []
    for (site_name, site_operation), (name, images) in itertools.product(
        _site_maps(sites, base, site_centred), patterns
    ):
        digit_map = np.array([images[site % 2] for site in range(sites)])
        operation = compose(site_operation, on_site_map(sites, digit_map))
        if not operation.moves_sites and operation.keeps_digits and not transpose:
            continue
        signed = _signed(operation, terms, sublattices, transpose)
        if signed is None:
            continue
        full_name = " with ".join(word for word in (site_name, name) if word) or "identity"
        if np.any(signed[0].signs < 0):
            full_name += " and signs"
        found.append(DiscreteSymmetry(full_name, *signed))
    return tuple(found)
