"""Time evolution against dense exponentials, with its error bound; decay rates against the gap."""

import numpy as np
import pytest
import scipy.linalg

from lbwork import Lindbladian, load_model, spectral_gap
from lbwork.errors import NotCertifiedError, UsageError
from lbwork.model import Jump, Model, Term
from lbwork.observables import operator_from_words, spin_operators, state_from_words
from lbwork.relaxation import asymptotic_rate, evolve, evolve_operator
from lbwork.spectrum import GapOptions
from lbwork.steady import steady_state
from tests.chains import driven_chain, kronecker_generator, weakly_driven

RANDOM = np.random.default_rng(2)

MODELS = {
    "driven": driven_chain(4, delta=0.7, bias=0.6, dephasing=0.2, field=0.3),
    "tilted": load_model("tilted-ising-driven", sites=3),
    "random": load_model("random-two-site", sites=4),
    "spin one": Model(
        name="spin one",
        sites=2,
        local_dimension=3,
        hamiltonian=(Term("Sx Sx + Sy Sz + Sz Sy"),),
        jumps=(Jump("S-", rate=0.4), Jump("Sz", rate=0.3)),
    ),
}


def _state(size):
    matrix = RANDOM.normal(size=(size, size)) + 1j * RANDOM.normal(size=(size, size))
    density = matrix @ matrix.conj().T
    return density / np.trace(density)


@pytest.mark.parametrize("name", MODELS)
@pytest.mark.parametrize("tolerance", [1e-4, 1e-10])
def test_states_against_the_dense_exponential(name, tolerance):
    """scipy.linalg.expm of the Kronecker-product generator; the true error keeps the bound."""
    model = MODELS[name]
    size = model.local_dimension**model.sites
    start = _state(size)
    found = evolve(model, start, [0.0, 0.3, 1.7], tolerance=tolerance)
    exact = scipy.linalg.expm(1.7 * kronecker_generator(model)) @ start.reshape(-1)
    error = found.final - exact.reshape(size, size)
    assert np.linalg.svd(error, compute_uv=False).sum() <= found.error_bound + 1e-12
    assert found.error_bound <= 1.7 * tolerance * np.sqrt(size)
    assert np.abs(found.traces - 1).max() < max(tolerance, 1e-12)
    assert found.smallest > -tolerance


@pytest.mark.parametrize("name", MODELS)
def test_pictures_agree(name):
    """``tr(A rho(t)) = tr(A(t) rho)``, operators bounded by their error."""
    model = MODELS[name]
    dimension, count = model.local_dimension, model.sites
    start = _state(dimension**count)
    local = np.kron(spin_operators(dimension)["x"], spin_operators(dimension)["z"])
    rest = dimension ** (count - 2)
    whole = np.kron(local, np.eye(rest))
    states = evolve(model, start, [0.4, 1.1], operators={"A": (local, (0, 1))})
    operators = evolve_operator(model, whole, [0.4, 1.1], states={"rho": start})
    difference = states.expectations["A"] - operators.expectations["rho"]
    assert np.abs(difference).max() < 1e-9
    exact = scipy.linalg.expm(1.1 * kronecker_generator(model)).conj().T @ whole.reshape(-1)
    error = operators.final - exact.reshape(whole.shape)
    assert np.linalg.norm(error, 2) <= operators.error_bound + 1e-12


def test_identity_does_not_move_and_steps_compose():
    model = MODELS["driven"]
    assert np.allclose(evolve_operator(model, np.eye(16), [3.0]).final, np.eye(16), atol=1e-10)
    start = state_from_words(model, "neel")
    once = evolve(model, start, [1.0, 2.5])
    half = evolve(model, evolve(model, start, [1.0]).final, [1.5])
    assert np.allclose(once.final, half.final, atol=1e-10)


def test_a_neutral_start_stays_in_its_real_sector():
    """Product states along z need the equal-charge sector only, and give the same answer."""
    model = weakly_driven(5, 0.8, 0.3)
    start = state_from_words(model, "domain-wall")
    whole = evolve(model, start, [2.0])
    exact = scipy.linalg.expm(2.0 * kronecker_generator(model)) @ start.reshape(-1)
    assert np.abs(whole.final - exact.reshape(32, 32)).max() < 1e-9
    assert np.abs(whole.final.imag).max() > 1e-3


def test_single_site_decay_and_dephasing():
    """``<Z>(t) = -1 + 2 exp(-g t)`` under loss, ``<X>(t) = exp(-2 g t)`` under Z noise."""
    times = np.array([0.5, 1.0, 3.0])
    loss = Model(name="loss", sites=1, jumps=(Jump("S-", rate=0.8),))
    found = evolve(loss, np.diag([1.0, 0.0]), times)
    assert np.abs(found.profile[:, 0] - (2 * np.exp(-0.8 * times) - 1)).max() < 1e-9
    noise = Model(name="noise", sites=1, jumps=(Jump("Z", rate=0.8),))
    plus = np.full((2, 2), 0.5)
    found = evolve(noise, plus, times, operators={"X": operator_from_words(noise, "X@1")})
    assert np.abs(found.expectations["X"] - np.exp(-1.6 * times)).max() < 1e-9


def test_rabi_oscillation_without_dissipation():
    model = Model(name="closed", sites=1, hamiltonian=(Term("X", coefficient=0.7),))
    times = np.linspace(0.1, 6, 7)
    found = evolve(model, np.diag([1.0, 0.0]), times)
    assert np.abs(found.profile[:, 0] - np.cos(1.4 * times)).max() < 1e-9


@pytest.mark.parametrize("sites", [3, 5])
def test_asymptotic_rate_is_the_gap(sites):
    """A generic start sees the gap of all sectors, a product state along z that of its own."""
    model = weakly_driven(sites, 1.0, 0.2)
    neutral = spectral_gap(model, options=GapOptions(populations_only=True))
    found = asymptotic_rate(model, state_from_words(model, "up"))
    assert found.rate == pytest.approx(neutral.gap, rel=1e-5)
    assert found.frequency == pytest.approx(abs(neutral.eigenvalue.imag), abs=1e-5)


def test_oscillating_approach():
    """A driven level with weak damping: the slowest modes are a complex pair."""
    model = load_model("two-level", gamma=0.1)
    gap = spectral_gap(model)
    found = asymptotic_rate(model)
    assert found.rate == pytest.approx(gap.gap, rel=1e-5)
    pair = Model(
        name="pair",
        sites=1,
        hamiltonian=(Term("Z"),),
        jumps=(Jump("S-", rate=1.0), Jump("S+", rate=0.4)),
    )
    found = asymptotic_rate(pair)
    assert found.rate == pytest.approx(0.7, rel=1e-6)
    assert found.frequency == pytest.approx(2.0, rel=1e-6)


def test_distance_from_the_steady_state():
    model = weakly_driven(4, 1.0, 0.2)
    steady = steady_state(model).density
    found = evolve(model, state_from_words(model, "mixed"), [0.0, 20.0, 40.0], steady=steady)
    assert found.distances[0] > 10 * found.distances[1] > 100 * found.distances[2]


def test_refusals():
    model = MODELS["driven"]
    start = state_from_words(model, "neel")
    for times in ([], [-1.0], [1.0, 0.5], [np.nan]):
        with pytest.raises(UsageError, match="time"):
            evolve(model, start, times)
    with pytest.raises(UsageError, match="trace"):
        evolve(model, 2 * start, [1.0])
    with pytest.raises(UsageError, match="shape"):
        evolve_operator(model, np.eye(3), [1.0])
    with pytest.raises(NotCertifiedError, match="steady modes"):
        asymptotic_rate(load_model("xx-dephasing", sites=3))
    with pytest.raises(NotCertifiedError, match="did not settle"):
        asymptotic_rate(model, longest=0.5)


def test_generator_is_the_derivative():
    model = MODELS["random"]
    start = _state(16)
    found = evolve(model, start, [1e-4])
    slope = (found.final - start) / 1e-4
    image = Lindbladian(model).apply(start)
    assert np.allclose(slope, image, atol=1e-2 * np.abs(image).max())
