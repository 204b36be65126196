"""The density of the bulk of an open chain adds up to the generator with what it leaves out."""

import numpy as np
import pytest

from lbwork.errors import ModelError
from lbwork.generator import bulk_two_site_density, superoperator_terms, two_site_density
from lbwork.model import Jump, Model, Term, load_model
from tests.generator.dense import embedded
from tests.generator.models import random_model

CHAINS = {
    "driven": load_model("xxz-driven", sites=4),
    "uniform": random_model(31, sites=4),
    "three sites": random_model(32, sites=3),
    "spin one": random_model(33, sites=3, dimension=3, ranges=(1, 2)),
    "boundary bond": Model(
        "a", 4, hamiltonian=(Term("X X"), Term("Z Z", on="first")), jumps=(Jump("S-"),)
    ),
}


@pytest.mark.parametrize("name", CHAINS)
def test_bulk_and_boundary_add_up(name):
    model = CHAINS[name]
    count, base = model.sites, model.local_dimension**2
    bulk = bulk_two_site_density(model)
    total = sum(embedded(bulk.matrix, (j, j + 1), count, base) for j in range(count - 1))
    total = total + sum(embedded(term.matrix, term.sites, count, base) for term in bulk.left_out)
    terms = superoperator_terms(model)
    expected = sum(embedded(term.matrix, term.sites, count, base) for term in terms)
    assert np.abs(total - expected).max() < 1e-12


def test_bulk_of_a_driven_chain_is_the_undriven_ring():
    driven = load_model("xxz-driven", sites=4)
    ring = Model(
        "a",
        4,
        boundary="periodic",
        parameters=driven.parameters,
        hamiltonian=driven.hamiltonian,
    )
    bulk = bulk_two_site_density(driven)
    assert np.abs(bulk.matrix - two_site_density(ring)).max() < 1e-14
    assert [term.sites for term in bulk.left_out] == [(0,), (3,)]
    assert bulk.sentence == "boundary terms are left out at site 1, site 4"


def test_boundary_bond_is_named():
    bulk = bulk_two_site_density(CHAINS["boundary bond"])
    assert bulk.sentence == "boundary terms are left out at site 1, site 4, bond 1"


def test_ring_leaves_nothing_out():
    model = load_model("xx-dephasing", sites=4)
    bulk = bulk_two_site_density(model)
    assert bulk.left_out == () and bulk.sentence == "nothing is left out"
    assert np.array_equal(bulk.matrix, two_site_density(model))


def test_bulk_that_is_not_uniform_is_refused():
    with pytest.raises(ModelError, match="no bulk"):
        bulk_two_site_density(load_model("xx-driven", sites=2))
    with pytest.raises(ModelError, match="3 sites"):
        bulk_two_site_density(Model("a", 4, hamiltonian=(Term("X X X"),)))
    uneven = Term("Z", coefficient=[0, 1, 2, 0])
    with pytest.raises(ModelError, match="site 3 differs from site 2"):
        bulk_two_site_density(Model("a", 4, hamiltonian=(Term("X X"), uneven)))
    bent = Term("X X", coefficient=[1, 1, 2, 1])
    with pytest.raises(ModelError, match="bond 3 differs from bond 2"):
        bulk_two_site_density(Model("a", 5, hamiltonian=(bent,)))
