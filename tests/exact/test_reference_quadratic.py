"""Quadratic chains against dense Kronecker generators: states, dynamics, whole spectra."""

from functools import reduce

import numpy as np
import pytest
from scipy.linalg import expm

from lbwork.errors import CapacityError, ModelError
from lbwork.exact import (
    boundary_driven_chain,
    driven_xx_of,
    driven_xx_state,
    evolved_covariance,
    hamiltonian_currents,
    product_covariance,
    quadratic_chain,
    quadratic_gap,
    quadratic_levels,
    quadratic_state,
    rapidities,
)
from lbwork.model import Jump, Model, Term, load_model
from tests.chains import driven_chain, kronecker_generator
from tests.matching import assert_same_spectrum

PAULI = (
    np.array([[0, 1], [1, 0]], dtype=complex),
    np.array([[0, -1j], [1j, 0]]),
    np.diag([1.0 + 0j, -1.0]),
)


def majoranas(sites):
    return [
        reduce(np.kron, [PAULI[2]] * site + [PAULI[kind]] + [np.eye(2)] * (sites - 1 - site))
        for site in range(sites)
        for kind in (0, 1)
    ]


def covariance(density):
    """``-i <w_m w_n>`` for m != n, from the density matrix."""
    operators = majoranas(density.shape[0].bit_length() - 1)
    values = [[np.trace(first @ second @ density) for second in operators] for first in operators]
    result = (-1j * np.array(values)).real
    np.fill_diagonal(result, 0)
    return result


def dense_state(model):
    size = 2**model.sites
    density = np.linalg.svd(kronecker_generator(model))[2][-1].conj().reshape(size, size)
    return density / np.trace(density)


def parity_blocks(model):
    """Levels of the dense generator on even and on odd operators."""
    generator = kronecker_generator(model)
    signs = reduce(np.kron, [np.array([1, -1])] * (2 * model.sites))
    even, odd = np.flatnonzero(signs > 0), np.flatnonzero(signs < 0)
    assert np.abs(generator[np.ix_(even, odd)]).max() == 0
    return [np.linalg.eigvals(generator[np.ix_(part, part)]) for part in (even, odd)]


def general_chain(sites, left=True, right=True, anisotropy=0.4):
    """Every kind of term at once: pairing, complex hopping, squeezed gain and loss."""
    jumps = []
    if left:
        jumps += [Jump("S+", on="first", rate=0.7), Jump("S- + 0.3j S+", on="first", rate=0.4)]
    if left and sites > 2:
        jumps += [Jump("Z S-", on="first", rate=0.3)]
    if right:
        jumps += [Jump("S+", on="last", rate=0.2), Jump("S- - 0.2 S+", on="last", rate=0.9)]
    if right and sites > 2:
        jumps += [Jump("S- Z", on="last", rate=0.25)]
    terms = [
        Term("X X + a Y Y + 0.3 X Y - 0.1 Y X"),
        Term("Z", coefficient="0.4 + 0.1*j"),
    ]
    if sites > 2:
        terms.append(Term("0.2 X Z X - 0.3 X Z Y"))
    return Model(
        name="general chain",
        sites=sites,
        parameters={"a": anisotropy},
        hamiltonian=tuple(terms),
        jumps=tuple(jumps),
    )


ENDS = [(True, True), (True, False), (False, True)]


@pytest.mark.parametrize("sites", [2, 3, 4])
@pytest.mark.parametrize("ends", ENDS)
def test_steady_covariance(sites, ends):
    model = general_chain(sites, *ends)
    state = quadratic_state(quadratic_chain(model))
    assert state.residual < 1e-14
    assert np.allclose(state.covariance, covariance(dense_state(model)), atol=1e-12)
    assert state.current is None and "magnetisation" in state.current_reason


@pytest.mark.parametrize("sites", [2, 3, 4])
@pytest.mark.parametrize("ends", ENDS)
def test_whole_spectrum_in_both_parities(sites, ends):
    model = general_chain(sites, *ends)
    chain = quadratic_chain(model)
    levels = quadratic_levels(chain)
    for actual, expected in zip((levels.even, levels.odd), parity_blocks(model), strict=True):
        assert_same_spectrum(actual, expected, 1e-8)


@pytest.mark.parametrize("sites", [2, 3, 4])
@pytest.mark.parametrize("model", [general_chain, driven_chain])
def test_gap(sites, model):
    model = model(sites)
    gap = quadratic_gap(quadratic_chain(model))
    even, odd = (np.sort(-levels.real) for levels in parity_blocks(model))
    assert gap.zero_modes == 1
    assert gap.even_gap == pytest.approx(even[1], abs=1e-9)
    assert gap.odd_gap == pytest.approx(odd[0], abs=1e-9)
    assert gap.gap == min(gap.even_gap, gap.odd_gap)


def test_undamped_modes():
    """Without jumps every pair of levels of H is a mode; a field alone leaves S^z distributions."""
    closed = Model(name="closed", sites=2, hamiltonian=(Term("X X + Y Y"), Term("0.3 Z")))
    gap = quadratic_gap(quadratic_chain(closed))
    even, odd = parity_blocks(closed)
    assert gap.gap == gap.even_gap == 0
    assert gap.zero_modes == np.sum(np.abs(even) < 1e-12)
    levels = quadratic_levels(quadratic_chain(closed))
    assert_same_spectrum(levels.even, even)
    assert_same_spectrum(levels.odd, odd)
    # The second site of two uncoupled ones keeps its populations and precesses.
    lonely = Model(
        name="lonely", sites=2, hamiltonian=(Term("Z"),), jumps=(Jump("S-", on="first"),)
    )
    gap = quadratic_gap(quadratic_chain(lonely))
    even, _ = parity_blocks(lonely)
    assert gap.zero_modes == np.sum(np.abs(even) < 1e-12) == 2
    assert gap.even_gap == pytest.approx(min(-even.real[np.abs(even) > 1e-12]))
    with pytest.raises(ModelError, match="steady state is not unique"):
        quadratic_state(quadratic_chain(lonely))


def conserving_chain(sites):
    terms = [Term("X X + Y Y + 0.3 X Y - 0.3 Y X", coefficient="1 + 0.2*j"), Term("0.2 Z")]
    if sites > 2:
        terms.append(Term("X Z X + Y Z Y", coefficient=0.3))
    jumps = (Jump("S+", on="first", rate=0.7), Jump("S-", on="last", rate=0.5))
    return Model(name="conserving", sites=sites, hamiltonian=tuple(terms), jumps=jumps)


@pytest.mark.parametrize("sites", [2, 3, 4])
def test_conserved_particles(sites):
    """Folded matrices; the current is what enters and what leaves."""
    model = conserving_chain(sites)
    state = quadratic_state(quadratic_chain(model))
    assert np.allclose(state.covariance, covariance(dense_state(model)), atol=1e-12)
    assert np.allclose(state.current, 0.7 * (1 - state.magnetisation[0]), atol=1e-12)
    assert np.allclose(state.current, 0.5 * (1 + state.magnetisation[-1]), atol=1e-12)


@pytest.mark.parametrize("model", [general_chain(3), conserving_chain(3)])
@pytest.mark.parametrize("time", [0.0, 0.3, 2.0, 40.0])
def test_evolution(model, time):
    start = np.array([1.0, 1.0, -1.0])
    density = np.diag((np.arange(8) == 1).astype(complex))
    later = (expm(kronecker_generator(model) * time) @ density.ravel()).reshape(8, 8)
    chain = quadratic_chain(model)
    actual = evolved_covariance(chain, product_covariance(start), time)
    assert np.allclose(actual, covariance(later), atol=1e-12)


def test_currents_obey_continuity_in_time():
    chain = quadratic_chain(conserving_chain(5))
    start = evolved_covariance(chain, product_covariance(np.array([1, -1, 1, 1, -1.0])), 0.4)
    rate = chain.hamiltonian @ start + start @ chain.hamiltonian.T
    change = np.diagonal(rate, 1)[::2]
    flow = np.concatenate([[0], hamiltonian_currents(chain, start), [0]])
    assert np.allclose(change, flow[:-1] - flow[1:], atol=1e-12)


def test_driven_xx_of_many_sites():
    """The closed form at 300 sites; the gap falls as L^-3 (Žnidarič, Phys. Rev. E 92, 042143)."""
    closed = driven_xx_state(300, (1.0, 1.0), (0.5, -0.5))
    ones = np.ones(300)
    chain = boundary_driven_chain(ones[1:], ones[1:], 0.2 * ones, (0.75, 0.25), (0.25, 0.75))
    state = quadratic_state(chain)
    assert np.allclose(state.magnetisation, closed.magnetisation, atol=1e-11)
    assert np.allclose(state.current, closed.current, atol=1e-11)
    slowest = [
        rapidities(boundary_driven_chain(*[np.ones(n - 1)] * 2, np.zeros(n), (1, 0), (0, 1)))[0]
        for n in (100, 200)
    ]
    assert np.log2(slowest[0].real / slowest[1].real) == pytest.approx(3, abs=0.1)


def test_long_chain_builder_is_the_model():
    model = driven_chain(4, drive=1.3, bias=0.4, field=0.7)
    read = quadratic_chain(model)
    built = boundary_driven_chain(
        np.ones(3), np.ones(3), np.full(4, 0.7), (0.91, 0.39), (0.39, 0.91)
    )
    assert np.allclose(read.drift(), built.drift()) and np.allclose(read.source(), built.source())
    assert np.allclose(quadratic_state(read).magnetisation, driven_xx_of(model).magnetisation)


def test_pairing_at_a_size_that_needs_halving():
    """Real arithmetic with 2 x 2 blocks; the residual is recomputed from the full equation."""
    ones = np.ones(90)
    chain = boundary_driven_chain(ones[1:], 0.3 * ones[1:], 0.6 * ones, (0.8, 0.1), (0.3, 0.9))
    state = quadratic_state(chain)
    drift, gamma = chain.drift(), state.covariance
    assert np.abs(drift @ gamma + gamma @ drift.T + chain.source()).max() < 1e-12
    assert np.linalg.norm(gamma, 2) <= 1 + 1e-12
    assert_same_spectrum(state.rapidities, -np.linalg.eigvals(drift), 1e-8)


NOT_QUADRATIC = [
    (driven_chain(3, delta=0.5), "Z_1 Z_2 is a product of 4 fermion operators"),
    (driven_chain(3, dephasing=0.1), "Z_1 is a product of 2 fermion operators"),
    (
        Model(name="loss", sites=3, hamiltonian=(Term("X X + Y Y"),), jumps=(Jump("S-"),)),
        "_2 inside a chain of 3 sites carries the string",
    ),
    (
        Model(name="tilted", sites=3, hamiltonian=(Term("X X + Y Y"), Term("X")), jumps=()),
        "X_1 is a product of 1 fermion",
    ),
    (
        Model(name="ring", sites=3, boundary="periodic", hamiltonian=(Term("X X"),)),
        "is a ring",
    ),
    (
        Model(
            name="two ends",
            sites=2,
            hamiltonian=(Term("X X"),),
            jumps=(Jump("S- I + I S-", on="first"),),
        ),
        "first and at the last",
    ),
    (
        Model(
            name="shifted", sites=2, hamiltonian=(Term("X X"),), jumps=(Jump("S- + I", on="first"),)
        ),
        "adds a number",
    ),
    (load_model("spin1-bilinear-biquadratic"), "local dimension 3"),
]


@pytest.mark.parametrize(("model", "words"), NOT_QUADRATIC)
def test_reasons_in_words(model, words):
    with pytest.raises(ModelError, match=words):
        quadratic_chain(model)


def test_loss_inside_is_indeed_not_linear():
    """Fermionic loss on site 2 of 3 gives another covariance than S- does there."""
    terms = (Term("X X + Y Y"),)
    ends = (Jump("S+", on="first", rate=0.5), Jump("S-", on="last", rate=0.3))
    spin = Model(name="spin", sites=3, hamiltonian=terms, jumps=(*ends, Jump("S-", on=(2,))))
    fermion = Model(
        name="fermion", sites=3, hamiltonian=terms, jumps=(*ends, Jump("Z S-", on="first"))
    )
    exact = covariance(dense_state(spin))
    quadratic = quadratic_state(quadratic_chain(fermion)).covariance
    assert np.allclose(quadratic, covariance(dense_state(fermion)), atol=1e-12)
    assert np.abs(exact - quadratic).max() > 1e-3


def test_bad_requests():
    chain = quadratic_chain(driven_chain(3))
    with pytest.raises(ModelError, match="time = -1"):
        evolved_covariance(chain, np.zeros((6, 6)), -1)
    with pytest.raises(ModelError, match="magnetisation"):
        product_covariance(np.array([2.0]))
    with pytest.raises(ModelError, match="yy has shape"):
        boundary_driven_chain(np.ones(2), np.ones(3), np.ones(3), (1, 0), (0, 1))
    with pytest.raises(CapacityError, match="9 sites"):
        quadratic_levels(quadratic_chain(driven_chain(9)))
