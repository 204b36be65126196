"""Driven chains in closed form against published values and dense steady states."""

import numpy as np
import pytest

from lbwork.errors import CapacityError, ModelError
from lbwork.exact import (
    driven_xx_of,
    driven_xx_state,
    driven_xxz_density,
    driven_xxz_of,
    driven_xxz_state,
)
from lbwork.model import Jump, Model, Term, load_model
from tests.chains import driven_chain, kronecker_generator


def dense_state(model):
    """Steady state of the Kronecker generator, by its singular vector."""
    size = 2**model.sites
    density = np.linalg.svd(kronecker_generator(model))[2][-1].conj().reshape(size, size)
    return density / np.trace(density)


def magnetisation(density, sites):
    signs = 1 - 2 * ((np.arange(2**sites)[:, None] >> np.arange(sites - 1, -1, -1)) & 1)
    return np.diagonal(density).real @ signs


XXZ_CURRENTS = {
    0.5: (1.6, 1.5384615385, 1.4751773050, 1.4424552430),
    1.0: (1.6, 1.3793103448, 1.1717171717, 0.9856876167),
    1.5: (1.6, 1.1764705882, 0.6585956416, 0.2545062394),
}
XXZ_PROFILES = {
    0.5: (0.27877238, 0.10741688, 0.0),
    1.0: (0.50715619, 0.31176105, 0.0),
    1.5: (0.87274688, 0.72377138, 0.0),
}


@pytest.mark.parametrize("delta", XXZ_CURRENTS)
def test_xxz_values(delta):
    """Dense values at G = 2, L = 2..5."""
    states = [driven_xxz_state(sites, delta, 2.0) for sites in (2, 3, 4, 5)]
    assert np.allclose([state.current for state in states], XXZ_CURRENTS[delta], atol=6e-11)
    profile = states[-1].magnetisation
    assert np.allclose(profile[:3], XXZ_PROFILES[delta], atol=6e-9)
    assert np.allclose(profile, -profile[::-1], atol=1e-14)


def test_isotropic_values():
    """Prosen, Phys. Rev. Lett. 107, 137201 (2011): G = 2; ``j L^2`` tends to 4 pi^2."""
    state = driven_xxz_state(20, 1.0, 2.0)
    known = (0.94952727, 0.93620469, 0.8979202, 0.83541897)
    assert np.allclose(state.magnetisation[:4], known, atol=6e-9)
    assert state.current == pytest.approx(0.1009454539, abs=6e-11)
    state = driven_xxz_state(100, 1.0, 2.0)
    known = (0.9980001, 0.9974991, 0.99599841, 0.99349906)
    assert np.allclose(state.magnetisation[:4], known, atol=6e-9)
    assert state.current == pytest.approx(0.0039998058, abs=6e-11)
    state = driven_xxz_state(1000, 1.0, 2.0)
    assert state.current * 1000**2 == pytest.approx(4 * np.pi**2, rel=1e-2)
    cosine = np.cos(np.pi * (np.arange(1000) + 0.5) / 1000)
    assert np.allclose(state.magnetisation, cosine, atol=5e-3)


@pytest.mark.parametrize("sites", [2, 3, 4])
@pytest.mark.parametrize("delta", [-2.0, -0.7, 0.0, 0.5, 1.0, 1.5])
@pytest.mark.parametrize("drive", [0.5, 2.0, 4 * np.sin(1.0)])
def test_xxz_density_is_steady(sites, delta, drive):
    model = driven_chain(sites, delta=delta, drive=drive, bias=1.0)
    density = driven_xxz_density(sites, delta, drive)
    assert np.abs(kronecker_generator(model) @ density.ravel()).max() < 1e-13
    state = driven_xxz_state(sites, delta, drive)
    assert np.allclose(state.magnetisation, magnetisation(density, sites), atol=1e-13)
    # What enters on the left: d<Z_1>/dt = G (1 - <Z_1>) - j.
    assert state.current == pytest.approx(drive * (1 - state.magnetisation[0]), abs=1e-12)


def test_xxz_density_of_six_sites():
    density = driven_xxz_density(6, 1.5, 1.0)
    assert np.trace(density) == pytest.approx(1.0)
    assert np.linalg.eigvalsh(density)[0] > 0
    state = driven_xxz_state(6, 1.5, 1.0)
    assert np.allclose(state.magnetisation, magnetisation(density, 6), atol=1e-13)


def test_xxz_current_of_long_chains():
    """Ballistic below Delta = 1, exponentially small above: no overflow, no cancellation."""
    free = [driven_xxz_state(sites, 0.3, 2.0).current for sites in (300, 600)]
    assert free[0] == pytest.approx(free[1], rel=1e-2)
    logs = [driven_xxz_state(sites, 3.0, 2.0).log_current for sites in (300, 400, 500)]
    assert logs[0] < -500
    assert logs[2] - logs[1] == pytest.approx(logs[1] - logs[0], rel=1e-6)
    assert driven_xxz_state(600, 3.0, 2.0).current == 0.0


@pytest.mark.parametrize("coupling", [0.8, -0.8])
@pytest.mark.parametrize("kinds", [("S+", "S-"), ("S-", "S+")])
def test_xxz_of_a_model(coupling, kinds):
    model = Model(
        name="driven XXZ",
        sites=4,
        hamiltonian=(Term("X X + Y Y", coefficient=coupling), Term("0.9 Z Z + 0.3 Z I")),
        jumps=(Jump(kinds[0], on="first", rate=1.4), Jump(kinds[1], on="last", rate=1.4)),
    )
    # The field term on bonds leaves the last site out: not uniform, refused.
    with pytest.raises(ModelError, match="not a uniform chain"):
        driven_xxz_of(model)
    model = Model(
        name="driven XXZ",
        sites=4,
        hamiltonian=(Term("X X + Y Y", coefficient=coupling), Term("0.9 Z Z"), Term("0.3 Z")),
        jumps=model.jumps,
    )
    state, density = driven_xxz_of(model), dense_state(model)
    assert np.allclose(state.magnetisation, magnetisation(density, 4), atol=1e-11)
    sign = 1 if kinds[0] == "S+" else -1
    assert state.current == pytest.approx(1.4 * (sign - state.magnetisation[0]), abs=1e-11)


def test_xxz_refusals():
    for model, words in (
        (driven_chain(3, delta=1.0, bias=0.5), "not driven"),
        (load_model("xyz-driven"), "not a uniform chain"),
        (load_model("xxz-dephasing"), "ring|not driven"),
    ):
        with pytest.raises(ModelError, match=words):
            driven_xxz_of(model)
    with pytest.raises(CapacityError, match="sites = 9"):
        driven_xxz_density(9, 1.0, 1.0)
    with pytest.raises(ModelError, match="drive = 0"):
        driven_xxz_state(4, 1.0, 0.0)


XX_VALUES = [
    (2, 1.0, 0.5, 0.7, 0.404040404, (0.095959596,)),
    (3, 1.3, 1.0, 0.7, 0.832999600, (0.359231077,)),
    (4, 0.8, 0.4, 1.1, 0.188235294, (0.16470588, 0.05176471, -0.05176471, -0.16470588)),
    (5, 1.0, 1.0, 0.5, 0.64, (0.36, 0.16, 0.0, -0.16, -0.36)),
    (4, 1.0, 1.0, 0.0, 0.941176471, (0.05882353, 0.0, 0.0, -0.05882353)),
]


@pytest.mark.parametrize(("sites", "drive", "bias", "dephasing", "current", "profile"), XX_VALUES)
def test_xx_values(sites, drive, bias, dephasing, current, profile):
    """Dense values of the model of Žnidarič, J. Stat. Mech. L05002 (2010)."""
    state = driven_xx_state(sites, (drive, drive), (bias, -bias), dephasing)
    assert state.current == pytest.approx(current, abs=6e-10)
    assert np.allclose(state.magnetisation[: len(profile)], profile, atol=6e-9)
    model = driven_chain(sites, drive=drive, bias=bias, dephasing=dephasing, field=0.4)
    assert driven_xx_of(model).current == pytest.approx(state.current, abs=1e-14)


@pytest.mark.parametrize("coupling", [1.0, -0.7])
@pytest.mark.parametrize("sites", [2, 3, 4])
def test_xx_with_unequal_ends_and_dephasing(sites, coupling):
    dephasing = np.array([0.3, 0.0, 1.1, 0.6])[:sites]
    jumps = (
        Jump("S+", on="first", rate=0.9),
        Jump("S-", on="first", rate=0.2),
        Jump("S+", on="last", rate=0.5),
        Jump("S-", on="last", rate=1.4),
        Jump("Z", rate=tuple(dephasing)),
    )
    chain = (Term("X X + Y Y", coefficient=coupling), Term("Z", coefficient=0.3))
    model = Model(name="driven XX", sites=sites, hamiltonian=chain, jumps=jumps)
    state, density = driven_xx_of(model), dense_state(model)
    assert np.allclose(state.magnetisation, magnetisation(density, sites), atol=1e-12)
    # d<Z_1>/dt = 2 (0.9 <1-n> - 0.2 <n>) - j.
    occupied = (1 + state.magnetisation[0]) / 2
    assert state.current == pytest.approx(2 * (0.9 * (1 - occupied) - 0.2 * occupied), abs=1e-12)


def test_xx_refusals():
    for model, words in (
        (driven_chain(3, delta=0.1), "not uniform J"),
        (load_model("xx-dephasing"), "ring|without S"),
        (driven_chain(3, bias=1.0).replace(G=0.0), "without S"),
        (load_model("ising-loss"), "no place for the term|ring|not uniform"),
    ):
        with pytest.raises(ModelError, match=words):
            driven_xx_of(model)
    with pytest.raises(ModelError, match="dephasing"):
        driven_xx_state(3, (1, 1), (1, -1), -0.1)
    with pytest.raises(ModelError, match="target"):
        driven_xx_state(3, (1, 1), (2, -1))
