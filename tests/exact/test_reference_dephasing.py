"""Closed two-point functions against dense Kronecker generators and the driven XX chain."""

from functools import reduce

import numpy as np
import pytest

from lbwork.errors import CapacityError, ModelError
from lbwork.exact import (
    boundary_driven_chain,
    dephased,
    driven_xx_state,
    noisy_chain,
    noisy_state,
    quadratic_chain,
    quadratic_state,
    relaxation_gap,
    relaxation_levels,
    symmetric_current,
    symmetric_profile,
)
from lbwork.model import Jump, Model, Term, load_model
from tests.chains import driven_chain, kronecker_generator

PAULI = (
    np.array([[0, 1], [1, 0]], dtype=complex),
    np.array([[0, -1j], [1j, 0]]),
    np.diag([1.0 + 0j, -1.0]),
)


def covariance(density):
    sites = density.shape[0].bit_length() - 1
    operators = [
        reduce(np.kron, [PAULI[2]] * site + [PAULI[kind]] + [np.eye(2)] * (sites - 1 - site))
        for site in range(sites)
        for kind in (0, 1)
    ]
    values = [[np.trace(first @ second @ density) for second in operators] for first in operators]
    result = (-1j * np.array(values)).real
    np.fill_diagonal(result, 0)
    return result


def dense_state(model):
    size = 2**model.sites
    density = np.linalg.svd(kronecker_generator(model))[2][-1].conj().reshape(size, size)
    return density / np.trace(density)


def hopping_noise(sites, forth=0.6, back=0.6):
    """Coherent and incoherent hopping, dephasing as n with a number added, and two baths."""
    return Model(
        name="hopping noise",
        sites=sites,
        hamiltonian=(Term("X X + Y Y + 0.2 X Y - 0.2 Y X"), Term("Z", coefficient="0.1*j")),
        jumps=(
            Jump("S- S+", rate=forth),
            Jump("S+ S-", rate=back),
            Jump("n + 0.4j I", rate=0.2),
            Jump("S+", on="first", rate=0.3),
            Jump("S-", on="last", rate=0.8),
        ),
    )


def ising_noise(sites):
    """No conserved particles; the number in the jump acts like a Hamiltonian."""
    return Model(
        name="Ising noise",
        sites=sites,
        hamiltonian=(Term("X X"), Term("Z", coefficient=0.7)),
        jumps=(
            Jump("X X + 0.3 X Y + (0.1 + 0.2j) I I", rate=0.2),
            Jump("(0.6 + 0.8j) Z", rate=0.1),
            Jump("S- + 0.2 S+", on="last", rate=0.3),
        ),
    )


def dephased_chain(sites):
    return driven_chain(sites, dephasing=0.7, bias=0.8, field=0.3)


@pytest.mark.parametrize("sites", [2, 3, 4])
@pytest.mark.parametrize("build", [dephased_chain, hopping_noise, ising_noise])
def test_steady_two_point_function(build, sites):
    model = build(sites)
    state, density = noisy_state(noisy_chain(model)), dense_state(model)
    assert np.allclose(state.covariance, covariance(density), atol=1e-11)
    assert state.residual < 1e-14
    if build is ising_noise:
        assert state.current is None and "changes the magnetisation" in state.current_reason
        return
    if build is hopping_noise:
        # What the last site loses.
        assert np.allclose(state.current, 0.8 * (1 + state.magnetisation[-1]), atol=1e-11)
    else:
        # What the first site gains: G (mu - <Z_1>).
        assert np.allclose(state.current, 0.8 - state.magnetisation[0], atol=1e-11)


@pytest.mark.parametrize("sites", [2, 3, 4])
@pytest.mark.parametrize("build", [dephased_chain, hopping_noise, ising_noise])
def test_levels_are_levels_of_the_generator(build, sites):
    """Each is an eigenvalue of the whole generator."""
    model = build(sites)
    generator = kronecker_generator(model)
    levels = relaxation_levels(noisy_chain(model))
    assert levels.size == (sites * (2 * sites - 1) if build is ising_noise else sites**2)
    whole = np.linalg.eigvals(generator)
    assert np.abs(levels[:, None] - whole[None, :]).min(axis=1).max() < 1e-7
    gap = relaxation_gap(noisy_chain(model))
    assert gap.certain and gap.zero_modes == 0
    assert gap.gap == pytest.approx(-levels.real.max(), abs=1e-10)


def test_without_noise_it_is_the_quadratic_chain():
    model = driven_chain(5, drive=1.4, bias=0.6, field=0.2)
    state, exact = noisy_state(noisy_chain(model)), quadratic_state(quadratic_chain(model))
    assert np.allclose(state.covariance, exact.covariance, atol=1e-12)
    sums = exact.rapidities[:, None] + exact.rapidities[None, :]
    gap = relaxation_gap(noisy_chain(model))
    assert gap.gap == pytest.approx(np.sort(sums.real, axis=None)[0])


@pytest.mark.parametrize("sites", [40, 150])
def test_long_chain_against_the_closed_form(sites):
    """Uneven dephasing and unequal ends; diffusive gap."""
    rates = 0.5 + 0.3 * np.cos(np.arange(sites))
    ones = np.ones(sites - 1)
    chain = boundary_driven_chain(ones, ones, 0.3 * np.ones(sites), (0.9, 0.2), (0.5, 1.4))
    state = noisy_state(dephased(chain, rates))
    closed = driven_xx_state(sites, (1.1, 1.9), (0.7 / 1.1, -0.9 / 1.9), rates)
    assert np.allclose(state.magnetisation, closed.magnetisation, atol=1e-12)
    assert np.allclose(state.current, closed.current, atol=1e-12)


def test_gap_of_long_chains():
    """Bulk dephasing: L^-2 (M. Žnidarič, Phys. Rev. E 92, 042143 (2015))."""
    gaps = []
    for sites in (60, 120):
        ones = np.ones(sites)
        chain = boundary_driven_chain(ones[1:], ones[1:], 0 * ones, (0.75, 0.25), (0.25, 0.75))
        gaps.append(relaxation_gap(dephased(chain, 0.5 * ones)))
    assert all(gap.certain and gap.residual < 1e-13 and gap.eigenvalue.imag == 0 for gap in gaps)
    # D pi^2 / (L + l)^2 with a length l that the ends add, and D = 2/g for hopping amplitude 2.
    slope = (gaps[1].gap ** -0.5 - gaps[0].gap ** -0.5) / 60
    assert slope == pytest.approx(1 / (np.pi * np.sqrt(2 / 0.5)), rel=1e-2)


def test_dephasing_alone_conserves_particles():
    model = Model(
        name="closed", sites=4, hamiltonian=(Term("X X + Y Y"),), jumps=(Jump("Z", rate=0.2),)
    )
    noisy = noisy_chain(model)
    gap = relaxation_gap(noisy)
    assert gap.zero_modes == 1 and gap.certain
    levels = relaxation_levels(noisy)
    assert gap.gap == pytest.approx(-levels.real[np.abs(levels) > 1e-10].max())
    with pytest.raises(ModelError, match="steady state is not unique"):
        noisy_state(noisy)
    long = dephased(
        boundary_driven_chain(*[np.ones(59)] * 2, np.zeros(60), (0, 0), (0, 0)), np.ones(60)
    )
    gap = relaxation_gap(long)
    assert gap.zero_modes == 1 and not gap.certain
    # One particle spreads with diffusion constant 2/g along 60 sites.
    assert gap.gap == pytest.approx(2 * np.pi**2 / 60**2, rel=0.05)


def test_incoherent_hopping_is_the_symmetric_exclusion_process():
    jumps = (Jump("S- S+"), Jump("S+ S-"))
    ends = [("S+", "first", 0.7), ("S-", "first", 0.3), ("S+", "last", 0.2), ("S-", "last", 0.8)]
    jumps += tuple(Jump(name, on=place, rate=rate) for name, place, rate in ends)
    state = noisy_state(noisy_chain(Model(name="symmetric", sites=12, jumps=jumps)))
    profile = symmetric_profile(12, 0.7, 0.2)
    assert np.allclose((1 + state.magnetisation) / 2, profile, atol=1e-12)
    assert np.allclose(state.current, 2 * symmetric_current(12, 0.7, 0.2), atol=1e-12)


REFUSED = [
    (hopping_noise(3, back=0.5), "do not act like Hermitian ones"),
    (driven_chain(3, delta=0.4, dephasing=0.1), "product of 4 fermion operators"),
    (load_model("xxx-loss"), "ring|4 fermion"),
    (
        Model(
            name="bulk loss",
            sites=3,
            hamiltonian=(Term("X X + Y Y"),),
            jumps=(Jump("S-", on=(2,)), Jump("Z")),
        ),
        "inside a chain of 3 sites",
    ),
    (
        Model(name="density", sites=3, hamiltonian=(Term("X X + Y Y"),), jumps=(Jump("Z Z"),)),
        "product of 4 fermion operators",
    ),
]


@pytest.mark.parametrize(("model", "words"), REFUSED)
def test_reasons_in_words(model, words):
    with pytest.raises(ModelError, match=words):
        noisy_chain(model)


def test_bad_requests():
    chain = quadratic_chain(driven_chain(3))
    with pytest.raises(ModelError, match="rates are not 3 numbers"):
        dephased(chain, np.array([0.1, -0.1, 0.2]))
    ones = np.ones(799)
    long = boundary_driven_chain(ones, ones, np.ones(800), (1, 0), (0, 1))
    with pytest.raises(CapacityError, match="640000 unknowns"):
        noisy_state(dephased(long, np.ones(800)))
    with pytest.raises(CapacityError, match="2500 two-point functions"):
        relaxation_levels(
            noisy_chain(driven_chain(50, dephasing=0.1)),
        )
