"""Steady states that are known in closed form, without any transport."""

import numpy as np
import pytest

from lbwork.model import Jump, Model, Term
from lbwork.steady import steady_state


def test_driven_two_level_system():
    """Excited population ``W^2 / (g^2 + 2 W^2)`` (Mollow 1969, as for the spectrum)."""
    rate, drive = 0.9, 0.6
    model = Model(
        name="driven",
        sites=1,
        hamiltonian=(Term("X", coefficient=drive / 2),),
        jumps=(Jump("S-", rate=rate),),
    )
    state = steady_state(model)
    excited = drive**2 / (rate**2 + 2 * drive**2)
    assert state.magnetisation[0] == pytest.approx(2 * excited - 1, abs=1e-14)
    assert state.spin_current.size == 0
    assert state.zero_modes == 1


@pytest.mark.parametrize("dimension", [2, 3])
def test_independent_sites_reach_their_gibbs_state(dimension):
    """Rates up and down in the ratio exp(-beta E): weights ``exp(-beta E)`` (detailed balance)."""
    ratio = 0.35
    model = Model(
        name="thermal sites",
        sites=2,
        local_dimension=dimension,
        hamiltonian=(Term("Sz", coefficient=0.8),),
        jumps=(Jump("S-", rate=1.3), Jump("S+", rate=1.3 * ratio)),
    )
    state = steady_state(model)
    weights = ratio ** np.arange(dimension)[::-1]
    weights = weights / weights.sum()
    assert np.allclose(state.density, np.diag(np.kron(weights, weights)), atol=1e-13)
    entropy = -2 * np.sum(weights * np.log(weights))
    assert state.entropy == pytest.approx(entropy, abs=1e-12)
    assert state.purity == pytest.approx(np.sum(weights**2) ** 2, abs=1e-13)
    assert np.allclose(state.correlations - np.diag(np.diag(state.correlations)), 0, atol=1e-13)


def test_jumps_between_energy_levels_reach_the_gibbs_state():
    """Jumps ``|a><b|`` between eigenstates with detailed balance leave ``exp(-beta H)`` fixed
    (E. B. Davies, Commun. Math. Phys. 39, 91 (1974); from memory)."""
    flip = np.array([[0, 1], [1, 0]])
    sign = np.diag([1, -1])
    bond = np.kron(flip, flip) + 0.4 * np.kron(sign, np.eye(2)) - 0.1 * np.kron(np.eye(2), sign)
    energies, vectors = np.linalg.eigh(bond)
    beta = 0.7
    jumps = tuple(
        Jump(
            np.outer(vectors[:, a], vectors[:, b]),
            rate=(1 + a + b) * np.exp(-beta * (energies[a] - energies[b]) / 2),
        )
        for a in range(4)
        for b in range(4)
        if a != b
    )
    model = Model(name="thermal bond", sites=2, hamiltonian=(Term(bond),), jumps=jumps)
    weights = np.exp(-beta * energies)
    gibbs = vectors @ np.diag(weights / weights.sum()) @ vectors.T
    state = steady_state(model)
    assert np.allclose(state.density, gibbs, atol=1e-13)
    assert state.spin_current is None
    assert "1, 2" in state.current_reason
