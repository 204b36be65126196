"""Driven spin chains against closed forms and dense values of independent scripts."""

import numpy as np
import pytest

from lbwork.steady import SteadyOptions, steady_state
from tests.chains import driven_chain, weakly_driven

# M. Znidaric, J. Stat. Mech. L05002 (2010), arXiv:1005.1271 treats this chain; the closed form
# I = mu / (2/G + G/8 + g (L-1)/2) was checked by an independent dense script at L = 2..5.
DEPHASED = {
    (2, 1.0, 0.5, 0.7): (0.404040404, [0.095959596]),
    (3, 1.3, 1.0, 0.7): (0.832999600, [0.359231077]),
    (4, 0.8, 0.4, 1.1): (0.188235294, [0.16470588, 0.05176471, -0.05176471, -0.16470588]),
    (5, 1.0, 1.0, 0.5): (0.64, [0.36, 0.16, 0.0, -0.16, -0.36]),
    (4, 1.0, 1.0, 0.0): (0.941176471, [0.05882353, 0.0, 0.0, -0.05882353]),
}


@pytest.mark.parametrize("case", DEPHASED)
def test_hopping_with_dephasing(case):
    sites, drive, bias, dephasing = case
    current, profile = DEPHASED[case]
    state = steady_state(driven_chain(sites, drive=drive, bias=bias, dephasing=dephasing))
    closed = 2 * bias / (2 / drive + drive / 8 + dephasing * (sites - 1) / 2)
    assert np.allclose(state.spin_current, closed, atol=1e-12)
    assert closed == pytest.approx(current, abs=1e-9)
    assert np.allclose(state.magnetisation[: len(profile)], profile, atol=2e-8)
    assert state.magnetisation[0] == pytest.approx(bias - closed / drive, abs=1e-12)
    assert state.continuity_error < 1e-13


def test_uniform_field_changes_nothing():
    """The field commutes with everything else up to a phase of S+ (closed form holds for any h)."""
    state = steady_state(driven_chain(4, drive=0.8, bias=0.4, dephasing=1.1, field=0.6))
    assert np.allclose(state.spin_current, 0.188235294, atol=1e-9)


# T. Prosen, Phys. Rev. Lett. 107, 137201 (2011); numbers of an independent dense script.
MAXIMAL = {
    0.5: [1.6, 1.5384615385, 1.4751773050, 1.4424552430],
    1.0: [1.6, 1.3793103448, 1.1717171717, 0.9856876167],
    1.5: [1.6, 1.1764705882, 0.6585956416, 0.2545062394],
}
MAXIMAL_PROFILE = {
    0.5: [0.27877238, 0.10741688, 0.0, -0.10741688, -0.27877238],
    1.0: [0.50715619, 0.31176105, 0.0, -0.31176105, -0.50715619],
    1.5: [0.87274688, 0.72377138, 0.0, -0.72377138, -0.87274688],
}


@pytest.mark.parametrize("sites", [2, 3, 4, 5])
@pytest.mark.parametrize("delta", MAXIMAL)
def test_maximally_driven(delta, sites):
    state = steady_state(driven_chain(sites, delta=delta, drive=2.0, bias=1.0))
    assert np.allclose(state.spin_current, MAXIMAL[delta][sites - 2], atol=1e-9)
    assert state.spin_current[0] == pytest.approx(2 * (1 - state.magnetisation[0]), abs=1e-12)
    if sites == 5:
        assert np.allclose(state.magnetisation, MAXIMAL_PROFILE[delta], atol=1e-8)


@pytest.mark.parametrize("drive", [0.5, 2.0])
def test_isotropic_matrix_product(drive):
    """``rho = Omega Omega^dag / tr`` with the spin matrices of Prosen 2011, ``s = 4i/G``."""
    sites, levels = 4, 6
    spin = 4j / drive
    ladder = np.arange(levels)
    diagonal = np.diag(spin - ladder)
    raising = np.diag(ladder[1:].astype(complex), 1)
    lowering = np.diag(2 * spin - ladder[:-1], -1)
    local = np.array([[diagonal, raising], [lowering, -diagonal]])
    product = np.eye(levels)[0].reshape(1, 1, levels)
    for _ in range(sites):
        product = np.einsum("ABv,abvw->AaBbw", product, local)
        product = product.reshape(product.shape[0] * 2, product.shape[2] * 2, levels)
    factor = product[:, :, 0]
    density = factor @ factor.conj().T
    density /= np.trace(density)
    state = steady_state(driven_chain(sites, delta=1.0, drive=drive, bias=1.0))
    assert np.allclose(state.density, density, atol=1e-12)


# Dense and iterative independent solvers agree.
WEAK = {
    (6, 0.5): ([0.05434, 0.01879, 0.00600], 6e-6),
    (5, 1.0): ([0.0803245677, 0.0351080866, 0.0], 2e-10),
    (6, 1.0): ([0.0883733544, 0.0464044436, 0.0148123483], 2e-10),
}


@pytest.mark.parametrize("case", WEAK)
def test_weakly_driven(case):
    (sites, delta), (half, accuracy) = case, WEAK[case]
    state = steady_state(weakly_driven(sites, delta, 0.2))
    assert np.allclose(state.magnetisation[: len(half)], half, atol=accuracy)
    assert np.allclose(state.magnetisation, -state.magnetisation[::-1], atol=1e-12)
    assert np.ptp(state.spin_current) < 1e-12


@pytest.mark.slow
@pytest.mark.parametrize(
    ("sites", "half"),
    [
        (7, [0.0949585583, 0.0557742583, 0.0271043237, 0.0]),
        (8, [0.1005664989, 0.0635946773, 0.0371141006, 0.0123462403]),
    ],
)
def test_weakly_driven_longer(sites, half):
    state = steady_state(weakly_driven(sites, 1.0, 0.2), options=SteadyOptions(method="filtered"))
    assert np.allclose(state.magnetisation[: len(half)], half, atol=2e-10)
