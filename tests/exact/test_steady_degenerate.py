"""Several steady states, and pairs that are almost degenerate."""

import numpy as np
import pytest

from lbwork.generator import Lindbladian
from lbwork.model import Jump, Model, Term
from lbwork.steady import steady_state
from tests.chains import driven_chain


def check_states(model, state):
    """Every state is a legal steady density matrix, supports are orthogonal, weights add up."""
    generator = Lindbladian(model)
    for branch in state.states:
        assert np.trace(branch.density) == pytest.approx(1, abs=1e-12)
        assert np.linalg.eigvalsh(branch.density)[0] > -1e-12
        assert np.linalg.norm(generator.apply(branch.density)) < 1e-12
    for one in state.states:
        for other in state.states:
            if one is not other:
                assert np.linalg.norm(one.density @ other.density) < 1e-12
    assert sum(branch.weight for branch in state.states) == pytest.approx(1, abs=1e-12)
    mixture = sum(branch.weight * branch.density for branch in state.states)
    assert np.allclose(mixture, state.density, atol=1e-12)


def test_three_charge_sectors():
    """Dephasing on two sites keeps S^z: the maximally mixed state of each of three sectors."""
    model = Model(name="kept", sites=2, hamiltonian=(Term("X X + Y Y"),), jumps=(Jump("Z"),))
    state = steady_state(model)
    assert state.zero_modes == 3
    assert [branch.label for branch in state.states] == [
        "ket S^z = -1",
        "ket S^z = 0",
        "ket S^z = 1",
    ]
    assert [branch.weight for branch in state.states] == pytest.approx([0.25, 0.5, 0.25])
    assert np.allclose(state.states[1].density, np.diag([0, 0.5, 0.5, 0]), atol=1e-12)
    check_states(model, state)


def test_charge_sectors_with_their_particle_hole_copies():
    """Four sites with dephasing: five sectors, weights binomial / 16."""
    model = driven_chain(4, delta=0.3, drive=0.0, dephasing=0.5)
    state = steady_state(model)
    assert state.zero_modes == 5
    weights = [branch.weight for branch in state.states]
    assert weights == pytest.approx([1 / 16, 4 / 16, 6 / 16, 4 / 16, 1 / 16])
    check_states(model, state)


def test_dark_states_with_coherences():
    """Pair loss on two sites: three dark states, nine zero modes, six of them coherences."""
    model = Model(name="pair loss", sites=2, jumps=(Jump("S- S-", rate=0.8),))
    state = steady_state(model)
    assert state.zero_modes == 9
    assert len(state.states) == 3
    check_states(model, state)


def test_closed_chain():
    """No dissipation: one state per energy level, zero modes = pairs of equal energies."""
    model = driven_chain(3, delta=0.3, drive=0.0, bias=0.0)
    state = steady_state(model)
    assert len(state.states) == 8
    assert state.zero_modes == 16
    assert state.purity == pytest.approx(1 / 8, abs=1e-12)
    check_states(model, state)


def test_rotated_charge():
    """The same three sectors when the conserved axis is tilted away from z on every site."""
    turn = np.array([[np.cos(0.4), -np.sin(0.4)], [np.sin(0.4), np.cos(0.4)]])
    axis = turn @ np.diag([1.0, -1.0]) @ turn.T
    flip = turn @ np.array([[0.0, 1.0], [1.0, 0.0]]) @ turn.T
    middle = np.array([[0, -1j], [1j, 0]])
    model = Model(
        name="tilted",
        sites=2,
        hamiltonian=(Term(np.kron(flip, flip) + np.kron(middle, middle)),),
        jumps=(Jump(axis),),
    )
    state = steady_state(model)
    assert state.zero_modes == 3
    check_states(model, state)


def test_pair_broken_by_a_small_rate():
    """Loss at 1e-6 leaves one of three steady states, reported as nearly degenerate."""
    model = Model(
        name="broken",
        sites=2,
        hamiltonian=(Term("X X + Y Y"),),
        jumps=(Jump("Z"), Jump("S-", on="first", rate=1e-6)),
    )
    state = steady_state(model)
    assert state.zero_modes == 1
    assert state.nearly_degenerate
    assert 1e-7 < state.separation < 1e-5
    assert np.allclose(state.density, np.diag([0, 0, 0, 1]), atol=1e-9)


def test_cyclic_symmetry_breaking():
    """Dissipation that keeps ``X X`` and ``Z Z`` on two sites: four Bell states are steady."""
    model = Model(name="stabilised", sites=2, jumps=(Jump("X X"), Jump("Z Z")))
    state = steady_state(model)
    assert state.zero_modes == 4
    assert len(state.states) == 4
    assert all(abs(np.trace(one.density @ one.density) - 1) < 1e-12 for one in state.states)
    check_states(model, state)
