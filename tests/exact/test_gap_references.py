"""Gaps with outside references."""

import numpy as np
import pytest

from lbwork.errors import UsageError
from lbwork.model import Jump, Model, Term
from lbwork.spectrum import GapOptions, gap_scaling, spectral_gap
from tests.chains import driven_chain, open_exclusion, weakly_driven


@pytest.mark.parametrize(
    ("sites", "gap"), [(2, 1.0), (3, 0.6073532183), (4, 0.4140680258), (5, 0.3039469068)]
)
def test_open_exclusion(sites, gap):
    """Entry and exit rate 1: dense diagonalisation of the classical chain (independent script);
    J. de Gier, F. Essler, Phys. Rev. Lett. 95, 240601 (2005) give its large-N form."""
    result = spectral_gap(open_exclusion(sites, 1.0, 1.0))
    assert result.gap == pytest.approx(gap, abs=2e-10)
    assert result.zero_modes == 1
    assert result.residual < 1e-12


@pytest.mark.parametrize("sites", [4, 6])
def test_symmetric_exclusion_ring(sites):
    """Gap ``2 (1 - cos(2 pi / L))`` in every filling but empty and full (independent script)."""
    model = Model(
        name="symmetric exclusion",
        sites=sites,
        boundary="periodic",
        jumps=(Jump("S- S+"), Jump("S+ S-")),
    )
    result = spectral_gap(model, options=GapOptions(populations_only=True))
    assert result.gap == pytest.approx(2 * (1 - np.cos(2 * np.pi / sites)), abs=1e-12)


@pytest.mark.parametrize("dense", [1500, 100], ids=["dense", "iterative"])
def test_weakly_driven_chain(dense):
    """Delta = 1, mu = .2, L = 6, equal-charge sector: .264256263 (dense, independent script)."""
    options = GapOptions(populations_only=True, dense_dimension=dense)
    result = spectral_gap(weakly_driven(6, 1.0, 0.2), options=options)
    assert result.gap == pytest.approx(0.264256263, abs=2e-9)
    assert result.zero_modes == 1
    assert result.residual_space == "density matrix"


@pytest.mark.slow
@pytest.mark.parametrize(
    ("model", "gap"),
    [
        (weakly_driven(8, 1.0, 0.2), 0.12331000),
        (driven_chain(8, drive=2.0, bias=0.2, dephasing=0.5), 0.29332542),
    ],
    ids=["interacting", "dephased"],
)
def test_eight_sites(model, gap):
    """Equal-charge sector, iterative eigenvalues of an independent script."""
    result = spectral_gap(model, options=GapOptions(populations_only=True))
    assert result.gap == pytest.approx(gap, abs=1e-8)


def test_oscillating_coherence_is_found_far_from_zero():
    """A uniform field turns the slowest mode of charge 1 at 2h: same rate, imaginary part 6."""
    plain = spectral_gap(weakly_driven(5, 1.0, 0.2))
    field = spectral_gap(
        driven_chain(5, delta=1.0, drive=2.0, bias=0.2, field=3.0),
        options=GapOptions(dense_dimension=100),
    )
    assert field.gap == pytest.approx(plain.gap, abs=1e-10)
    assert field.eigenvalue.imag == pytest.approx(6.0, abs=1e-9)


def test_closed_chain_has_no_gap():
    """Every level is imaginary; zero modes are pairs of equal energies (plain NumPy)."""
    result = spectral_gap(driven_chain(3, delta=0.3, drive=0.0, bias=0.0))
    flip = np.array([[0, 1], [1, 0]])
    turn = np.array([[0, -1j], [1j, 0]])
    sign = np.diag([1, -1])
    bond = np.kron(flip, flip) + np.kron(turn, turn) + 0.3 * np.kron(sign, sign)
    energies = np.linalg.eigvalsh(np.kron(bond, np.eye(2)) + np.kron(np.eye(2), bond))
    degenerate = np.abs(energies[:, None] - energies[None, :]) < 1e-9
    assert result.gap == 0.0
    assert result.zero_modes == np.sum(degenerate)
    assert result.oscillating_modes == 64 - np.sum(degenerate)


def test_dark_states_are_counted():
    """Loss between neighbours only: |00>, |01>-|10> and |01>+|10> decay nowhere for L = 2.

    The jump ``S- S-`` empties |11> alone; the three other states and their coherences stay: 9 zero
    modes, and coherences with |11> decay at half the rate.
    """
    result = spectral_gap(Model(name="pair loss", sites=2, jumps=(Jump("S- S-", rate=0.8),)))
    assert result.zero_modes == 9
    assert result.gap == pytest.approx(0.4, abs=1e-12)


def test_broken_strong_symmetry_leaves_a_small_gap():
    """Dephasing keeps S^z; loss at 1e-6 on one site breaks it with a rate of that size."""
    kept = Model(name="kept", sites=2, hamiltonian=(Term("X X + Y Y"),), jumps=(Jump("Z"),))
    broken = Model(
        name="broken",
        sites=2,
        hamiltonian=(Term("X X + Y Y"),),
        jumps=(Jump("Z"), Jump("S-", on="first", rate=1e-6)),
    )
    assert spectral_gap(kept).zero_modes == 3
    result = spectral_gap(broken)
    assert result.zero_modes == 1
    # One particle on two equally likely sites is lost at half the rate.
    assert result.gap == pytest.approx(0.5e-6, rel=1e-4)


def test_scaling_recovers_a_power_law():
    sizes = [4, 6, 8, 10]
    fit = gap_scaling(sizes, [2.5 * size**-3.0 for size in sizes])
    assert fit.exponent == pytest.approx(3.0, abs=1e-12)
    assert fit.amplitude == pytest.approx(2.5, rel=1e-11)
    assert fit.exponent_error < 1e-11


def test_scaling_refuses_a_closed_gap():
    with pytest.raises(UsageError, match="length 6"):
        gap_scaling([4, 6], [0.1, 0.0])
