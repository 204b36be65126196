"""Reference states and the measures of closeness, against closed forms and brute force."""

import numpy as np
import pytest
import scipy.linalg

from lbwork.errors import UsageError
from lbwork.generator import Lindbladian
from lbwork.model import Jump, Model, Term
from lbwork.observables import (
    checked_density,
    closeness,
    fidelity,
    gibbs_state,
    maximally_mixed,
    observables_of,
    product_state,
    reduced_density,
    spin_coherent,
    spin_operators,
    spin_profile,
    state_from_words,
    trace_distance,
)
from tests.chains import driven_chain, embed


def random_matrix(size, seed):
    generator = np.random.default_rng(seed)
    return generator.normal(size=(size, size)) + 1j * generator.normal(size=(size, size))


def random_density(size, seed):
    matrix = random_matrix(size, seed)
    density = matrix @ matrix.conj().T
    return density / np.trace(density)


@pytest.mark.parametrize("dimension", [2, 3])
@pytest.mark.parametrize("field", [0.0, 0.4])
def test_gibbs_state_against_the_matrix_exponential(dimension, field):
    model = Model(
        name="chain",
        sites=3,
        local_dimension=dimension,
        hamiltonian=(Term("Sx Sx + Sy Sy + 0.5 Sz Sz"), Term("Sz", coefficient="0.3*j")),
    )
    size = dimension**3
    energy = np.zeros((size, size), dtype=complex)
    for term in model.placed_hamiltonian():
        energy += embed(term.matrix, term.sites, 3, dimension)
    spin = spin_operators(dimension)["z"]
    total = sum(embed(spin, (site,), 3, dimension) for site in range(3))
    expected = scipy.linalg.expm(-0.8 * (energy - field * total))
    expected /= np.trace(expected)
    assert np.allclose(gibbs_state(model, 0.8, field), expected, atol=1e-14)


def test_free_spins_in_a_field():
    """``<sigma^z> = tanh(beta B)`` for H = -B sum Z, and for H = 0 with the field B."""
    for model, field in (
        (Model(name="field", sites=3, hamiltonian=(Term("Z", coefficient=-0.6),)), 0.0),
        (Model(name="no energy", sites=3, jumps=(Jump("Z"),)), 0.6),
    ):
        assert np.allclose(spin_profile(gibbs_state(model, 1.5, field), 3, 2)[2], np.tanh(0.9))


def test_gibbs_state_is_stationary_and_cold_ones_are_ground_states():
    model = driven_chain(5, delta=0.7, field=0.2)
    energy = Lindbladian(model).hamiltonian().toarray()
    state = gibbs_state(model, 0.9)
    assert np.abs(energy @ state - state @ energy).max() < 1e-13
    levels, vectors = np.linalg.eigh(energy)
    cold = gibbs_state(model, 1e4)
    assert np.allclose(cold, np.outer(vectors[:, 0], vectors[:, 0].conj()))
    assert levels[1] - levels[0] > 1e-2
    assert np.allclose(gibbs_state(model, 0.0), maximally_mixed(5, 2))
    checked_density(cold, 32, "the cold state")


def test_detailed_balance_leaves_the_gibbs_state_steady():
    """Rates exp(-+beta B) up and down on every site of free spins: the Gibbs state is steady."""
    model = Model(
        name="free spins",
        sites=3,
        hamiltonian=(Term("Z", coefficient=-0.5),),
        jumps=(Jump("S+", rate=np.exp(0.4)), Jump("S-", rate=np.exp(-0.4))),
    )
    assert np.abs(Lindbladian(model).apply(gibbs_state(model, 0.8))).max() < 1e-14


@pytest.mark.parametrize("dimension", [2, 3, 4])
def test_spin_states_point_where_they_should(dimension):
    theta, phi = 0.7, 2.1
    state = spin_coherent(theta, phi, dimension)
    checked_density(state, dimension, "the state")
    length = dimension - 1
    expected = [np.sin(theta) * np.cos(phi), np.sin(theta) * np.sin(phi), np.cos(theta)]
    assert np.allclose(spin_profile(state, 1, dimension)[:, 0], length * np.array(expected))
    if dimension == 2:
        vector = np.array([np.cos(theta / 2), np.exp(1j * phi) * np.sin(theta / 2)])
        assert np.allclose(state, np.outer(vector, vector.conj()))


def test_words_for_states():
    model = driven_chain(3)

    def profile(words):
        return spin_profile(state_from_words(model, words), 3, 2)

    axis_z = [[0, 0, 0], [0, 0, 0]]
    assert np.allclose(profile("up down up"), [*axis_z, [1, -1, 1]])
    assert np.allclose(profile("0 1 1"), [*axis_z, [1, -1, -1]])
    assert np.allclose(profile("neel"), [*axis_z, [1, -1, 1]])
    assert np.allclose(profile("domain-wall"), [*axis_z, [1, 1, -1]])
    assert np.allclose(profile("down"), [*axis_z, [-1, -1, -1]])
    assert np.allclose(profile("mixed"), 0)
    assert np.allclose(profile("x+ y- mixed"), [[1, 0, 0], [0, -1, 0], [0, 0, 0]])
    turned = np.sin(0.5) * np.array([np.cos(1.0), np.sin(1.0)])
    assert np.allclose(profile("0.5,1.0"), [[turned[0]] * 3, [turned[1]] * 3, [np.cos(0.5)] * 3])
    assert np.allclose(state_from_words(model, "gibbs:0.3,0.2"), gibbs_state(model, 0.3, 0.2))
    # Exactly diagonal: a coherence of 1e-16 would couple charge sectors.
    down = state_from_words(model, "down")
    assert np.array_equal(down, np.diag(np.diagonal(down)))


@pytest.mark.parametrize(
    ("words", "fault"),
    [
        ("up up", "it has 2 words"),
        ("up sideways up", "'sideways' is not a word"),
        ("0 1 2", "'2' is not a word"),
        ("gibbs:warm", "inverse temperature"),
        ("gibbs:1,2,3", "inverse temperature"),
        ("gibbs:inf", "finite"),
        ("nan,0", "finite"),
        ("", "it has 0 words"),
        ("nowhere.npy", "cannot be read"),
    ],
)
def test_words_that_are_no_states(words, fault):
    with pytest.raises(UsageError, match=fault) as caught:
        state_from_words(driven_chain(3), words)
    assert "\n" not in str(caught.value)


def test_one_site_states_that_are_none():
    for matrix, fault in (
        (np.eye(2), "site 2 has trace 2"),
        (np.diag([2.0, -1.0]), "site 2 has the negative eigenvalue -1.0"),
        (np.ones(2), "site 2 has shape"),
        (np.ones((2, 3)), "site 2 has shape"),
        (np.array([[0.5, 0.5j], [0.5j, 0.5]]), "site 2 is not Hermitian"),
        (np.diag([np.inf, 0.0]), "site 2 has entries that are not numbers"),
    ):
        with pytest.raises(UsageError, match=fault):
            product_state([np.eye(2) / 2, matrix])
    with pytest.raises(UsageError, match="at least one site"):
        product_state([])


def test_product_state_is_the_kronecker_product():
    sites = [random_density(3, seed) for seed in range(3)]
    state = product_state(sites)
    assert np.allclose(state, np.kron(np.kron(sites[0], sites[1]), sites[2]))
    for site, matrix in enumerate(sites):
        assert np.allclose(reduced_density(state, (site,), 3, 3), matrix)


def test_positivity_is_tested_to_the_edge():
    """Rank-deficient states pass, eigenvalues of -1e-9 do not, also in blocks of a larger one."""
    pure = np.zeros((6, 6), dtype=complex)
    pure[0, 0] = 1
    assert checked_density(pure, 6, "it") is pure
    rotated = np.linalg.qr(random_matrix(6, 1))[0]
    for basis in (np.eye(6), rotated):
        weights = np.array([1, 0, 0, 0, 0, 0.0])
        checked_density((basis * weights) @ basis.conj().T, 6, "it")
        weights += [1e-9, 0, 0, 0, 0, -1e-9]
        with pytest.raises(UsageError, match="negative eigenvalue -1"):
            checked_density((basis * weights) @ basis.conj().T, 6, "it")


def brute_force_fidelity(first, second):
    root = scipy.linalg.sqrtm(first)
    return np.trace(scipy.linalg.sqrtm(root @ second @ root)).real ** 2


def test_closeness_against_matrix_functions():
    first, second = random_density(8, 2), random_density(8, 3)
    found = closeness(first, second)
    assert found.overlap == pytest.approx(np.trace(first @ second).real)
    sizes = np.trace(first @ first).real * np.trace(second @ second).real
    assert found.alignment == pytest.approx(found.overlap / np.sqrt(sizes))
    assert found.fidelity == pytest.approx(brute_force_fidelity(first, second))
    distance = np.linalg.svd(first - second, compute_uv=False).sum() / 2
    assert found.trace_distance == pytest.approx(distance)
    assert fidelity(second, first) == pytest.approx(found.fidelity)
    # C. A. Fuchs, J. van de Graaf, IEEE Trans. Inf. Theory 45, 1216 (1999); from memory.
    assert 1 - np.sqrt(found.fidelity) <= found.trace_distance
    assert found.trace_distance <= np.sqrt(1 - found.fidelity)


def test_pure_states_to_rounding():
    """``|<a|b>|^2`` and ``sqrt(1 - |<a|b>|^2)``; the many zero weights leave no noise behind."""
    a, b = (random_matrix(128, seed)[0] for seed in (4, 5))
    a, b = a / np.linalg.norm(a), b / np.linalg.norm(b)
    overlap = abs(np.vdot(a, b)) ** 2
    found = closeness(np.outer(a, a.conj()), np.outer(b, b.conj()))
    assert found.fidelity == pytest.approx(overlap, abs=1e-13)
    assert found.overlap == pytest.approx(overlap, abs=1e-13)
    assert found.trace_distance == pytest.approx(np.sqrt(1 - overlap), abs=1e-13)


def test_diagonal_states_compare_as_distributions():
    """Fidelity ``(sum sqrt(p q))^2``, trace distance ``sum |p - q| / 2``; one block per level."""
    p, q = np.array([0.5, 0.3, 0.2, 0.0]), np.array([0.1, 0.0, 0.3, 0.6])
    found = closeness(np.diag(p), np.diag(q))
    assert found.fidelity == pytest.approx(np.sum(np.sqrt(p * q)) ** 2)
    assert found.trace_distance == pytest.approx(np.abs(p - q).sum() / 2)
    apart = closeness(np.diag([1.0, 0]), np.diag([0, 1.0]))
    assert (apart.fidelity, apart.trace_distance, apart.overlap) == (0, 1, 0)


def test_product_states_multiply_their_fidelities():
    ours = [random_density(2, seed) for seed in range(3)]
    theirs = [random_density(2, seed) for seed in range(3, 6)]
    expected = np.prod([fidelity(one, two) for one, two in zip(ours, theirs, strict=True)])
    assert fidelity(product_state(ours), product_state(theirs)) == pytest.approx(expected)


def test_trace_distance_leaves_its_arguments_alone():
    first, second = random_density(8, 6), random_density(8, 7)
    copies = first.copy(), second.copy()
    trace_distance(first, second)
    fidelity(first, second)
    assert np.array_equal(first, copies[0]) and np.array_equal(second, copies[1])


def test_states_of_different_chains_do_not_compare():
    with pytest.raises(UsageError, match=r"\(4, 4\) and \(8, 8\)"):
        closeness(np.eye(4) / 4, np.eye(8) / 8)


def test_record_of_a_gibbs_state():
    """A state in equilibrium carries no current and is itself."""
    import json

    model = Model(name="chain", sites=4, hamiltonian=(Term("X X + Y Y + 0.5 Z Z"),))
    state = gibbs_state(model, 0.7)
    operator = np.kron(spin_operators(2)["x"], spin_operators(2)["x"])
    found = observables_of(
        model,
        state,
        operators={"X X": (operator, (1, 2))},
        references={"itself": state, "mixed": maximally_mixed(4, 2)},
    )
    assert np.abs(found.spin_current).max() < 1e-14
    assert np.abs(found.energy_current).max() < 1e-14
    assert found.energy_continuity < 1e-14
    assert found.expectations["X X"].real == pytest.approx(found.correlations[0, 1, 2])
    assert found.closeness["itself"].fidelity == pytest.approx(1)
    assert found.closeness["itself"].trace_distance == 0
    assert 0 < found.entropy < np.log(16)
    document = json.loads(json.dumps(found.to_dict()))
    assert document["entropy"] == found.entropy
    assert np.allclose(document["correlations"]["y"], found.correlations[1])
    assert document["operator_rank"] == found.operator_rank.tolist()
    text = str(found)
    for word in ("spin current", "von Neumann entropy", "purity", "alignment", "Schmidt rank"):
        assert word in text


def test_record_says_why_there_is_no_current():
    ring = Model(
        name="ring", sites=2, boundary="periodic", hamiltonian=(Term("X X + Y Z"), Term("Z"))
    )
    found = observables_of(ring, random_density(4, 8), entanglement=False)
    assert found.energy_current is None and found.energy_continuity is None
    assert found.spin_current is None
    assert "none: on a ring of 2 sites" in str(found)
    assert "do not conserve the magnetisation" in str(found)
    assert found.entropy is None and found.to_dict()["left_entropy"] is None


def test_record_refuses_states_of_another_chain():
    model = driven_chain(3)
    with pytest.raises(UsageError, match=r"must be \(8, 8\)"):
        observables_of(model, np.eye(4) / 4)
    with pytest.raises(UsageError, match=r"must be \(8, 8\)"):
        observables_of(model, np.eye(8) / 8, references={"other": np.eye(4) / 4})
    with pytest.raises(UsageError, match="sites 4"):
        observables_of(model, np.eye(8) / 8, operators={"Z": (np.eye(2), (3,))})
