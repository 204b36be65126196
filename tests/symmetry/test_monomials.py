"""Identities of monomial operations: group law and action on operators."""

import numpy as np
import pytest

from lbwork.symmetry.canonical import canonical_terms, local_digits, support_parts
from lbwork.symmetry.monomials import (
    MonomialMap,
    compose,
    identity_map,
    image_of_term,
    inverse,
    power,
    reflection_map,
    translation_map,
)


def random_map(generator, sites=3, base=4):
    return MonomialMap(
        generator.permutation(sites),
        np.array([generator.permutation(base) for _ in range(sites)]),
        generator.choice([-1, 1], size=(sites, base)).astype(np.int8),
        bool(generator.integers(2)),
    )


def matrix_of(operation):
    sites, base = operation.digit_map.shape
    digits = local_digits(base, sites)
    image, signs = operation.apply(digits)
    target = image @ base ** np.arange(sites - 1, -1, -1)
    matrix = np.zeros((base**sites, base**sites))
    matrix[target, np.arange(base**sites)] = signs
    return matrix


@pytest.mark.parametrize("seed", range(5))
def test_composition_is_the_matrix_product(seed):
    generator = np.random.default_rng(seed)
    one, two = random_map(generator), random_map(generator)
    assert np.array_equal(matrix_of(compose(two, one)), matrix_of(two) @ matrix_of(one))


@pytest.mark.parametrize("seed", range(5))
def test_inverse_undoes(seed):
    operation = random_map(np.random.default_rng(seed))
    both = compose(inverse(operation), operation)
    assert np.array_equal(matrix_of(both), np.eye(64))
    assert not both.antilinear


def test_translation_has_the_order_of_the_ring():
    assert np.array_equal(matrix_of(power(translation_map(3, 4), 3)), np.eye(64))


def test_reflection_inverts_translation():
    shift, mirror = translation_map(3, 4), reflection_map(3, 4)
    product = compose(mirror, compose(shift, mirror))
    assert product.permutation_key == inverse(shift).permutation_key


@pytest.mark.parametrize("seed", range(6))
def test_image_of_a_local_operator_is_the_conjugated_matrix(seed):
    generator = np.random.default_rng(seed)
    operation = random_map(generator)
    local = generator.normal(size=(16, 16)) + 1j * generator.normal(size=(16, 16))
    full = np.kron(local, np.eye(4))  # support (0, 1)
    conjugation = matrix_of(operation)
    source = full.conj() if operation.antilinear else full
    expected = conjugation @ source @ conjugation.T
    support, image = image_of_term(operation, (0, 1), local)
    (lonely,) = set(range(3)) - set(support)
    order = [*support, lonely]
    tensor = np.kron(image, np.eye(4)).reshape((4,) * 6)
    back = np.argsort(order)
    tensor = tensor.transpose([*back, *(3 + back)])
    assert np.allclose(tensor.reshape(64, 64), expected)


def test_parts_by_support_add_up_and_have_no_identity():
    generator = np.random.default_rng(3)
    matrix = generator.normal(size=(64, 64))
    parts = support_parts((0, 1, 2), matrix, 4)
    total = np.trace(matrix) / 64 * np.eye(64)
    for support, part in parts.items():
        tensor = part.reshape((4,) * (2 * len(support)))
        for position in range(len(support)):
            traced = np.trace(tensor, axis1=position, axis2=len(support) + position)
            assert np.abs(traced).max() < 1e-12
        rest = [site for site in range(3) if site not in support]
        full = np.kron(part, np.eye(4 ** len(rest))).reshape((4,) * 6)
        back = np.argsort([*support, *rest])
        total = total + full.transpose([*back, *(3 + back)]).reshape(64, 64)
    assert np.allclose(total, matrix)


def test_two_cuttings_of_one_generator_agree():
    from lbwork.generator import SuperTerm

    generator = np.random.default_rng(4)
    bond, site = generator.normal(size=(16, 16)), generator.normal(size=(4, 4))
    one = [SuperTerm((0, 1), bond), SuperTerm((1, 2), bond + np.kron(site, np.eye(4)))]
    two = [SuperTerm((0, 1), bond + np.kron(np.eye(4), site)), SuperTerm((1, 2), bond)]
    first, second = canonical_terms(one, 4), canonical_terms(two, 4)
    assert first.keys() == second.keys()
    assert all(np.allclose(first[support], second[support]) for support in first)


def test_identity_moves_nothing():
    assert np.array_equal(matrix_of(identity_map(2, 4)), np.eye(16))
