"""Energy currents of arbitrary states: continuity, brute-force commutators, signs."""

from dataclasses import replace

import numpy as np
import pytest

from lbwork.errors import UsageError
from lbwork.generator import Lindbladian
from lbwork.model import Jump, Model, Term
from lbwork.observables import (
    energy_continuity_error,
    energy_currents,
    gibbs_state,
    spin_currents,
)
from tests.chains import embed


def random_matrix(size, seed):
    generator = np.random.default_rng(seed)
    return generator.normal(size=(size, size)) + 1j * generator.normal(size=(size, size))


def random_density(size, seed):
    matrix = random_matrix(size, seed)
    density = matrix @ matrix.conj().T
    return density / np.trace(density)


def hermitian(size, seed):
    matrix = random_matrix(size, seed)
    return (matrix + matrix.conj().T) / np.sqrt(size)


def random_chain(sites, dimension, boundary, longest):
    """Random Hermitian terms of range 1 to ``longest`` and random jumps of range 1 and 2."""
    return Model(
        name="random chain",
        sites=sites,
        local_dimension=dimension,
        boundary=boundary,
        hamiltonian=tuple(
            Term(hermitian(dimension**width, width), coefficient=f"1 + 0.1*j*{width}")
            for width in range(1, longest + 1)
        ),
        jumps=(
            Jump(random_matrix(dimension, 7), on="first", rate=0.3),
            *[Jump(random_matrix(dimension**2, 8) / dimension, rate=0.1)][: sites - 1],
        ),
    )


CASES = {
    "open, d = 2": (6, 2, "open", 3),
    "ring, d = 2": (6, 2, "periodic", 3),
    "open, d = 3": (4, 3, "open", 3),
    "ring, d = 3": (5, 3, "periodic", 3),
    "ring of three pairs": (3, 3, "periodic", 2),
    "two sites": (2, 2, "open", 2),
    "one site": (1, 3, "open", 1),
}


@pytest.mark.parametrize("name", CASES)
def test_energy_continuity_of_random_states(name):
    """``d<e_j>/dt`` by applying L to the state, against currents and sources, site by site."""
    model = random_chain(*CASES[name])
    generator = Lindbladian(model)
    density = random_density(generator.dimension, 1)
    found = energy_currents(model, density)
    assert found.current is not None
    assert found.reason == ""
    assert energy_continuity_error(generator, density, found) < 1e-12 * generator.norm_bound
    total = np.trace(generator.hamiltonian() @ density).real
    assert found.density.sum() == pytest.approx(total, abs=1e-11)
    gain = np.trace(generator.hamiltonian() @ generator.apply(density)).real
    assert found.sources.sum() == pytest.approx(gain, abs=1e-10)
    if model.sites > 2:
        wrong = replace(found, current=-found.current)
        assert energy_continuity_error(generator, density, wrong) > 1e-3


@pytest.mark.parametrize(("sites", "dimension"), [(4, 2), (3, 3)])
def test_flow_through_a_cut_is_the_commutator_of_both_sides(sites, dimension):
    """Through cut j of an open chain: ``i <[e_1 + .. + e_j, e_(j+1) + .. + e_L]>``."""
    model = random_chain(sites, dimension, "open", 3)
    size = dimension**sites
    density = random_density(size, 2)
    densities = [np.zeros((size, size), dtype=complex) for _ in range(sites)]
    for term in model.placed_hamiltonian():
        densities[term.sites[0]] += embed(term.matrix, term.sites, sites, dimension)
    found = energy_currents(model, density)
    for cut in range(1, sites):
        left, right = sum(densities[:cut]), sum(densities[cut:])
        flow = np.trace(density @ (1j * (left @ right - right @ left))).real
        assert found.current[cut - 1] == pytest.approx(flow, abs=1e-11)
    means = [np.trace(density @ matrix).real for matrix in densities]
    assert np.allclose(found.density, means)


def test_a_ring_is_the_same_from_every_site():
    """Shifting the state by one site shifts energies, currents and sources with it."""
    ring = Model(
        name="ring",
        sites=5,
        boundary="periodic",
        hamiltonian=(Term(hermitian(8, 3)), Term(hermitian(4, 4)), Term(hermitian(2, 5))),
        jumps=(Jump(random_matrix(4, 6), rate=0.2),),
    )
    density = random_density(32, 3)
    shifted = density.reshape((2,) * 10).transpose(4, 0, 1, 2, 3, 9, 5, 6, 7, 8).reshape(32, 32)
    here, there = energy_currents(ring, density), energy_currents(ring, shifted)
    for name in ("density", "current", "sources"):
        assert np.allclose(np.roll(getattr(here, name), 1), getattr(there, name))


def test_a_field_carries_energy_with_the_magnetisation():
    """A field B along z adds B times the magnetisation current to the energy current."""
    state = random_density(32, 4)
    currents = {}
    for field in (0.0, 0.7):
        model = Model(
            name="chain",
            sites=5,
            parameters={"B": field},
            hamiltonian=(Term("X X + Y Y + 0.4 Z Z"), Term("Z", coefficient="B")),
        )
        currents[field] = energy_currents(model, state).current
    difference = currents[0.7] - currents[0.0]
    assert np.allclose(difference, 0.7 * spin_currents(model, state).current)


def test_energy_flows_out_of_the_driven_end():
    """Closed bulk, fully mixing left end, cooling right end: energy runs to the right."""
    from lbwork.steady import steady_state

    model = Model(
        name="hot and cold",
        sites=4,
        hamiltonian=(Term("X X + 0.3 Z Z"), Term("Z"), Term("X", coefficient=0.4)),
        jumps=(
            Jump("S+", on="first"),
            Jump("S-", on="first"),
            Jump("S-", on="last"),
        ),
    )
    found = energy_currents(model, steady_state(model).density)
    assert found.current[0] > 1e-2
    assert found.current[:2] == pytest.approx(found.sources[0], abs=1e-9)
    assert found.sources.sum() == pytest.approx(0, abs=1e-9)


def test_no_current_in_equilibrium():
    """Each flow is ``i <[e_i, e_k]>``; with one real basis for H it vanishes in a Gibbs state."""
    terms = (Term("X X + Y Y + Z X"), Term("Z X Z"), Term("X"))
    model = Model(name="real", sites=5, hamiltonian=terms)
    assert np.abs(energy_currents(model, gibbs_state(model, 0.6)).current).max() < 1e-13


@pytest.mark.parametrize(("sites", "width"), [(2, 2), (4, 3)])
def test_rings_that_are_too_short(sites, width):
    """Undefined whatever the state, even where the mean of the flow vanishes."""
    model = random_chain(sites, 2, "periodic", width)
    mixed = np.eye(2**sites) / 2**sites
    for density in (random_density(2**sites, 5), mixed):
        found = energy_currents(model, density)
        assert found.current is None
        assert f"ring of {sites} sites" in found.reason
        assert "longer ring" in found.reason
    with pytest.raises(UsageError, match="no energy current"):
        energy_continuity_error(Lindbladian(model), density, found)


def test_commuting_terms_of_a_short_ring_exchange_nothing():
    ring = Model(name="pair", sites=2, boundary="periodic", hamiltonian=(Term("Z Z"),))
    assert np.array_equal(energy_currents(ring, random_density(4, 6)).current, [0, 0])


def test_terms_that_are_hermitian_only_together():
    """``i Z_(j+1)`` in a bond and ``-i Z_j`` on a site cancel between different densities."""
    plain = Model(name="plain", sites=4, hamiltonian=(Term("X X + Y Z"), Term("Z", on=(1,))))
    split = Model(
        name="split",
        sites=4,
        hamiltonian=(
            Term("X X + Y Z + 1j I Z"),
            Term("Z", on=(2, 3, 4), coefficient="-1j"),
            Term("Z", on=(1,)),
        ),
    )
    density = random_density(16, 7)
    one, other = energy_currents(plain, density), energy_currents(split, density)
    assert np.allclose(one.current, other.current)
    assert energy_continuity_error(Lindbladian(split), density, other) < 1e-12


def test_a_chain_without_hamiltonian():
    model = Model(name="classical", sites=3, jumps=(Jump("S- S+"),))
    found = energy_currents(model, random_density(8, 8))
    assert not np.any(found.current) and not np.any(found.sources)
