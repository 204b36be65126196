"""The generator against plain Kronecker products, and its identities."""

import numpy as np
import pytest

from lbwork import provenance
from lbwork.errors import CapacityError, ModelError
from lbwork.generator import (
    Lindbladian,
    doubled_to_vector,
    superoperator_terms,
    two_site_density,
    vector_to_doubled,
)
from lbwork.generator import lindbladian as module
from lbwork.generator.certificates import certify_generator
from lbwork.model import Jump, Model, Term, catalogue, load_model
from tests.generator.dense import embedded, superoperator
from tests.generator.models import CASES, random_model


def random_matrix(seed, size):
    generator = np.random.default_rng(seed)
    return generator.normal(size=(size, size)) + 1j * generator.normal(size=(size, size))


@pytest.mark.parametrize("name", CASES)
def test_matrix_equals_kronecker_products(name):
    assert np.abs(Lindbladian(CASES[name]).matrix() - superoperator(CASES[name])).max() < 1e-12


@pytest.mark.parametrize("name", CASES)
def test_action_equals_matrix(name):
    generator = Lindbladian(CASES[name])
    matrix = superoperator(CASES[name])
    rho = random_matrix(1, generator.dimension)
    assert np.allclose(generator.apply(rho).ravel(), matrix @ rho.ravel(), atol=1e-11)
    adjoint = generator.apply_adjoint(rho).ravel()
    assert np.allclose(adjoint, matrix.conj().T @ rho.ravel(), atol=1e-11)


@pytest.mark.parametrize("name", CASES)
def test_trace_and_hermiticity_are_preserved(name):
    generator = Lindbladian(CASES[name])
    rho = random_matrix(2, generator.dimension)
    image = generator.apply(rho)
    assert abs(np.trace(image)) < 1e-11 * np.abs(image).max() * generator.dimension
    assert np.allclose(generator.apply(rho.conj().T), image.conj().T, atol=1e-11)


@pytest.mark.parametrize("name", CASES)
def test_parts_add_up(name):
    generator = Lindbladian(CASES[name])
    rho = random_matrix(3, generator.dimension)
    total = generator.jump_part(rho) + generator.no_jump_part(rho)
    assert np.allclose(total, generator.apply(rho), atol=1e-11)


@pytest.mark.parametrize("name", CASES)
def test_local_terms_add_up_on_the_doubled_chain(name):
    model = CASES[name]
    base = model.local_dimension**2
    total = sum(
        (
            embedded(term.matrix, term.sites, model.sites, base)
            for term in superoperator_terms(model)
        ),
        np.zeros((base**model.sites,) * 2, dtype=complex),
    )
    order = vector_to_doubled(np.arange(base**model.sites), model.sites, model.local_dimension)
    expected = superoperator(model)[np.ix_(order, order)]
    assert np.abs(total - expected).max() < 1e-12


@pytest.mark.parametrize(("sites", "dimension"), [(1, 2), (3, 2), (2, 3)])
def test_orders_are_inverse(sites, dimension):
    vector = np.arange(dimension ** (2 * sites))
    there = vector_to_doubled(vector, sites, dimension)
    assert np.array_equal(doubled_to_vector(there, sites, dimension), vector)
    # |a1 a2 ..><b1 b2 ..| has digits d a_j + b_j: the state |10><01| of two spins.
    if (sites, dimension) == (2, 3):
        assert there[(3 * 1 + 0) * 9 + (3 * 0 + 1)] == (1 * 3 + 0) * 9 + (0 * 3 + 1)


@pytest.mark.parametrize("name", CASES)
def test_generators_are_certified(name):
    certificate = Lindbladian(CASES[name]).certificate()
    assert certificate.certified
    assert set(certificate.to_dict()) >= {"trace_error", "dissipator_min_eigenvalue"}


def test_negative_dissipator_is_noticed(monkeypatch):
    """Negative control: a generator whose jump part has the wrong sign."""
    from lbwork.generator import certificates
    from lbwork.generator.terms import SuperTerm

    model = Model("a", 1, jumps=(Jump("S-"),))
    wrong = tuple(SuperTerm(term.sites, -term.matrix) for term in superoperator_terms(model))
    monkeypatch.setattr(certificates, "superoperator_terms", lambda _: wrong)
    certificate = certify_generator(model)
    assert certificate.dissipator_min_eigenvalue < -0.1
    assert not certificate.certified


def test_norm_bound_is_a_bound():
    model = random_model(11, sites=3)
    assert np.linalg.norm(superoperator(model), 2) <= Lindbladian(model).norm_bound


@pytest.mark.parametrize(
    "entry",
    [entry for entry in catalogue() if entry.model().boundary == "periodic"],
    ids=lambda entry: entry.name,
)
def test_two_site_density_sums_to_the_generator(entry):
    model = entry.model().replace(sites=3)
    density = two_site_density(model)
    base = model.local_dimension**2
    total = sum(embedded(density, (j, (j + 1) % 3), 3, base) for j in range(3))
    terms = superoperator_terms(model)
    expected = sum(embedded(term.matrix, term.sites, 3, base) for term in terms)
    assert np.abs(total - expected).max() < 1e-12


def test_two_site_density_refuses_what_has_none():
    with pytest.raises(ModelError, match="open chain"):
        two_site_density(load_model("xx-driven"))
    with pytest.raises(ModelError, match="3 sites"):
        two_site_density(Model("a", 4, boundary="periodic", hamiltonian=(Term("X X X"),)))
    uneven = Term("Z", coefficient=[0, 0, 1, 0])
    with pytest.raises(ModelError, match="site 3"):
        two_site_density(Model("a", 4, boundary="periodic", hamiltonian=(Term("X X"), uneven)))


def test_wrong_shape_is_refused():
    with pytest.raises(ModelError, match="shape"):
        Lindbladian(load_model("xx-driven", sites=2)).apply(np.eye(3))


def test_too_large_a_matrix_is_refused_before_it_is_built(monkeypatch):
    monkeypatch.setattr(module, "usable_memory", lambda: 10_000_000)
    with pytest.raises(CapacityError, match="GiB"):
        Lindbladian(load_model("xx-dephasing", sites=8)).matrix()
    assert provenance.usable_memory() > 10_000_000
