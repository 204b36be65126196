"""Partial traces, currents and continuity, on steady and on arbitrary states."""

import numpy as np
import pytest

from lbwork.generator import Lindbladian
from lbwork.model import Jump, Model, Term
from lbwork.observables.currents import continuity_error, spin_currents
from lbwork.observables.local import (
    magnetisation_profile,
    reduced_density,
    spectrum_quantities,
    zz_correlations,
)
from lbwork.steady import steady_state
from tests.chains import driven_chain, embed


def random_density(size, seed):
    generator = np.random.default_rng(seed)
    matrix = generator.normal(size=(size, size)) + 1j * generator.normal(size=(size, size))
    density = matrix @ matrix.conj().T
    return density / np.trace(density)


@pytest.mark.parametrize(("sites", "dimension"), [(4, 2), (3, 3)])
def test_expectation_values_agree_with_embedded_operators(sites, dimension):
    density = random_density(dimension**sites, 3)
    spin = np.diag(np.arange(dimension - 1, -dimension, -2.0))
    local = [embed(spin, (site,), sites, dimension) for site in range(sites)]
    means = np.array([np.trace(density @ operator).real for operator in local])
    assert np.allclose(magnetisation_profile(density, sites, dimension), means)
    products = np.array([[np.trace(density @ a @ b).real for b in local] for a in local])
    expected = products - np.outer(means, means)
    assert np.allclose(zz_correlations(density, sites, dimension), expected)


@pytest.mark.parametrize("chosen", [(0, 1), (2, 0), (3, 0, 1)])
def test_reduced_density_keeps_the_order_of_sites(chosen):
    density = random_density(16, 5)
    generator = np.random.default_rng(6)
    size = 2 ** len(chosen)
    operator = generator.normal(size=(size, size))
    direct = np.trace(density @ embed(operator, chosen, 4, 2))
    assert np.trace(reduced_density(density, chosen, 4, 2) @ operator) == pytest.approx(direct)


def test_entropy_of_a_mixture():
    """Weights 1/2, 1/4, 1/4: purity 3/8, entropy 3/2 log 2."""
    smallest, purity, entropy = spectrum_quantities(np.diag([0.5, 0.25, 0.25, 0.0]).astype(complex))
    assert (smallest, purity) == (0.0, 0.375)
    assert entropy == pytest.approx(1.5 * np.log(2), abs=1e-14)


CONSERVING = {
    "open": ("open", 2, ("X X + Y Y + 0.3 Z Z",), (Jump("S- S+", rate=0.7), Jump("Z"))),
    "ring": ("periodic", 2, ("X X + Y Y + 0.2 X Y - 0.2 Y X",), (Jump("S+ S-", rate=0.4),)),
    "next-nearest": ("open", 2, ("X X + Y Y", "X I X + Y I Y"), (Jump("S- I S+", rate=0.4),)),
    "next-nearest-ring": ("periodic", 2, ("X Z X + Y Z Y", "X X + Y Y"), (Jump("S- S+"),)),
    "sources": (
        "open",
        2,
        ("X X + Y Y",),
        (Jump("S+", on="first", rate=0.9), Jump("S-", rate=0.2), Jump("X", on="last", rate=0.1)),
    ),
    "spin-one": ("open", 3, ("Sx Sx + Sy Sy + Sz Sz",), (Jump("S- S+", rate=0.5), Jump("S+"))),
    "split-terms": ("open", 2, ("X X", "Y Y", "0.3 X"), (Jump("S-", on=[2]),)),
}


@pytest.mark.parametrize("name", CONSERVING)
def test_continuity_holds_for_any_state(name):
    """Not only in the steady state: the two sides are computed by different routes."""
    boundary, dimension, operators, jumps = CONSERVING[name]
    model = Model(
        name=name,
        sites=4 if dimension == 2 else 3,
        local_dimension=dimension,
        boundary=boundary,
        hamiltonian=tuple(Term(operator) for operator in operators),
        jumps=jumps,
    )
    generator = Lindbladian(model)
    density = random_density(generator.dimension, 8)
    currents = spin_currents(model, density)
    bonds = model.sites if boundary == "periodic" else model.sites - 1
    assert currents.current.shape == (bonds,)
    assert np.abs(currents.current).max() > 1e-3
    assert continuity_error(generator, density, currents) < 1e-13


def test_current_is_positive_to_the_right():
    """One particle on the left of two sites and hops to the right only."""
    model = Model(name="hop", sites=2, jumps=(Jump("S- S+", rate=0.6),))
    density = np.zeros((4, 4), dtype=complex)
    density[1, 1] = 1
    assert spin_currents(model, density).current == pytest.approx([1.2])


def test_current_operator_of_hopping():
    """``j = 2 <X Y - Y X>`` on a bond of ``H = X X + Y Y``, in units of sigma^z."""
    density = random_density(4, 9)
    flip, turn = np.array([[0, 1], [1, 0]]), np.array([[0, -1j], [1j, 0]])
    expected = 2 * np.trace(density @ (np.kron(flip, turn) - np.kron(turn, flip))).real
    model = Model(name="bond", sites=2, hamiltonian=(Term("X X + Y Y"),))
    assert spin_currents(model, density).current == pytest.approx([expected])


def test_terms_that_do_not_conserve_are_named():
    model = Model(name="pairing", sites=3, hamiltonian=(Term("X X"),), jumps=(Jump("S-"),))
    state = steady_state(model)
    assert state.spin_current is None
    assert "sites 1, 2" in state.current_reason
    assert state.continuity_error is None
    assert state.to_dict()["spin_current"] is None


def test_document_of_a_steady_state():
    document = steady_state(driven_chain(3, bias=0.5, dephasing=0.2)).to_dict()
    for key in (
        "magnetisation",
        "spin_current",
        "trace",
        "hermiticity_error",
        "min_eigenvalue",
        "residual",
        "zero_modes",
        "purity",
        "entropy",
        "continuity_error",
        "zero_mode_method",
    ):
        assert key in document
    assert document["trace"] == pytest.approx(1, abs=1e-14)
    assert document["hermiticity_error"] < 1e-12
