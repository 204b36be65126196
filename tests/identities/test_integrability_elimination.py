"""Null spaces by elimination agree with dense linear algebra on awkward matrices."""

import numpy as np
import pytest
import scipy.sparse as sparse
from hypothesis import given, settings
from hypothesis import strategies as st

from lbwork.errors import CapacityError
from lbwork.integrability import conserved_charges, local_density
from lbwork.integrability.elimination import null_space
from lbwork.integrability.least_squares import components, factored
from tests.integrability_chains import ring


def dense_nullity(matrix):
    singular = np.linalg.svd(matrix, compute_uv=False)
    return matrix.shape[1] - int(np.sum(singular > 1e-9 * max(singular.max(initial=0), 1e-300)))


def assert_is_null_space(matrix):
    found = null_space(sparse.csc_matrix(matrix))
    vectors = found.vectors.toarray()
    assert vectors.shape[1] == dense_nullity(matrix)
    if vectors.shape[1]:
        assert np.abs(matrix @ vectors).max(initial=0) < 1e-10 * max(
            np.abs(matrix).max(initial=0), 1.0
        )
        assert np.linalg.matrix_rank(vectors) == vectors.shape[1]


CORNERS = {
    "zero": np.zeros((3, 4), dtype=complex),
    "identity": np.eye(4, dtype=complex),
    "one entry": np.array([[2.0 + 0j]]),
    "one zero": np.array([[0j]]),
    "repeated rows": np.tile(np.array([[1, 2, 0], [0, 1, -1j]]), (3, 1)),
    "rank one": np.outer([1, 2, 3], [1, -1j, 0.5, 0]),
    "chain of ties": np.eye(6, dtype=complex)[:-1] - np.eye(6, k=1)[:-1],
    "closed chain that agrees": np.eye(4, dtype=complex) - np.roll(np.eye(4), 1, axis=1),
    "closed chain that disagrees": np.eye(4, dtype=complex) + np.roll(np.eye(4), 1, axis=1) * 2,
    "tiny entries": np.array([[1, 1e-7, 0], [0, 1e-7, 1e-7], [0, 0, 1]], dtype=complex),
    "no rows": np.zeros((0, 3), dtype=complex),
}


@pytest.mark.parametrize("name", CORNERS)
def test_corner_matrices(name):
    assert_is_null_space(CORNERS[name])


@settings(max_examples=60)
@given(st.integers(0, 2**32 - 1), st.integers(1, 12), st.integers(1, 12), st.floats(0.05, 0.5))
def test_sparse_random_matrices(seed, rows, columns, density):
    generator = np.random.default_rng(seed)
    values = generator.integers(-2, 3, size=(rows, columns)) + 1j * generator.integers(
        -1, 2, size=(rows, columns)
    )
    assert_is_null_space(values * (generator.random((rows, columns)) < density))


@settings(max_examples=30)
@given(st.integers(0, 2**32 - 1))
def test_least_squares_of_decoupled_parts(seed):
    generator = np.random.default_rng(seed)
    blocks = [
        generator.normal(size=generator.integers(1, 5, size=2)) + 0j
        for _ in range(generator.integers(1, 4))
    ]
    matrix = sparse.block_diag(blocks, format="csc")
    order = generator.permutation(matrix.shape[1])
    matrix = matrix[generator.permutation(matrix.shape[0])][:, order].tocsc()
    assert len(list(components(matrix))) == len(blocks)
    target = generator.normal(size=(matrix.shape[0], 2)) + 0j
    solution, residual = factored(matrix).solve(target)
    expected = np.linalg.lstsq(matrix.toarray(), target, rcond=None)[0]
    assert np.abs(solution - expected).max() < 1e-9
    assert np.abs(residual - (target - matrix @ solution)).max() < 1e-10
    assert factored(matrix).freedom == dense_nullity(matrix.toarray())


def rotation(seed):
    generator = np.random.default_rng(seed)
    matrix = generator.normal(size=(2, 2)) + 1j * generator.normal(size=(2, 2))
    unitary = np.linalg.qr(matrix)[0]
    site = np.kron(unitary, unitary.conj())
    return np.kron(site, site)


@pytest.mark.parametrize(
    ("parameters", "dimensions"),
    [
        ({"right": 1.0, "left": 0.3}, (3, 8, 54)),
        ({"jx": 1.0, "field_z": 0.6}, (0, 4, 8)),
        ({"jz": 1.0, "field_x": 0.6, "field_z": 0.3}, (0, 2, 2)),
    ],
)
def test_tilted_densities_are_turned_until_they_are_sparse(parameters, dimensions):
    """These densities are not injective, and dense in a tilted basis."""
    pair = rotation(6)
    density = pair @ local_density(ring(**parameters)).matrix @ pair.conj().T
    result = conserved_charges(local_density(density, doubled=True), max_range=3)
    assert result.dimensions == dimensions
    assert result.residual < 1e-11


def test_large_dense_parts_are_refused():
    generator = np.random.default_rng(1)
    rows = sparse.csc_matrix((70_000, 900), dtype=complex).tolil()
    rows[:900] = np.triu(generator.normal(size=(900, 900))) + 1.0
    rows[900:, :3] = 1.0
    with pytest.raises(CapacityError, match="does not decouple"):
        factored(rows.tocsc())
