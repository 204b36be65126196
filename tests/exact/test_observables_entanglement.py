"""Entropies, operator-space entanglement and negativity of states that are known in closed form."""

import numpy as np
import pytest

from lbwork.errors import CapacityError, UsageError
from lbwork.model import Model, Term
from lbwork.observables import (
    entanglement_cost,
    gibbs_state,
    left_entropies,
    logarithmic_negativity,
    maximally_mixed,
    operator_entanglement,
    product_state,
    purity,
    renyi_two,
    schmidt_weights,
    von_neumann_entropy,
)


def random_matrix(size, seed):
    generator = np.random.default_rng(seed)
    return generator.normal(size=(size, size)) + 1j * generator.normal(size=(size, size))


def random_density(size, seed):
    matrix = random_matrix(size, seed)
    density = matrix @ matrix.conj().T
    return density / np.trace(density)


def pure(vector):
    vector = np.asarray(vector, dtype=complex)
    vector = vector / np.linalg.norm(vector)
    return np.outer(vector, vector.conj())


@pytest.mark.parametrize("dimension", [2, 3, 4])
def test_maximally_entangled_pair(dimension):
    """``ln d`` for the left part and the negativity, ``2 ln d`` and rank d**2 as an operator."""
    pair = pure(np.eye(dimension).ravel())
    log = np.log(dimension)
    assert logarithmic_negativity(pair, 2, dimension)[0] == pytest.approx(log)
    assert left_entropies(pair, 2, dimension).von_neumann[0] == pytest.approx(log)
    assert left_entropies(pair, 2, dimension).renyi_two[0] == pytest.approx(log)
    entropies, ranks = operator_entanglement(pair, 2, dimension)
    assert entropies[0] == pytest.approx(2 * log)
    assert ranks[0] == dimension**2
    assert von_neumann_entropy(pair) == pytest.approx(0, abs=1e-12)
    assert purity(pair) == pytest.approx(1)


@pytest.mark.parametrize("count", [2, 3, 5])
def test_cat_state(count):
    """Up everywhere plus down everywhere: ln 2 at every cut, 2 ln 2 and rank 4 as an operator."""
    state = pure([1] + [0] * (2**count - 2) + [1])
    assert np.allclose(logarithmic_negativity(state, count, 2), np.log(2))
    parts = left_entropies(state, count, 2)
    assert np.allclose(parts.von_neumann, np.log(2))
    assert np.allclose(parts.renyi_two, np.log(2))
    entropies, ranks = operator_entanglement(state, count, 2)
    assert np.allclose(entropies, 2 * np.log(2))
    assert np.array_equal(ranks, np.full(count - 1, 4))


def test_one_shared_excitation():
    """Left part of l of L sites: weights l/L and 1 - l/L; ``2 ln(sqrt p + sqrt(1-p))``."""
    count = 6
    vector = np.zeros(2**count)
    vector[2 ** np.arange(count)] = 1
    state = pure(vector)
    share = np.arange(1, count) / count
    entropy = -share * np.log(share) - (1 - share) * np.log(1 - share)
    assert np.allclose(left_entropies(state, count, 2).von_neumann, entropy)
    assert np.allclose(operator_entanglement(state, count, 2)[0], 2 * entropy)
    negativity = 2 * np.log(np.sqrt(share) + np.sqrt(1 - share))
    assert np.allclose(logarithmic_negativity(state, count, 2), negativity)


@pytest.mark.parametrize(("count", "dimension"), [(6, 2), (4, 3)])
def test_pure_states_by_their_schmidt_coefficients(count, dimension):
    """``E_N = 2 ln sum sqrt p``: G. Vidal, R. F. Werner, PRA 65, 032314 (2002), from memory."""
    vector = random_matrix(dimension**count, 1)[0]
    state = pure(vector)
    parts = left_entropies(state, count, dimension)
    negativity = logarithmic_negativity(state, count, dimension)
    operator = operator_entanglement(state, count, dimension)[0]
    for cut in range(1, count):
        weights = np.linalg.svd(vector.reshape(dimension**cut, -1), compute_uv=False) ** 2
        weights /= weights.sum()
        entropy = -np.sum(weights * np.log(weights))
        assert parts.von_neumann[cut - 1] == pytest.approx(entropy)
        assert parts.renyi_two[cut - 1] == pytest.approx(-np.log(np.sum(weights**2)))
        assert operator[cut - 1] == pytest.approx(2 * entropy)
        assert negativity[cut - 1] == pytest.approx(2 * np.log(np.sum(np.sqrt(weights))))


@pytest.mark.parametrize("share", [0.0, 0.2, 1 / 3, 0.5, 1.0])
def test_singlet_in_noise(share):
    """``p |singlet><singlet| + (1-p)/4``: ``ln max(1, (1 + 3p)/2)``; weights 1 : p^2 : p^2 : p^2.

    R. F. Werner, Phys. Rev. A 40, 4277 (1989); from memory.
    """
    state = share * pure([0, 1, -1, 0]) + (1 - share) * maximally_mixed(2, 2)
    expected = np.log(max(1.0, (1 + 3 * share) / 2))
    assert logarithmic_negativity(state, 2, 2)[0] == pytest.approx(expected, abs=1e-12)
    weights = np.array([1, share**2, share**2, share**2]) / (1 + 3 * share**2)
    found = schmidt_weights(state, 1, 2, 2)
    assert np.allclose(found, weights[: found.size])
    assert found.sum() == pytest.approx(1)
    assert operator_entanglement(state, 2, 2)[1][0] == (4 if share else 1)


@pytest.mark.parametrize("beta", [0.1, 0.2, 1.0])
def test_thermal_pair(beta):
    """``H = XX + YY + ZZ``: singlet weight ``f = 1/(1 + 3 exp(-4 beta))``, ``ln max(1, 2f)``."""
    state = gibbs_state(Model(name="pair", sites=2, hamiltonian=(Term("X X + Y Y + Z Z"),)), beta)
    weight = 1 / (1 + 3 * np.exp(-4 * beta))
    expected = np.log(max(1.0, 2 * weight))
    assert logarithmic_negativity(state, 2, 2)[0] == pytest.approx(expected, abs=1e-12)


@pytest.mark.parametrize("beta", [0.3, 1.2])
def test_classical_chain(beta):
    """``exp(-beta sum Z Z)/Z``: no negativity, weights ``cosh^2 : sinh^2`` of beta at every cut.

    ``exp(-beta Z Z) = cosh(beta) - sinh(beta) Z Z``, and both sides of the cut have flip symmetry,
    so that 1 and Z stay orthogonal there and of equal norm.
    """
    state = gibbs_state(Model(name="classical", sites=4, hamiltonian=(Term("Z Z"),)), beta)
    assert np.abs(logarithmic_negativity(state, 4, 2)).max() < 1e-14
    weights = np.array([np.cosh(beta) ** 2, np.sinh(beta) ** 2])
    weights /= weights.sum()
    entropies, ranks = operator_entanglement(state, 4, 2)
    assert np.allclose(entropies, -np.sum(weights * np.log(weights)))
    assert np.array_equal(ranks, [2, 2, 2])


@pytest.mark.parametrize("dimension", [2, 3])
def test_product_states(dimension):
    """No entanglement; entropies add up, purities multiply."""
    sites = [random_density(dimension, seed) for seed in range(4)]
    state = product_state(sites)
    assert np.abs(logarithmic_negativity(state, 4, dimension)).max() < 1e-12
    entropies, ranks = operator_entanglement(state, 4, dimension)
    assert np.abs(entropies).max() < 1e-11
    assert np.array_equal(ranks, [1, 1, 1])
    singles = [von_neumann_entropy(site) for site in sites]
    assert np.allclose(left_entropies(state, 4, dimension).von_neumann, np.cumsum(singles)[:-1])
    assert von_neumann_entropy(state) == pytest.approx(sum(singles))
    assert purity(state) == pytest.approx(np.prod([purity(site) for site in sites]))
    assert renyi_two(state) == pytest.approx(-np.log(purity(state)))


def test_maximally_mixed_state():
    state = maximally_mixed(4, 3)
    parts = left_entropies(state, 4, 3)
    expected = np.arange(1, 4) * np.log(3)
    assert np.allclose(parts.von_neumann, expected)
    assert np.allclose(parts.renyi_two, expected)
    assert von_neumann_entropy(state) == pytest.approx(4 * np.log(3))
    assert purity(state) == pytest.approx(1 / 81)


def brute_force_weights(operator, cut, count, dimension):
    left = dimension**cut
    right = dimension ** (count - cut)
    matrix = operator.reshape(left, right, left, right).transpose(0, 2, 1, 3)
    weights = np.linalg.svd(matrix.reshape(left**2, -1), compute_uv=False) ** 2
    return weights / weights.sum()


@pytest.mark.parametrize(("count", "dimension"), [(5, 2), (3, 3)])
def test_schmidt_weights_against_singular_values(count, dimension):
    """Hermitian complex, Hermitian real and arbitrary operators take three different ways."""
    size = dimension**count
    density = random_density(size, 2)
    for operator in (density, density.real, random_matrix(size, 3)):
        for cut in range(1, count):
            found = schmidt_weights(operator, cut, count, dimension)
            expected = brute_force_weights(operator, cut, count, dimension)
            assert np.abs(found - expected).max() < 1e-14


@pytest.mark.parametrize(("count", "dimension"), [(5, 2), (4, 3)])
def test_states_with_a_charge_against_dense_matrices(count, dimension):
    """Random states that commute with the total charge, whose matrices fall into blocks."""
    size = dimension**count
    charge = np.zeros(1, dtype=int)
    for _ in range(count):
        charge = np.add.outer(charge, np.arange(dimension)).ravel()
    density = random_density(size, 4) * (charge[:, None] == charge[None, :])
    density /= np.trace(density)
    negativity = logarithmic_negativity(density, count, dimension)
    for cut in range(1, count):
        left, right = dimension**cut, dimension ** (count - cut)
        turned = density.reshape(left, right, left, right).transpose(2, 1, 0, 3)
        values = np.linalg.eigvalsh(turned.reshape(size, size))
        assert negativity[cut - 1] == pytest.approx(np.log(np.abs(values).sum()), abs=1e-12)
        found = schmidt_weights(density, cut, count, dimension)
        expected = brute_force_weights(density, cut, count, dimension)
        assert np.abs(found - expected[: found.size]).max() < 1e-14
        assert np.abs(expected[found.size :]).max(initial=0) < 1e-14
    values = np.linalg.eigvalsh(density)
    assert von_neumann_entropy(density) == pytest.approx(-np.sum(values * np.log(values)))


def test_local_unitaries_change_no_entanglement():
    density = random_density(16, 5)
    unitary = np.eye(1)
    for seed in range(4):
        unitary = np.kron(unitary, np.linalg.qr(random_matrix(2, seed))[0])
    rotated = unitary @ density @ unitary.conj().T
    for measure in (
        logarithmic_negativity,
        lambda *state: operator_entanglement(*state)[0],
        lambda *state: left_entropies(*state).von_neumann,
    ):
        assert np.allclose(measure(rotated, 4, 2), measure(density, 4, 2), atol=1e-11)


def test_cost_grows_and_a_charge_saves():
    whole, block = entanglement_cost(12, 2), entanglement_cost(12, 2, charge=True)
    assert block.seconds < whole.seconds / 10
    assert block.memory_bytes < whole.memory_bytes
    assert 14 < entanglement_cost(13, 2).seconds / whole.seconds / (13 / 12) * 2 < 18
    assert entanglement_cost(6, 4).memory_bytes == whole.memory_bytes
    assert entanglement_cost(1, 2).memory_bytes > 0


def test_cost_that_does_not_fit_is_refused():
    with pytest.raises(CapacityError, match="entanglement of 20 sites needs"):
        entanglement_cost(20, 2).require_fit()
    with pytest.raises(UsageError, match="at least 1"):
        entanglement_cost(0, 2)
