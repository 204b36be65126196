"""The residuals do not depend on how a density is written."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from lbwork.integrability import local_density, reshetikhin_residual
from tests.integrability_chains import ring

MODELS = {
    "closed": ring(jx=1.0, jy=0.7, jz=0.4, field_x=0.3, field_z=0.2),
    "dephasing": ring(jx=1.0, jy=1.0, field_z=0.4, dephasing=0.7),
    "hopping": ring(jx=0.5, jy=0.5, right=1.0, left=0.2),
}
DENSITIES = {name: local_density(model).matrix for name, model in MODELS.items()}


def residuals(matrix):
    result = reshetikhin_residual(matrix, doubled=True)
    return result.difference, result.non_difference, result.freedom


@pytest.fixture(scope="module")
def references():
    return {name: residuals(matrix) for name, matrix in DENSITIES.items()}


def random_unitary(seed, size):
    generator = np.random.default_rng(seed)
    matrix = generator.normal(size=(size, size)) + 1j * generator.normal(size=(size, size))
    return np.linalg.qr(matrix)[0]


names = st.sampled_from(sorted(DENSITIES))
seeds = st.integers(0, 2**32 - 1)


def assert_unchanged(matrix, reference):
    difference, non_difference, freedom = residuals(matrix)
    assert difference == pytest.approx(reference[0], abs=1e-11)
    assert non_difference == pytest.approx(reference[1], abs=1e-11)
    assert freedom == reference[2]


@settings(max_examples=12)
@given(names, st.floats(0.05, 20), st.floats(0, 6.28), st.floats(-5, 5))
def test_scaling_and_identity(references, name, size, phase, shift):
    matrix = size * np.exp(1j * phase) * DENSITIES[name] + shift * np.eye(16)
    assert_unchanged(matrix, references[name])


@settings(max_examples=12)
@given(names, seeds)
def test_telescoping_parts(references, name, seed):
    generator = np.random.default_rng(seed)
    part = generator.normal(size=(4, 4)) + 1j * generator.normal(size=(4, 4))
    one = np.eye(4)
    assert_unchanged(DENSITIES[name] + np.kron(part, one) - np.kron(one, part), references[name])


@settings(max_examples=12)
@given(names, seeds)
def test_rotation_of_every_site(references, name, seed):
    rotation = random_unitary(seed, 2)
    both = np.kron(rotation, rotation.conj())
    both = np.kron(both, both)
    assert_unchanged(both @ DENSITIES[name] @ both.conj().T, references[name])


@pytest.mark.parametrize("name", sorted(DENSITIES))
def test_rotation_that_mixes_ket_and_bra(references, name):
    both = random_unitary(5, 4)
    both = np.kron(both, both)
    assert_unchanged(both @ DENSITIES[name] @ both.conj().T, references[name])


@pytest.mark.parametrize("name", sorted(DENSITIES))
def test_reflection(references, name):
    mirrored = DENSITIES[name].reshape(4, 4, 4, 4).transpose(1, 0, 3, 2).reshape(16, 16)
    assert_unchanged(mirrored, references[name])


def test_residual_grows_with_the_perturbation():
    """Zero at the integrable point, then of the order of the distance from it."""
    values = [
        reshetikhin_residual(ring(jx=1.0, jy=1.0, jz=delta, dephasing=0.5)).non_difference
        for delta in (1e-6, 1e-4, 1e-2)
    ]
    assert values[1] / values[0] == pytest.approx(100, rel=0.01)
    assert values[2] / values[1] == pytest.approx(100, rel=0.05)
