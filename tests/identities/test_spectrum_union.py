"""The union of the sector spectra is the spectrum of the generator built by Kronecker products."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from lbwork.model import Jump, Model, Term
from lbwork.spectrum import full_spectrum
from tests.chains import kronecker_generator
from tests.matching import assert_same_spectrum

SPIN_HALF_BONDS = (
    "X X + Y Y",
    "X X + Y Y + 0.7 Z Z",
    "X X",
    "X Y - Y X + 0.3 Z Z",
    "Z Z",
    "X X + 0.4 Y Z + 0.4 Z Y",
)
SPIN_HALF_FIELDS = ("", "X", "0.6 Z", "0.3 X + 0.5 Y", "Z")
SPIN_HALF_JUMPS = ("Z", "S-", "S+", "X", "S- S+", "Z Z", "S+ S-", "0.3 Z + 1j*X", "S- S-")
SPIN_ONE_BONDS = ("Sx Sx + Sy Sy + Sz Sz", "Sx Sx + Sy Sy", "Sz Sz", "Sx Sy - Sy Sx")
SPIN_ONE_FIELDS = ("", "Sz Sz", "0.4 Sx", "Sz")
SPIN_ONE_JUMPS = ("Sz", "S-", "S- S+", "Sx", "Sz Sz")


def random_matrix(seed, size):
    generator = np.random.default_rng(seed)
    return generator.normal(size=(size, size)) + 1j * generator.normal(size=(size, size))


def compare(model, tolerance=1e-9):
    """Levels move with the square root of rounding at exceptional points: compare moments there."""
    spectrum = full_spectrum(model)
    levels = spectrum.eigenvalues()
    dense = kronecker_generator(model)
    scale = max(float(np.linalg.norm(dense, 2)), 1.0)
    for power in (1, 2, 3):
        expected = np.trace(np.linalg.matrix_power(dense / scale, power))
        assert abs(np.sum((levels / scale) ** power) - expected) < 1e-10 * len(levels)
    worst = max(float(sector.error_bounds.max()) for sector in spectrum.sectors)
    if worst < tolerance:
        assert_same_spectrum(levels, np.linalg.eigvals(dense), 100 * tolerance)
    else:
        assert_same_spectrum(levels, np.linalg.eigvals(dense), 1e-2 * scale)


@st.composite
def spin_half_models(draw, sites=(2, 3)):
    length = draw(st.sampled_from(sites))
    terms = [Term(draw(st.sampled_from(SPIN_HALF_BONDS)))]
    field = draw(st.sampled_from(SPIN_HALF_FIELDS))
    if field:
        where = draw(st.sampled_from(["all", "first"]))
        terms.append(Term(field, on=where))
    kinds = draw(st.lists(st.sampled_from(SPIN_HALF_JUMPS), min_size=0, max_size=3, unique=True))
    jumps = [
        Jump(
            kind,
            on=draw(st.sampled_from(["all", "all", "first", "last"])),
            rate=draw(st.sampled_from([0.3, 1.0, 1.7])),
        )
        for kind in kinds
    ]
    return Model(
        name="random chain",
        sites=length,
        boundary=draw(st.sampled_from(["open", "periodic"])),
        hamiltonian=tuple(terms),
        jumps=tuple(jumps),
    )


@st.composite
def spin_one_models(draw):
    kinds = draw(st.lists(st.sampled_from(SPIN_ONE_JUMPS), min_size=1, max_size=2, unique=True))
    field = draw(st.sampled_from(SPIN_ONE_FIELDS))
    return Model(
        name="random spin-one chain",
        sites=2,
        local_dimension=3,
        boundary=draw(st.sampled_from(["open", "periodic"])),
        hamiltonian=(
            Term(draw(st.sampled_from(SPIN_ONE_BONDS))),
            *([Term(field)] if field else []),
        ),
        jumps=tuple(
            Jump(kind, on=draw(st.sampled_from(["all", "first"])), rate=0.8) for kind in kinds
        ),
    )


@settings(max_examples=40, deadline=None, derandomize=True)
@given(spin_half_models())
def test_random_spin_half_chains(model):
    compare(model)


@settings(max_examples=10, deadline=None, derandomize=True)
@given(spin_one_models())
def test_random_spin_one_chains(model):
    compare(model)


@pytest.mark.parametrize("boundary", ["open", "periodic"])
@pytest.mark.parametrize("seed", [1, 2])
def test_chains_without_symmetry(boundary, seed):
    """Random complex Hermitian bond and random two-site jump on three sites."""
    bond = random_matrix(seed, 4)
    model = Model(
        name="structureless",
        sites=3,
        boundary=boundary,
        hamiltonian=(
            Term(bond + bond.conj().T),
            Term("Z", coefficient="0.2*j"),
        ),
        jumps=(Jump(random_matrix(seed + 10, 4), rate=0.3), Jump("S-", on=[2], rate=0.7)),
    )
    compare(model)


FOUR_SITES = {
    "dephased-ring": ("periodic", ("X X + Y Y",), (Jump("Z", rate=0.5),)),
    "driven-open": (
        "open",
        ("X X + Y Y + 0.5 Z Z",),
        (Jump("S+", on="first", rate=1.2), Jump("S-", on="last", rate=0.4)),
    ),
    "chiral-loss-ring": ("periodic", ("X X + Y Y + 0.4 X Y - 0.4 Y X",), (Jump("S-", rate=0.3),)),
    "transverse-ring": ("periodic", ("X X", "0.7 Z"), (Jump("Z Z", rate=0.6),)),
    "three-site-terms": ("open", ("X X + Y Y", "X Z X"), (Jump("Z", rate=0.5), Jump("S- S+"))),
    "closed": ("periodic", ("X X + Y Y + 0.3 Z Z",), ()),
}


def four_sites(name, sites=4):
    boundary, operators, jumps = FOUR_SITES[name]
    return Model(
        name=name,
        sites=sites,
        boundary=boundary,
        hamiltonian=tuple(Term(operator) for operator in operators),
        jumps=jumps,
    )


@pytest.mark.parametrize("name", FOUR_SITES)
def test_four_sites(name):
    compare(four_sites(name))


@pytest.mark.slow
@pytest.mark.parametrize("name", FOUR_SITES)
def test_five_sites(name):
    compare(four_sites(name, sites=5))


@pytest.mark.slow
@pytest.mark.parametrize("boundary", ["open", "periodic"])
def test_three_spin_one_sites(boundary):
    compare(
        Model(
            name="spin-one chain",
            sites=3,
            local_dimension=3,
            boundary=boundary,
            hamiltonian=(Term("Sx Sx + Sy Sy + Sz Sz"),),
            jumps=(Jump("Sz", rate=0.4), Jump("S-", on="first", rate=0.5)),
        )
    )
