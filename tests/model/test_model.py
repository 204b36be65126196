"""Identities of models: same physics, same identity; files round-trip; terms are what they say."""

import numpy as np
import pytest

from lbwork.errors import ModelError
from lbwork.model import (
    Jump,
    Model,
    RandomOperator,
    Term,
    catalogue,
    load_model,
    local_operator,
    model_from_toml,
    model_to_toml,
)
from lbwork.model.canonical import on_site_basis

X, Y, Z = (local_operator(name, 2) for name in "XYZ")
ONE = np.eye(2)
ENTRIES = {entry.name: entry for entry in catalogue()}


def total_hamiltonian(model):
    """Plain Kronecker products, for short open or periodic chains."""
    dimension, sites = model.local_dimension, model.sites
    total = np.zeros((dimension**sites,) * 2, dtype=complex)
    for placed in model.placed_hamiltonian():
        rest = [site for site in range(sites) if site not in placed.sites]
        full = np.kron(placed.matrix, np.eye(dimension ** len(rest)))
        back = np.argsort([*placed.sites, *rest])
        tensor = full.reshape((dimension,) * (2 * sites))
        total += tensor.transpose([*back, *(sites + back)]).reshape(total.shape)
    return total


def test_expression_is_the_kronecker_sum():
    model = Model("a", 2, parameters={"delta": 0.7}, hamiltonian=(Term("X X + Y Y + delta Z Z"),))
    expected = np.kron(X, X) + np.kron(Y, Y) + 0.7 * np.kron(Z, Z)
    assert np.allclose(total_hamiltonian(model), expected)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("2 X", 2 * X),
        ("-X + Z", Z - X),
        ("0.5*(X + 1j*Y)", local_operator("S+", 2)),
        ("S+", (X + 1j * Y) / 2),
        ("Sx^2", 0.25 * ONE),
        ("X.Y", 1j * Z),
        ("exp(1j*pi/2) I", 1j * ONE),
        ("E01", np.array([[0, 1], [0, 0]])),
        ("P1", np.diag([0, 1])),
        ("n", np.diag([1, 0])),
        ("X/2 - X/4", X / 4),
        ("sqrt(2)**2 Z", 2 * Z),
    ],
)
def test_one_site_expressions(text, expected):
    jump = Jump(text)
    model = Model("a", 1, jumps=(jump,))
    assert np.allclose(model.placed_jumps()[0].matrix, expected)


@pytest.mark.parametrize("dimension", [2, 3, 4, 5])
def test_spin_algebra(dimension):
    """[Sx, Sy] = i Sz and S^2 = s (s + 1): definition of the representation."""
    sx, sy, sz = (local_operator(name, dimension) for name in ("Sx", "Sy", "Sz"))
    spin = (dimension - 1) / 2
    assert np.allclose(sx @ sy - sy @ sx, 1j * sz)
    assert np.allclose(sx @ sx + sy @ sy + sz @ sz, spin * (spin + 1) * np.eye(dimension))
    assert sz[0, 0].real == spin


@pytest.mark.parametrize("dimension", [2, 3, 4])
def test_canonical_basis_is_orthonormal(dimension):
    basis = on_site_basis(dimension)
    overlaps = np.einsum("aij,bij->ab", basis.conj(), basis)
    assert np.allclose(overlaps, dimension * np.eye(dimension**2))


def reference():
    return Model(
        "a",
        3,
        hamiltonian=(Term("X X + Y Y"), Term("Z", coefficient=[0.1, 0.2, 0.3])),
        jumps=(Jump("S-", rate=2.0),),
    )


def test_the_same_model_written_otherwise_has_the_same_identity():
    other = Model(
        "another name",
        3,
        parameters={"unused": 4},
        hamiltonian=(
            Term(np.kron(X, X) + 0.1 * np.kron(Z, ONE), on=[1]),
            Term(np.kron(Y, Y), on=[2, 1]),
            Term("X X + 0.2 Z I + 0.3 I Z + 5 I I", on=[2]),
        ),
        jumps=(
            Jump("S-", on=[3], rate=1, coefficient=2**0.5 * 1j),
            Jump([[0, 0], ["sqrt(2)", 0]], on=[2, 1]),
            Jump("X", rate=0),
        ),
    )
    assert other.identity == reference().identity
    assert other != reference()


def test_different_models_have_different_identities():
    models = [
        reference(),
        Model("a", 3, hamiltonian=(Term("X X"),)),
        Model("a", 3, boundary="periodic", hamiltonian=(Term("X X"),)),
        Model("a", 4, hamiltonian=(Term("X X"),)),
        Model("a", 3, hamiltonian=(Term("X X", coefficient=1.000001),)),
        Model("a", 3, hamiltonian=(Term("X X"),), jumps=(Jump("S-"),)),
        Model("a", 3, hamiltonian=(Term("X X"),), jumps=(Jump("S+"),)),
        Model("a", 3, local_dimension=3, hamiltonian=(Term("Sx Sx"),)),
    ]
    assert len({model.identity for model in models}) == len(models)


def test_one_and_one_point_zero_are_the_same_number():
    whole = Model("a", 2, parameters={"g": 1}, jumps=(Jump("Z", rate="g"),))
    point = Model("a", 2, parameters={"g": 1.0}, jumps=(Jump("Z", rate="g"),))
    assert whole == point
    assert hash(whole) == hash(point)
    assert whole.identity == point.identity


@pytest.mark.parametrize("name", ENTRIES)
def test_catalogue_models_round_trip(name):
    model = ENTRIES[name].model()
    again = model_from_toml(model_to_toml(model))
    assert again == model
    assert again.identity == model.identity


@pytest.mark.parametrize("name", ENTRIES)
def test_catalogue_says_where_a_model_comes_from(name):
    entry = ENTRIES[name]
    assert any(character.isdigit() for character in entry.source)
    assert entry.integrable in ("yes", "no", "unknown")
    assert entry.argument and entry.known and entry.sensible_sites


def test_catalogue_is_large_enough():
    assert len(ENTRIES) >= 14


def test_odd_values_round_trip():
    model = Model(
        'quotes " and \\ and \u00e9',
        2,
        description="two\nlines\ttab",
        parameters={"z": 0.5 + 0.25j, "tiny": 1e-300},
        hamiltonian=(Term([[1.5, "1j*tiny"], ["-1j*tiny", 0]], on=[2], coefficient=[0.1]),),
        jumps=(
            Jump(RandomOperator("ginibre", 2, 7), rate=[0.25]),
            Jump([[0, 0.5 - 2j], [1, 0]], on="first", coefficient="z"),
        ),
    )
    assert model_from_toml(model_to_toml(model)) == model


def test_disorder_is_a_function_of_its_address():
    term = Term("Z", coefficient="0.5*random(3, j)")
    long = Model("a", 6, hamiltonian=(term,)).placed_hamiltonian()
    short = Model("a", 4, hamiltonian=(term,)).placed_hamiltonian()
    assert all(np.array_equal(a.matrix, b.matrix) for a, b in zip(long, short, strict=False))
    values = [placed.matrix[0, 0].real for placed in long]
    assert len(set(values)) == 6
    assert all(abs(value) <= 0.5 for value in values)


def test_ring_wraps_and_open_chain_does_not():
    ring = Model("a", 4, boundary="periodic", hamiltonian=(Term("X I X"),))
    assert [placed.sites for placed in ring.placed_hamiltonian()][-2:] == [(2, 3, 0), (3, 0, 1)]
    chain = Model("a", 4, hamiltonian=(Term("X I X"),))
    assert [placed.sites for placed in chain.placed_hamiltonian()] == [(0, 1, 2), (1, 2, 3)]


def test_first_last_and_listed_places():
    model = Model(
        "a",
        4,
        hamiltonian=(Term("X X", on="last"), Term("X X", on="first"), Term("X X", on=[2])),
    )
    assert [placed.sites for placed in model.placed_hamiltonian()] == [(2, 3), (0, 1), (1, 2)]


def test_replace_reevaluates_expressions():
    model = load_model("xxz-dephasing", delta=0.25, sites=5)
    assert model.sites == 5
    assert model.parameters["delta"] == 0.25
    bond = model.placed_hamiltonian()[0].matrix
    assert bond[0, 0].real == 0.25


def test_hermitian_sum_of_non_hermitian_terms_is_legal():
    model = Model("a", 3, hamiltonian=(Term("S+ S-"), Term("S- S+")))
    assert np.allclose(total_hamiltonian(model), total_hamiltonian(model).conj().T)


def test_random_operator_is_seeded_and_normalised():
    one = Model("a", 2, jumps=(Jump(RandomOperator("ginibre", 2, 5)),)).placed_jumps()[0].matrix
    two = Model("b", 2, jumps=(Jump(RandomOperator("ginibre", 2, 5)),)).placed_jumps()[0].matrix
    assert np.array_equal(one, two)
    assert np.linalg.norm(one) ** 2 == pytest.approx(4)


def test_models_are_frozen():
    with pytest.raises(AttributeError):
        reference().sites = 4
    with pytest.raises(TypeError):
        reference().parameters["x"] = 1


def test_per_place_list_must_fit_the_new_size():
    with pytest.raises(ModelError, match="3 values for 4 places"):
        reference().replace(sites=4)
