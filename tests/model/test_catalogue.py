"""Bundled models: each loads, round-trips and is what its entry says."""

import numpy as np
import pytest

from lbwork.errors import ModelError
from lbwork.model import (
    catalogue,
    catalogue_entry,
    load_model,
    local_operator,
    model_from_toml,
    model_to_toml,
)
from tests.chains import embed, kronecker_generator
from tests.matching import assert_same_spectrum

ENTRIES = {entry.name: entry for entry in catalogue()}


def smallest(name):
    """The model at the smallest size on which all its terms fit and differ."""
    model = ENTRIES[name].model()
    sizes = range(min(3, model.sites), model.sites)
    return model.replace(sites=min(sizes, default=model.sites))


@pytest.mark.parametrize("name", ENTRIES)
def test_round_trip(name):
    model = ENTRIES[name].model()
    again = model_from_toml(model_to_toml(model))
    assert again == model
    assert again.identity == model.identity


@pytest.mark.parametrize("name", ENTRIES)
def test_entry_says_where_a_model_comes_from(name):
    entry = ENTRIES[name]
    assert any(character.isdigit() for character in entry.source)
    assert entry.integrable in ("yes", "no", "unknown")
    assert entry.title and entry.argument and entry.known
    assert all(isinstance(sites, int) for sites in entry.sensible_sites)
    assert entry.sensible_sites == tuple(sorted(entry.sensible_sites))
    assert entry.model().name == name


@pytest.mark.parametrize("name", ENTRIES)
def test_every_sensible_size_is_a_model(name):
    for sites in ENTRIES[name].sensible_sites:
        assert load_model(name, sites=sites).sites == sites


@pytest.mark.parametrize("name", ENTRIES)
def test_generator_conserves_trace_and_decays(name):
    """tr L(rho) = 0 for every rho, no eigenvalue on the right, from plain Kronecker products."""
    model = smallest(name)
    generator = kronecker_generator(model)
    size = model.local_dimension**model.sites
    scale = np.abs(generator).max()
    assert np.abs(np.eye(size).reshape(-1) @ generator).max() < 1e-13 * scale
    assert np.linalg.eigvals(generator).real.max() < 1e-6 * scale


@pytest.mark.parametrize("name", ENTRIES)
def test_each_parameter_matters(name):
    model = ENTRIES[name].model()
    for key, value in model.parameters.items():
        assert (
            model.replace(**{key: 0.5 * value if key != "seed" else 2}).identity != model.identity
        )


def test_catalogue_is_large_and_sorted():
    names = [entry.name for entry in catalogue()]
    assert len(names) >= 20
    assert names == sorted(names)
    assert len({entry.model().identity for entry in catalogue()}) == len(names)


def test_unknown_name():
    with pytest.raises(ModelError, match="did you mean 'xxz-driven'"):
        catalogue_entry("xxz-drivn")


def test_one_way_hopping_moves_to_the_right():
    """A particle on site 1 (state 0 = occupied) is found on site 2 after a jump."""
    jump = load_model("hopping-one-way").placed_jumps()[0]
    assert jump.sites == (0, 1)
    occupied, empty = np.array([1, 0]), np.array([0, 1])
    moved = jump.matrix @ np.kron(occupied, empty)
    assert np.array_equal(moved, np.kron(empty, occupied))
    assert not (jump.matrix @ np.kron(empty, occupied)).any()


def test_driven_chains_push_the_left_end_up():
    """Rates of section 'driven chains' of the literature: S+ enters on the left with 1 + mu."""
    rates = {
        (jump.sites[0], bool(jump.matrix[0, 1])): jump.rate
        for jump in load_model("xxz-driven", sites=4).placed_jumps()
    }
    expected = {(0, True): 1.2, (0, False): 0.8, (3, True): 0.8, (3, False): 1.2}
    assert rates == pytest.approx(expected)


@pytest.mark.parametrize(("drive", "gamma"), [(1.0, 0.5), (0.1, 0.9)])
def test_levels_of_the_two_level_atom(drive, gamma):
    """0, -g/2, -3 g/4 +- sqrt(g^2/16 - drive^2): B. R. Mollow, Phys. Rev. 188, 1969 (1969)."""
    root = np.sqrt(gamma**2 / 16 - drive**2 + 0j)
    expected = np.array([0, -gamma / 2, -0.75 * gamma + root, -0.75 * gamma - root])
    levels = np.linalg.eigvals(
        kronecker_generator(load_model("two-level", drive=drive, gamma=gamma))
    )
    assert_same_spectrum(levels, expected, 1e-12)


def test_permutation_jumps_permute_sites_of_four_states():
    """P rho P exchanges ket and bra together: L = sum of (permutation - 1), here on three sites."""
    levels = np.linalg.eigvals(kronecker_generator(load_model("permutation-jump", sites=3)))
    numbers = np.arange(64).reshape(4, 4, 4)
    total = -3.0 * np.eye(64)
    for axes in ((1, 0, 2), (0, 2, 1), (2, 1, 0)):
        total += np.eye(64)[numbers.transpose(axes).reshape(-1)]
    assert_same_spectrum(levels, np.linalg.eigvalsh(total), 1e-10)


def test_compass_bonds_alternate():
    model = load_model("compass-dephasing", sites=4)
    kinds = {
        placed.sites: "YY" if placed.matrix[0, 3].real < 0 else "XX"
        for placed in model.placed_hamiltonian()
    }
    assert kinds == {(0, 1): "XX", (1, 2): "YY", (2, 3): "XX"}


def test_compass_has_a_weak_symmetry_on_every_bond():
    """rho -> U rho U with U = Y Y on an XX bond and X X on a YY bond commutes with L.

    The static gauge fields of N. Shibata, H. Katsura, Phys. Rev. B 99, 174303 (2019); found by
    hand from the commutation rules of Pauli matrices.
    """
    generator = kronecker_generator(load_model("compass-dephasing", sites=4))
    for bond, pauli in enumerate(("Y", "X", "Y")):
        pair = np.kron(local_operator(pauli, 2), local_operator(pauli, 2))
        unitary = embed(pair, (bond, bond + 1), 4, 2)
        symmetry = np.kron(unitary, unitary.T)
        assert np.abs(generator @ symmetry - symmetry @ generator).max() < 1e-13


def reshetikhin_residual(model):
    """Relative distance of [a + b, [a, b]] from f(a) - f(b) for the Ising ring in doubled form.

    a and b are the parts of L on a site and on the bond to its right neighbour without their
    constants, f changes the weights of ket, bra and joint part. Condition of N. Reshetikhin for a
    third charge, for densities that alternate (from memory).
    """
    one = np.eye(4)
    field = np.kron(local_operator("X", 2), np.eye(2))
    bond = np.kron(local_operator("Z", 2), local_operator("Z", 2))
    numbers = model.parameters

    def parts(matrix):
        return [np.kron(matrix, one), np.kron(one, matrix), np.kron(matrix, matrix)]

    sites, bonds = parts(field), parts(bond)
    h, j = 1j * numbers["field"], 1j * numbers["coupling"]
    a = h * (sites[0] - sites[1]) + numbers["gamma_field"] * sites[2]
    b = j * (bonds[0] - bonds[1]) + numbers["gamma_bond"] * bonds[2]
    inner = a @ b - b @ a
    double = (a + b) @ inner - inner @ (a + b)
    space = np.array([(s - t).ravel() for s, t in zip(sites, bonds, strict=True)]).T
    weights = np.linalg.lstsq(space, double.ravel(), rcond=None)[0]
    return np.linalg.norm(space @ weights - double.ravel()) / np.linalg.norm(double)


def test_self_dual_ising_meets_the_condition_on_its_line_only():
    model = load_model("ising-self-dual")
    assert reshetikhin_residual(model) < 1e-14
    assert reshetikhin_residual(model.replace(gamma_bond=0.7, gamma_field=0.7)) < 1e-14
    assert reshetikhin_residual(model.replace(gamma_bond=0.7)) > 0.1
    assert reshetikhin_residual(model.replace(field=0.6)) > 0.1
