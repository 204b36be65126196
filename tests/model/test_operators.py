"""Named operators: defining relations for every local dimension."""

import numpy as np
import pytest

from lbwork.model.operators import known_operator_names, local_operator
from lbwork.model.strings import on_site_basis


@pytest.mark.parametrize("dimension", [2, 3, 4, 5, 10])
def test_spin_algebra(dimension):
    """[Sx, Sy] = i Sz and S^2 = s (s + 1): definition of the representation."""
    sx, sy, sz = (local_operator(name, dimension) for name in ("Sx", "Sy", "Sz"))
    spin = (dimension - 1) / 2
    assert np.allclose(sx @ sy - sy @ sx, 1j * sz)
    assert np.allclose(sx @ sx + sy @ sy + sz @ sz, spin * (spin + 1) * np.eye(dimension))
    assert sz[0, 0].real == spin
    assert np.allclose(local_operator("S+", dimension), sx + 1j * sy)
    assert np.allclose(local_operator("S-", dimension), sx - 1j * sy)


def test_raising_leads_to_state_zero():
    """State 0 is up and occupied."""
    up, down = np.array([1, 0]), np.array([0, 1])
    assert np.array_equal(local_operator("S+", 2) @ down, up)
    assert np.array_equal(local_operator("S+", 2) @ up, 0 * up)
    assert np.array_equal(local_operator("n", 2) @ up, up)
    assert np.array_equal(local_operator("Z", 2) @ up, up)


@pytest.mark.parametrize("dimension", [2, 3, 5])
def test_clock_and_shift(dimension):
    """Z X = w X Z with w = exp(2 pi i/d), and both have order d."""
    clock, shift = local_operator("Zd", dimension), local_operator("Xd", dimension)
    phase = np.exp(2j * np.pi / dimension)
    assert np.allclose(clock @ shift, phase * shift @ clock)
    for matrix in (clock, shift):
        assert np.allclose(np.linalg.matrix_power(matrix, dimension), np.eye(dimension))


@pytest.mark.parametrize("dimension", [2, 3, 10])
def test_matrix_units(dimension):
    last = dimension - 1
    unit = local_operator(f"E0{last}", dimension)
    assert unit[0, last] == 1
    assert np.count_nonzero(unit) == 1
    projectors = sum(local_operator(f"P{level}", dimension) for level in range(dimension))
    assert np.array_equal(projectors, np.eye(dimension))


@pytest.mark.parametrize("dimension", [2, 3, 10])
def test_known_names_are_those_that_exist(dimension):
    for name in known_operator_names(dimension):
        assert local_operator(name, dimension).shape == (dimension, dimension)
    for name in ("W", "E", "P", f"P{dimension}", "E0", "S", "Sz2", "1"):
        assert local_operator(name, dimension) is None


def test_pauli_matrices_belong_to_two_states():
    for name in ("X", "Y", "Z", "n"):
        assert local_operator(name, 2) is not None
        assert local_operator(name, 3) is None


def test_shared_matrices_cannot_be_changed():
    with pytest.raises(ValueError, match="read-only"):
        local_operator("Z", 2)[0, 0] = 5


@pytest.mark.parametrize("dimension", [2, 3, 4])
def test_canonical_basis_is_orthonormal_and_hermitian(dimension):
    basis = on_site_basis(dimension)
    overlaps = np.einsum("aij,bij->ab", basis.conj(), basis)
    assert np.allclose(overlaps, dimension * np.eye(dimension**2))
    assert np.array_equal(basis, basis.conj().transpose(0, 2, 1))
    assert np.array_equal(basis[0], np.eye(dimension))
