"""Whole spectra with known answers: closed forms, Markov matrices, differences of energies."""

import itertools

import numpy as np
import pytest
from quspin.basis import spin_basis_1d
from quspin.operators import hamiltonian

from lbwork.model import Jump, Model, Term, load_model
from lbwork.spectrum import full_spectrum, sector_spectrum
from lbwork.symmetry import plan_sectors
from tests.matching import assert_same_spectrum


def contains(spectrum, wanted, tolerance=1e-9):
    """Every wanted level occurs in the spectrum (with multiplicity, greedily)."""
    left = list(spectrum)
    for level in wanted:
        distances = np.abs(np.array(left) - level)
        nearest = int(np.argmin(distances))
        if distances[nearest] > tolerance:
            return False
        left.pop(nearest)
    return True


@pytest.mark.parametrize(("coupling", "rate"), [(1.0, 0.3), (0.2, 0.9), (1.0, 0.0)])
def test_two_sites_with_dephasing(coupling, rate):
    """Closed form, derived from the Bloch equations of the two-state magnon.

    H = J (XX + YY) couples |10> and |01> with 2J; a coherence decays at 2 gamma for each site on
    which ket and bra differ. One magnon on both sides: 0, -4g, -2g +- sqrt(4 g^2 - 16 J^2).
    """
    model = Model(
        "pair",
        2,
        hamiltonian=(Term("X X + Y Y", coefficient=coupling),),
        jumps=(Jump("Z", rate=rate),),
    )
    root = np.sqrt(complex(4 * rate**2 - 16 * coupling**2))
    expected = [0, 0, 0, -4 * rate, -2 * rate + root, -2 * rate - root]
    expected += [-4 * rate] * 2
    expected += [-2 * rate + 2j * coupling, -2 * rate - 2j * coupling] * 4
    assert_same_spectrum(full_spectrum(model).eigenvalues(), np.array(expected), 1e-9)


def test_two_sites_with_loss_and_no_coupling():
    """Independent decays: sums of 0, -g/2, -g/2, -g of each site (closed form)."""
    model = Model("pair", 2, jumps=(Jump("S-", rate=[0.4, 0.9]),))
    levels = [[0, -rate / 2, -rate / 2, -rate] for rate in (0.4, 0.9)]
    expected = np.array([a + b for a, b in itertools.product(*levels)])
    assert_same_spectrum(full_spectrum(model).eigenvalues(), expected, 1e-9)


@pytest.mark.parametrize("sites", [3, 4, 5])
def test_one_magnon_against_the_vacuum(sites):
    """XX + dephasing: coherences between vacuum and one magnon decay at 2 gamma.

    lambda_k = -2 gamma - i 4 cos k on a ring (one-magnon energies 4 cos k of XX + YY in Pauli
    matrices; closed form).
    """
    model = load_model("xx-dephasing", sites=sites, gamma=0.35)
    momenta = 2 * np.pi * np.arange(sites) / sites
    expected = -0.7 - 4j * np.cos(momenta)
    levels = full_spectrum(model).eigenvalues()
    # vacuum or full chain on one side, one magnon or one hole on the other, and conjugates
    wanted = np.concatenate([expected, expected.conj()] * 2)
    assert contains(levels, wanted)


@pytest.mark.parametrize("sites", [3, 4])
def test_one_magnon_on_both_sides(sites):
    """The one-magnon density matrix of XX + dephasing obeys a closed linear equation.

    d rho_mn/dt = -2i (rho_{m+1,n} + rho_{m-1,n} - rho_{m,n+1} - rho_{m,n-1}) - 4 gamma (1 -
    delta_mn) rho_mn (M. Esposito, P. Gaspard, Phys. Rev. B 71, 214302 (2005), from memory; checked
    by the commutator).
    """
    rate = 0.35
    hop = np.zeros((sites, sites))
    for site in range(sites):
        hop[site, (site + 1) % sites] += 2
        hop[(site + 1) % sites, site] += 2
    one = np.eye(sites)
    decay = -4 * rate * (1 - np.eye(sites)).ravel()
    matrix = -1j * (np.kron(hop, one) - np.kron(one, hop)) + np.diag(decay)
    plan = plan_sectors(load_model("xx-dephasing", sites=sites, gamma=rate))
    levels = full_spectrum(plan).eigenvalues()
    assert contains(levels, np.linalg.eigvals(matrix), 1e-7)


def markov_matrix(sites, particles):
    """Totally asymmetric exclusion on a ring, on configurations with a fixed particle number."""
    states = [state for state in itertools.product((0, 1), repeat=sites) if sum(state) == particles]
    index = {state: place for place, state in enumerate(states)}
    matrix = np.zeros((len(states), len(states)))
    for state in states:
        for site in range(sites):
            after = (site + 1) % sites
            if state[site] == 1 and state[after] == 0:
                moved = list(state)
                moved[site], moved[after] = 0, 1
                matrix[index[tuple(moved)], index[state]] += 1
                matrix[index[state], index[state]] -= 1
    return matrix


@pytest.mark.parametrize("sites", [3, 4])
def test_one_way_hopping_contains_the_exclusion_process(sites):
    """Diagonal sector = Markov matrix of the exclusion process (by its definition)."""
    levels = full_spectrum(load_model("hopping-one-way", sites=sites)).eigenvalues()
    for particles in range(sites + 1):
        wanted = np.linalg.eigvals(markov_matrix(sites, particles))
        assert contains(levels, wanted, 1e-7)


def diagonal_levels(sites, particles):
    """Levels of the sectors of one-way hopping that hold populations with this filling."""
    plan = plan_sectors(load_model("hopping-one-way", sites=sites))
    names = [charge.name for charge in plan.symmetries.charges]
    coherences = names.index("coherences")
    ket, bra = names.index("ket S^z"), names.index("bra S^z")
    found = []
    for sector in plan.sectors:
        label = sector.charge_label
        holes = -label[ket]
        if label[coherences] == 0 and label[ket] == label[bra]:
            # particle-hole symmetric fillings are kept once
            if holes in (particles, sites - particles):
                levels = sector_spectrum(plan, sector).eigenvalues
                found += [levels, levels.conj()]
    return np.concatenate(found)


@pytest.mark.parametrize(
    ("sites", "particles", "level"),
    [
        # L.-H. Gwa, H. Spohn, Phys. Rev. A 46, 844 (1992); table checked with the Markov matrix.
        (4, 2, -1.0),
        (6, 3, -0.534428768123),
        (6, 2, -0.52643852 + 0.44477181j),
    ],
)
def test_ring_gaps_of_the_exclusion_process(sites, particles, level):
    levels = diagonal_levels(sites, particles)
    moving = levels[np.abs(levels) > 1e-9]
    slowest = moving.real.max()
    assert slowest == pytest.approx(np.real(level), abs=2e-8)
    assert np.abs(moving - level).min() < 2e-8


@pytest.mark.parametrize("sites", [3, 4])
def test_zero_dissipation_gives_energy_differences(sites):
    """-i (E_a - E_b) with the energies of QuSpin's Hamiltonian (another general library)."""
    delta = 0.6
    bonds = [[1.0, site, (site + 1) % sites] for site in range(sites)]
    zz = [[delta, site, (site + 1) % sites] for site in range(sites)]
    fields = [[0.3, site] for site in range(sites)]
    basis = spin_basis_1d(sites, pauli=True)
    static = [["xx", bonds], ["yy", bonds], ["zz", zz], ["z", fields]]
    checks = {"check_herm": False, "check_symm": False, "check_pcon": False}
    operator = hamiltonian(static, [], basis=basis, dtype=np.complex128, **checks)
    energies = np.linalg.eigvalsh(operator.static.toarray())
    model = Model(
        "closed",
        sites,
        boundary="periodic",
        parameters={"delta": delta},
        hamiltonian=(Term("X X + Y Y + delta Z Z"), Term("Z", coefficient=0.3)),
    )
    expected = -1j * (energies[:, None] - energies[None, :]).ravel()
    assert_same_spectrum(full_spectrum(model).eigenvalues(), expected, 1e-9)
