"""Charges of the infinite chain commute with the generator of short rings, as plain matrices."""

import dataclasses

import numpy as np
import pytest

from lbwork.errors import CapacityError, UsageError
from lbwork.generator import vector_to_doubled
from lbwork.integrability import (
    check_charge,
    conserved_charges,
    hamiltonian_density,
    local_density,
    reshetikhin_residual,
)
from lbwork.integrability.finite_checks import summed_operator
from tests.chains import kronecker_generator
from tests.integrability_chains import ring

XX = {"jx": 1.0, "jy": 1.0}
MODELS = {
    "XX + dephasing": ring(**XX, dephasing=0.5),
    "XXZ": ring(**XX, jz=0.5),
    "one-way hopping": ring(right=1.0),
    "two-way hopping": ring(right=1.0, left=0.3),
    "permutation": ring(permutation=1.0),
    "XX + loss": ring(**XX, loss=1.0),
}


def test_summed_density_is_the_generator():
    model = ring(**XX, jz=0.3, field_x=0.2, loss=0.5, right=0.7)
    plain = kronecker_generator(model)
    order = vector_to_doubled(np.arange(256), 4, 2)
    summed = summed_operator(local_density(model).matrix, 4, 4, True).toarray()
    assert np.abs(plain[np.ix_(order, order)] - summed).max() < 1e-13


@pytest.mark.parametrize("name", MODELS)
def test_charges_commute_on_rings(name):
    result = conserved_charges(MODELS[name], max_range=3)
    for charge in result.charges:
        assert check_charge(charge).residual < 1e-13
        assert check_charge(charge, 5).passed


@pytest.mark.parametrize("name", ["XX + dephasing", "XXZ", "one-way hopping"])
def test_only_the_ends_are_left_on_open_chains(name):
    result = conserved_charges(MODELS[name], max_range=3)
    for charge in result.charges:
        check = check_charge(charge, boundary="open")
        assert check.residual < 1e-13


def test_third_charge_is_not_conserved_at_open_ends():
    third = conserved_charges(hamiltonian_density(ring(**XX, jz=0.5)), max_range=3).charges[-1]
    check = check_charge(third, boundary="open")
    assert check.passed and check.ends > 1e-3
    assert "left over at the ends" in str(check)


def test_longer_charges_on_a_ring_of_six():
    result = conserved_charges(hamiltonian_density(ring(**XX, jz=0.5)), max_range=5)
    assert check_charge(result.charges[-1], 6).residual < 1e-13
    assert check_charge(result.charges[-1], 9).passed


def test_a_spoiled_charge_fails():
    charge = conserved_charges(MODELS["XX + dephasing"], max_range=3).charges[-1]
    values = charge.values.copy()
    values[0] *= 1 + 1e-6
    check = check_charge(dataclasses.replace(charge, values=values))
    assert not check.passed and 1e-9 < check.residual < 1e-5
    assert "does not commute" in str(check) and not check.to_dict()["passed"]


def test_freedom_of_the_derivative_is_the_number_of_short_charges():
    for model in MODELS.values():
        dimensions = conserved_charges(model, max_range=2).dimensions
        assert reshetikhin_residual(model).freedom == dimensions[1]


def test_charges_of_rotated_density_are_rotated():
    generator = np.random.default_rng(4)
    mixed = generator.normal(size=(2, 2)) + 1j * generator.normal(size=(2, 2))
    unitary = np.linalg.qr(mixed)[0]
    both = np.kron(unitary, unitary.conj())
    pair = np.kron(both, both)
    density = pair @ local_density(MODELS["XX + dephasing"]).matrix @ pair.conj().T
    result = conserved_charges(local_density(density, doubled=True), max_range=3)
    assert result.dimensions == (2, 3, 4)
    assert all(check_charge(charge).passed for charge in result.charges)


def test_bad_chains_are_refused():
    charge = conserved_charges(MODELS["XXZ"], max_range=3).charges[-1]
    with pytest.raises(UsageError, match="at least 4"):
        check_charge(charge, 3)
    with pytest.raises(UsageError, match="twisted"):
        check_charge(charge, boundary="twisted")
    with pytest.raises(CapacityError, match="fewer sites"):
        check_charge(charge, 12)
