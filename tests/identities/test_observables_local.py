"""Partial traces and correlations: consistency, sum rules, memory, refusals."""

import tracemalloc

import numpy as np
import pytest

from lbwork.errors import UsageError
from lbwork.observables import (
    connected_correlations,
    expectation,
    magnetisation_profile,
    reduced_density,
    spin_correlations,
    spin_operators,
    spin_profile,
    zz_correlations,
)
from lbwork.observables.blocks import (
    block_eigenvalues,
    block_gram_eigenvalues,
    hermitian_blocks,
    rectangular_blocks,
)
from tests.chains import embed


def random_matrix(size, seed):
    generator = np.random.default_rng(seed)
    return generator.normal(size=(size, size)) + 1j * generator.normal(size=(size, size))


def random_density(size, seed):
    matrix = random_matrix(size, seed)
    density = matrix @ matrix.conj().T
    return density / np.trace(density)


@pytest.mark.parametrize(("count", "dimension"), [(5, 2), (4, 3), (3, 4)])
def test_tracing_in_steps_is_tracing_at_once(count, dimension):
    density = random_density(dimension**count, 1)
    pair = reduced_density(density, (count - 1, 0, 1), count, dimension)
    assert np.trace(pair) == pytest.approx(1)
    for position, site in enumerate((count - 1, 0, 1)):
        single = reduced_density(pair, (position,), 3, dimension)
        assert np.allclose(single, reduced_density(density, (site,), count, dimension))
    assert np.allclose(reduced_density(density, range(count), count, dimension), density)
    assert np.allclose(reduced_density(density, (), count, dimension), [[1]])


def test_reduced_density_against_embedded_operators():
    """All subsets of a chain of three spin-1 sites, in all orders."""
    from itertools import permutations

    density = random_density(27, 2)
    for width in (1, 2, 3):
        operator = random_matrix(3**width, width)
        for sites in permutations(range(3), width):
            expected = np.trace(density @ embed(operator, sites, 3, 3))
            assert expectation(density, operator, sites, 3, 3) == pytest.approx(expected)


def test_memory_order_and_type_do_not_matter():
    density = random_density(16, 3)
    expected = reduced_density(density, (2, 0), 4, 2)
    assert np.allclose(reduced_density(np.asfortranarray(density), (2, 0), 4, 2), expected)
    assert np.allclose(reduced_density(density.conj().T, (2, 0), 4, 2), expected)
    real = reduced_density(density.real, (2, 0), 4, 2)
    assert real.dtype == np.float64
    assert np.allclose(real, expected.real)


@pytest.mark.parametrize("order", ["C", "F"])
def test_partial_traces_do_not_copy_the_state(order):
    """The temporaries of every local value stay below a hundredth of the state."""
    count = 10
    density = np.zeros((1024, 1024), dtype=complex, order=order)
    density[np.diag_indices(1024)] = 1 / 1024
    operators = spin_operators(2)
    tracemalloc.start()
    reduced_density(density, (0, 5, 9), count, 2)
    spin_profile(density, count, 2)
    spin_correlations(density, count, 2)
    connected_correlations(density, operators["x"], operators["y"], count, 2)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert peak < density.nbytes / 100


def test_fourteen_sites():
    """Twenty-eight axes; a state of one entry, since a full one would fill the memory."""
    density = np.broadcast_to(np.ones(1), (2**14, 2**14))
    reduced = reduced_density(density, (13, 0, 6), 14, 2)
    assert np.array_equal(reduced, np.full((8, 8), 2.0**11))


@pytest.mark.parametrize(("count", "dimension"), [(4, 2), (3, 3)])
def test_correlations_sum_to_the_covariance_of_the_totals(count, dimension):
    density = random_density(dimension**count, 4)
    first, second = random_matrix(dimension, 5), random_matrix(dimension, 6)
    totals = [
        sum(embed(matrix, (site,), count, dimension) for site in range(count))
        for matrix in (first, second)
    ]
    means = [np.trace(density @ total) for total in totals]
    covariance = np.trace(density @ totals[0] @ totals[1]) - means[0] * means[1]
    found = connected_correlations(density, first, second, count, dimension)
    assert found.sum() == pytest.approx(covariance)


def test_a_conserved_total_has_no_fluctuations():
    """Within one charge sector the rows of the zz correlations sum to zero."""
    charge = np.array([state.bit_count() for state in range(32)])
    density = random_density(32, 7) * np.outer(charge == 2, charge == 2)
    density /= np.trace(density)
    assert np.allclose(spin_correlations(density, 5, 2)[2].sum(axis=1), 0)


@pytest.mark.parametrize(("count", "dimension"), [(4, 2), (3, 3)])
def test_spin_correlations_of_each_axis(count, dimension):
    density = random_density(dimension**count, 8)
    found = spin_correlations(density, count, dimension)
    for row, operator in zip(found, spin_operators(dimension).values(), strict=True):
        expected = connected_correlations(density, operator, operator, count, dimension)
        assert np.allclose(row, expected.real)
        assert np.allclose(row, row.T)
    assert np.allclose(found[2], zz_correlations(density, count, dimension))
    profile = magnetisation_profile(density, count, dimension)
    assert np.allclose(spin_profile(density, count, dimension)[2], profile)


def test_what_does_not_fit_is_refused():
    density = np.eye(8) / 8
    for call, words in (
        (lambda: reduced_density(density, (0,), 2, 2), r"\(8, 8\).*must be \(4, 4\)"),
        (lambda: reduced_density(density, (1, 1), 3, 2), "sites 2, 2"),
        (lambda: reduced_density(density, (3,), 3, 2), "sites 4"),
        (lambda: reduced_density(density, (-1,), 3, 2), "sites 0"),
        (lambda: expectation(density, np.eye(2), (0, 1), 3, 2), r"must be \(4, 4\)"),
        (lambda: connected_correlations(density, np.eye(2), np.eye(3), 3, 2), r"\(3, 3\)"),
        (lambda: magnetisation_profile(density, 3, 3), r"must be \(27, 27\)"),
    ):
        with pytest.raises(UsageError, match=words):
            call()


def scattered(blocks, rows, columns):
    """The blocks along the diagonal, in the given orders of the rows and of the columns."""
    matrix = np.zeros((rows.size, columns.size), dtype=complex)
    row = column = 0
    for block in blocks:
        height, width = block.shape
        matrix[np.ix_(rows[row : row + height], columns[column : column + width])] = block
        row, column = row + height, column + width
    return matrix


def test_eigenvalues_of_scattered_blocks():
    blocks = [random_density(size, size) for size in (7, 1, 4, 4, 2)]
    order = np.random.default_rng(10).permutation(18)
    matrix = scattered(blocks, order, order)
    found = hermitian_blocks(matrix)
    assert sorted(len(chosen) for chosen in found) == [1, 2, 4, 4, 7]
    assert np.array_equal(np.sort(np.concatenate(found)), np.arange(18))
    before = matrix.copy()
    values = np.sort(block_eigenvalues(matrix))
    assert np.array_equal(matrix, before)
    assert np.allclose(values, np.linalg.eigvalsh(matrix))


def test_squares_of_singular_values_of_scattered_blocks():
    blocks = [
        random_matrix(9, seed)[:rows, :columns]
        for seed, (rows, columns) in enumerate([(3, 9), (9, 2), (1, 1), (4, 4)])
    ]
    generator = np.random.default_rng(11)
    rows, columns = generator.permutation(19), generator.permutation(19)
    matrix = scattered([*blocks, np.zeros((2, 3))], rows, columns)
    found = rectangular_blocks(matrix)
    assert sorted((rows.size, columns.size) for rows, columns in found) == [
        (1, 1),
        (3, 9),
        (4, 4),
        (9, 2),
    ]
    values = np.sort(block_gram_eigenvalues(matrix))
    expected = np.concatenate([np.linalg.svd(block, compute_uv=False) ** 2 for block in blocks])
    assert np.allclose(values, np.sort(expected))


def test_corners_of_the_blocks():
    zero = np.zeros((3, 3))
    assert np.array_equal(block_eigenvalues(zero), [0, 0, 0])
    assert block_gram_eigenvalues(zero).size == 0
    assert np.array_equal(block_eigenvalues(np.eye(4)), np.ones(4))
    assert np.array_equal(block_eigenvalues(np.array([[2.0]])), [2])
    exchange = np.array([[0, 1j], [-1j, 0]])
    assert np.allclose(np.sort(block_eigenvalues(exchange)), [-1, 1])
    assert len(hermitian_blocks(np.eye(2), exchange)) == 1
    whole = random_density(6, 12)
    before = whole.copy()
    block_eigenvalues(whole)
    assert np.array_equal(whole, before)
