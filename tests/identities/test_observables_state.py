"""Observables of arbitrary states against brute-force Kronecker products and known states."""

import numpy as np
import pytest

from lbwork import Lindbladian, load_model
from lbwork.errors import UsageError
from lbwork.model import Jump, Model, Term
from lbwork.observables import (
    checked_density,
    closeness,
    connected_correlations,
    energy_continuity_error,
    energy_currents,
    expectation,
    gibbs_state,
    left_entropies,
    logarithmic_negativity,
    observables_of,
    operator_entanglement,
    product_state,
    spin_operators,
    spin_profile,
)
from tests.chains import driven_chain, embed

RANDOM = np.random.default_rng(11)


def _state(size):
    matrix = RANDOM.normal(size=(size, size)) + 1j * RANDOM.normal(size=(size, size))
    density = matrix @ matrix.conj().T
    return density / np.trace(density)


def _pure(vector):
    vector = np.asarray(vector, dtype=complex)
    vector = vector / np.linalg.norm(vector)
    return np.outer(vector, vector.conj())


@pytest.mark.parametrize(("count", "dimension"), [(4, 2), (3, 3)])
def test_local_values_against_kronecker_products(count, dimension):
    density = _state(dimension**count)
    operators = spin_operators(dimension)
    profile = spin_profile(density, count, dimension)
    for row, operator in enumerate(operators.values()):
        for site in range(count):
            whole = embed(operator, (site,), count, dimension)
            assert profile[row, site] == pytest.approx(np.trace(density @ whole).real, abs=1e-12)
    pair = np.kron(operators["x"], operators["y"])
    whole = embed(pair, (2, 0), count, dimension)
    value = expectation(density, pair, (2, 0), count, dimension)
    assert value == pytest.approx(np.trace(density @ whole), abs=1e-12)
    found = connected_correlations(density, operators["x"], operators["z"], count, dimension)
    for one in range(count):
        for two in range(count):
            left = embed(operators["x"], (one,), count, dimension)
            right = embed(operators["z"], (two,), count, dimension)
            expected = np.trace(density @ left @ right)
            expected -= np.trace(density @ left) * np.trace(density @ right)
            assert found[one, two] == pytest.approx(expected, abs=1e-12)


def test_spin_algebra():
    """``[2Sx, 2Sy] = 2i 2Sz`` for every local dimension."""
    for dimension in (2, 3, 4, 5):
        x, y, z = spin_operators(dimension).values()
        assert np.allclose(x @ y - y @ x, 2j * z)


MODELS = {
    "open": Model(
        name="open",
        sites=5,
        hamiltonian=(Term("X X + 0.3 Y Z"), Term("Z", coefficient="0.2*j"), Term("Z X Z")),
        jumps=(Jump("S+", on="first"), Jump("S- Z", rate=0.4), Jump("X", rate=0.3)),
    ),
    "ring": Model(
        name="ring",
        sites=6,
        boundary="periodic",
        hamiltonian=(Term("X X + Y Y + 0.4 Z Z"), Term("Z Y Z"), Term("X", coefficient=0.2)),
        jumps=(Jump("Z", rate=0.3), Jump("S- S+", rate=0.4)),
    ),
    "spin one": Model(
        name="spin one",
        sites=3,
        local_dimension=3,
        hamiltonian=(Term("Sx Sx + Sy Sz + Sz Sy"),),
        jumps=(Jump("S-", rate=0.4),),
    ),
}


@pytest.mark.parametrize("name", MODELS)
def test_energy_continuity_holds_for_any_state(name):
    model = MODELS[name]
    density = _state(model.local_dimension**model.sites)
    currents = energy_currents(model, density)
    energy = np.trace(Lindbladian(model).hamiltonian().toarray() @ density).real
    assert currents.density.sum() == pytest.approx(energy, abs=1e-12)
    assert currents.current is not None and np.abs(currents.current).max() > 1e-3
    assert energy_continuity_error(Lindbladian(model), density, currents) < 1e-12


def test_wrong_energy_current_is_noticed():
    from dataclasses import replace

    model = MODELS["open"]
    density = _state(32)
    currents = energy_currents(model, density)
    wrong = replace(currents, current=-currents.current)
    assert energy_continuity_error(Lindbladian(model), density, wrong) > 1e-3


def test_a_ring_of_two_ways():
    ring = load_model("xx-dephasing", sites=2)
    found = energy_currents(ring, _state(4))
    assert found.current is None or found.reason == ""


def test_bell_pair_and_ghz():
    """Negativity ln 2, left entropy ln 2, operator entropy 2 ln 2 of a Bell pair; GHZ: ln 2."""
    bell = _pure([1, 0, 0, 1])
    assert logarithmic_negativity(bell, 2, 2)[0] == pytest.approx(np.log(2))
    assert left_entropies(bell, 2, 2).von_neumann[0] == pytest.approx(np.log(2))
    assert left_entropies(bell, 2, 2).renyi_two[0] == pytest.approx(np.log(2))
    entropies, ranks = operator_entanglement(bell, 2, 2)
    assert entropies[0] == pytest.approx(2 * np.log(2))
    assert ranks[0] == 4
    ghz = _pure([1] + [0] * 6 + [1])
    assert np.allclose(logarithmic_negativity(ghz, 3, 2), np.log(2))
    assert np.allclose(left_entropies(ghz, 3, 2).von_neumann, np.log(2))


def test_product_and_classical_states_are_not_entangled():
    product = product_state([_state(2) for _ in range(4)])
    assert np.abs(logarithmic_negativity(product, 4, 2)).max() < 1e-12
    entropies, ranks = operator_entanglement(product, 4, 2)
    assert np.abs(entropies).max() < 1e-10
    assert list(ranks) == [1, 1, 1]
    classical = np.diag([0.5, 0, 0, 0.5]).astype(complex)
    assert logarithmic_negativity(classical, 2, 2)[0] == 0
    assert operator_entanglement(classical, 2, 2)[0][0] == pytest.approx(np.log(2))


def test_blocks_do_not_change_the_answer():
    """A state with a charge, whose matrices fall apart, against dense NumPy."""
    model = driven_chain(4, delta=0.4, bias=0.9)
    from lbwork import steady_state

    density = steady_state(model).density
    transposed = density.reshape(4, 4, 4, 4).transpose(2, 1, 0, 3).reshape(16, 16)
    expected = np.log(np.abs(np.linalg.eigvalsh(transposed)).sum())
    assert logarithmic_negativity(density, 4, 2)[1] == pytest.approx(expected, abs=1e-12)
    schmidt = density.reshape(4, 4, 4, 4).transpose(0, 2, 1, 3).reshape(16, 16)
    weights = np.linalg.svd(schmidt, compute_uv=False) ** 2
    weights = weights[weights > 1e-30] / weights.sum()
    expected = -np.sum(weights * np.log(weights))
    assert operator_entanglement(density, 4, 2)[0][1] == pytest.approx(expected, abs=1e-10)


def test_gibbs_state():
    """Stationary under H, right energy derivative, mixed at infinite temperature."""
    model = MODELS["open"]
    energy = Lindbladian(model).hamiltonian().toarray()
    state = gibbs_state(model, 0.7)
    assert np.allclose(energy @ state, state @ energy)
    assert np.allclose(gibbs_state(model, 0.0), np.eye(32) / 32)
    levels = np.linalg.eigvalsh(energy)
    weights = np.exp(-0.7 * levels)
    mean = float(np.sum(weights * levels) / weights.sum())
    assert np.trace(state @ energy).real == pytest.approx(mean)
    tilted = gibbs_state(model, 0.7, field=2.0)
    assert spin_profile(tilted, 5, 2)[2].sum() > spin_profile(state, 5, 2)[2].sum()


def test_closeness():
    first, second = _state(8), _state(8)
    same = closeness(first, first)
    assert same.fidelity == pytest.approx(1) and same.alignment == pytest.approx(1)
    assert same.trace_distance == pytest.approx(0, abs=1e-12)
    pure, other = _pure([1, 0, 0]), _pure([1, 1, 0])
    assert closeness(pure, other).fidelity == pytest.approx(0.5)
    assert closeness(pure, other).trace_distance == pytest.approx(np.sqrt(0.5))
    found = closeness(first, second)
    # C. A. Fuchs, J. van de Graaf, IEEE Trans. Inf. Theory 45, 1216 (1999); from memory.
    assert 1 - np.sqrt(found.fidelity) <= found.trace_distance <= np.sqrt(1 - found.fidelity)


def test_illegal_states_are_refused():
    for matrix, word in (
        (np.eye(2), "trace"),
        (np.diag([1.5, -0.5]), "negative"),
        (np.array([[0.5, 1], [0, 0.5]]), "Hermitian"),
        (np.eye(3) / 3, "shape"),
        (np.full((2, 2), np.nan), "numbers"),
    ):
        with pytest.raises(UsageError, match=word):
            checked_density(matrix, 2, "the state")


def test_the_whole_record():
    model = driven_chain(4, delta=0.4, bias=0.9)
    density = _state(16)
    pauli = spin_operators(2)
    found = observables_of(
        model,
        density,
        operators={"XY on 1, 2": (np.kron(pauli["x"], pauli["y"]), (0, 1))},
        references={"mixed": np.eye(16) / 16},
    )
    document = found.to_dict()
    assert len(document["left_entropy"]) == 3
    assert document["closeness"]["mixed"]["fidelity"] < 1
    assert found.energy_continuity < 1e-12
    assert "negativity" in str(found)
    short = observables_of(model, density, entanglement=False)
    assert short.negativity is None
    assert "negativity" not in str(short)
