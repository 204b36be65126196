"""Matrix-free steady states against published closed forms, dense solvers and hard cases."""

import numpy as np
import pytest

from lbwork import Lindbladian, catalogue, load_model, steady_state
from lbwork.errors import CapacityError, NotCertifiedError, UsageError
from lbwork.exact import driven_xx_state, driven_xxz_state, exclusion_current, unit_rate_profile
from lbwork.model import Jump, Model, Term
from lbwork.steady import SteadyOptions, steady_cost
from tests.chains import driven_chain, kronecker_generator, open_exclusion, weakly_driven

MATRIX_FREE = SteadyOptions(method="matrix-free")
SMALL = {2: 6, 3: 3}


@pytest.mark.parametrize("entry", catalogue(), ids=lambda entry: entry.name)
def test_catalogue_agrees_with_the_sector_solver(entry):
    """Profile, current, state and zero modes against factorised sectors (LAPACK, SuperLU)."""
    model = entry.model()
    if model.sites > 1:
        model = model.replace(sites=SMALL[model.local_dimension])
    found = steady_state(model, options=MATRIX_FREE)
    direct = steady_state(model, options=SteadyOptions(method="factorised"))
    assert np.abs(found.magnetisation - direct.magnetisation).max() < 1e-9
    assert np.abs(found.density - direct.density).max() < 1e-9
    assert found.zero_modes == direct.zero_modes
    assert len(found.states) == len(direct.states)
    if direct.spin_current is not None and model.sites > 1:
        assert np.abs(found.spin_current - direct.spin_current).max() < 1e-9
        assert found.continuity_error < 1e-9


@pytest.mark.parametrize(
    ("sites", "delta", "profile"),
    [
        (8, 0.5, [0.05641, 0.02275, 0.01227, 0.00402]),
        (10, 0.5, [0.05723, 0.02433, 0.01512, 0.00852, 0.00266]),
        (8, 1.0, [0.1005664989, 0.0635946773, 0.0371141006, 0.0123462403]),
    ],
)
def test_weakly_driven_xxz(sites, delta, profile):
    """Profiles on which dense and iterative solvers of another code agree, to the digits given."""
    state = steady_state(weakly_driven(sites, delta, 0.2))
    digits = 5e-6 if delta == 0.5 else 1e-9
    assert state.method == "matrix-free"
    assert np.abs(state.magnetisation[: sites // 2] - profile).max() < digits
    assert np.abs(state.magnetisation + state.magnetisation[::-1]).max() < 1e-9
    assert state.residual < 1e-10
    assert state.zero_modes == 1
    assert state.applies <= 50


@pytest.mark.parametrize(("delta", "sites"), [(0.5, 8), (1.0, 8), (1.5, 8), (1.0, 9)])
@pytest.mark.parametrize("splitting", ["energy", "no-jump"])
def test_maximally_driven_xxz(delta, sites, splitting):
    """T. Prosen, Phys. Rev. Lett. 107, 137201 (2011); any anisotropy: D. Karevski, V. Popkov,
    G. M. Schuetz, Phys. Rev. Lett. 110, 047201 (2013)."""
    model = Model(
        name="maximal",
        sites=sites,
        hamiltonian=(Term(f"X X + Y Y + {delta} Z Z"),),
        jumps=(Jump("S+", on="first", rate=2), Jump("S-", on="last", rate=2)),
    )
    options = SteadyOptions(method="matrix-free", splitting=splitting)
    state = steady_state(model, options=options)
    exact = driven_xxz_state(sites, delta, 2.0)
    assert np.abs(state.magnetisation - exact.magnetisation).max() < 1e-9
    assert np.abs(state.spin_current - exact.current).max() < 1e-9
    assert state.splitting == splitting


@pytest.mark.parametrize("dephasing", [0.0, 0.7])
def test_driven_xx_with_dephasing(dephasing):
    """M. Znidaric, J. Stat. Mech. L05002 (2010), arXiv:1005.1271: flat or linear profile."""
    model = driven_chain(8, drive=1.3, bias=0.6, dephasing=dephasing)
    exact = driven_xx_state(8, (1.3, 1.3), (0.6, -0.6), dephasing)
    state = steady_state(model)
    assert state.method == "matrix-free"
    assert np.abs(state.magnetisation - exact.magnetisation).max() < 1e-9
    assert np.abs(state.spin_current - exact.current).max() < 1e-9


def test_open_exclusion():
    """B. Derrida, M. R. Evans, V. Hakim, V. Pasquier, J. Phys. A 26, 1493 (1993)."""
    state = steady_state(open_exclusion(8, 1.0, 1.0))
    assert state.method == "matrix-free"
    # Two sigma^z for each particle.
    assert np.abs(state.spin_current - 2 * exclusion_current(8, 1.0, 1.0)).max() < 1e-9
    density = (1 + state.magnetisation) / 2
    assert np.abs(density - np.array(unit_rate_profile(8), dtype=float)).max() < 1e-9


def test_single_precision_reaches_double_accuracy(monkeypatch):
    """A small memory budget makes basis and preconditioner single; the answer stays the same."""
    model = weakly_driven(7, 0.8, 0.3)
    plain = steady_state(model)
    monkeypatch.setattr("lbwork.defaults.ITERATIVE_BASIS_BYTES", 600_000)
    narrow = steady_state(model)
    assert narrow.applies > plain.applies
    assert narrow.residual < 1e-10
    assert np.abs(narrow.density - plain.density).max() < 1e-10


def test_rotated_charge():
    """The conserved spin points along x: solved in its own basis, returned in the written one."""
    model = Model(
        name="along x",
        sites=7,
        hamiltonian=(Term("X X + Y Y + Z Z"), Term("X", coefficient=0.3)),
        jumps=(Jump("Z + 1j*Y", on="first", rate=0.3), Jump("Z - 1j*Y", on="last", rate=0.4)),
    )
    state = steady_state(model, options=MATRIX_FREE)
    direct = steady_state(model, options=SteadyOptions(method="factorised"))
    assert np.abs(state.density - direct.density).max() < 1e-9
    image = Lindbladian(model).apply(state.density)
    assert np.linalg.norm(image) < 1e-9 * np.linalg.norm(state.density)


def _ladder(sites):
    """Jumps that move the charge by three: it is kept modulo three, three steady states."""
    return Model(
        name="ladder",
        sites=sites,
        hamiltonian=(Term("X X + Y Y + 0.4 Z Z"),),
        jumps=(
            Jump("Z", rate=0.6),
            Jump("S+ S+ S+", on="first", rate=0.3),
            Jump("S- S- S-", on="first", rate=0.8),
        ),
    )


def test_three_steady_states():
    """Against the singular values of the Kronecker product at four sites."""
    values = np.linalg.svd(kronecker_generator(_ladder(4)), compute_uv=False)
    assert int(np.sum(values < 1e-9)) == 3
    for sites in (4, 7):
        state = steady_state(_ladder(sites), options=MATRIX_FREE)
        assert state.zero_modes == len(state.states) == 3
        assert sum(branch.weight for branch in state.states) == pytest.approx(1)
        assert max(branch.residual for branch in state.states) < 1e-9
        assert len({branch.label for branch in state.states}) == 3


def test_strong_charges_give_one_state_each():
    """XX ring of three sites with dephasing, C(3, m) kets for each charge m, and at six sites:
    one steady state for every charge of the chain, the maximally mixed one of its sector."""
    state = steady_state(load_model("xx-dephasing", sites=7), options=MATRIX_FREE)
    assert state.zero_modes == len(state.states) == 8
    labels = [branch.label for branch in state.states]
    assert len(set(labels)) == 8
    purities = sorted(float(np.linalg.norm(branch.density)) ** 2 for branch in state.states)
    sizes = np.array([1, 1, 7, 7, 21, 21, 35, 35])
    assert np.allclose(purities, np.sort(1 / sizes))


def _pair(broken, sites=7):
    """``Z`` noise would flip the conserved parity of X that everything else keeps."""
    jumps = [Jump("X", rate=0.7), Jump("X X", rate=0.2)]
    if broken:
        jumps.append(Jump("Z", on="first", rate=broken))
    return Model(
        name="pair",
        sites=sites,
        hamiltonian=(Term("Z Z"), Term("X", coefficient=0.9)),
        jumps=tuple(jumps),
    )


def test_a_conserved_pair():
    state = steady_state(_pair(0.0), options=MATRIX_FREE)
    assert state.zero_modes == len(state.states) == 2


def test_a_pair_broken_by_a_millionth():
    """The next mode decays at twice the rate of the perturbation: unique, but nearly degenerate."""
    state = steady_state(_pair(1e-6), options=MATRIX_FREE)
    assert state.zero_modes == 1
    assert state.nearly_degenerate
    assert state.separation == pytest.approx(2e-6, rel=0.1)
    assert np.allclose(state.density, np.eye(128) / 128, atol=1e-9)


def test_a_defective_effective_hamiltonian():
    """Every site at the exceptional point of its Heff, against the Kronecker product's null
    vector."""
    model = Model(
        name="exceptional",
        sites=6,
        hamiltonian=(Term("X", coefficient=0.5),),
        jumps=(Jump("S-", rate=2.0),),
    )
    site = kronecker_generator(model.replace(sites=1))
    null = np.linalg.svd(site)[2][-1].conj().reshape(2, 2)
    null /= np.trace(null)
    expected = null
    for _ in range(5):
        expected = np.kron(expected, null)
    for splitting in ("energy", "no-jump"):
        options = SteadyOptions(method="matrix-free", splitting=splitting)
        state = steady_state(model, options=options)
        assert np.abs(state.density - expected).max() < 1e-9
        assert state.zero_modes == 1


def test_no_dissipation():
    """Squares of the multiplicities of H, counted with NumPy; never a unique state."""
    model = Model(name="closed", sites=7, hamiltonian=(Term("X X + Y Y"), Term("Z")))
    energies = np.linalg.eigvalsh(Lindbladian(model).hamiltonian().toarray())
    multiplicity = np.sum(np.abs(energies[:, None] - energies[None, :]) < 1e-8)
    state = steady_state(model)
    assert state.zero_modes == multiplicity > 128
    assert np.allclose(state.density, np.eye(128) / 128)
    assert "no dissipation" in state.zero_mode_method


def test_a_dark_state_is_found():
    """Loss alone: the empty chain, a pure state on the edge of the positive ones."""
    state = steady_state(load_model("xxx-loss", sites=8))
    assert state.method == "matrix-free"
    assert np.abs(state.magnetisation + 1).max() < 1e-9
    assert state.purity == pytest.approx(1, abs=1e-9)
    assert state.zero_modes == 1


def test_hidden_degeneracy_is_refused_where_it_cannot_be_resolved(monkeypatch):
    monkeypatch.setattr("lbwork.defaults.STEADY_DEGENERATE_SPACE", 1000)
    with pytest.raises(NotCertifiedError, match="several steady states"):
        steady_state(load_model("ising-self-dual", sites=6), options=MATRIX_FREE)


def test_too_long_chains_and_wrong_words():
    cost = steady_cost(weakly_driven(20, 1.0, 0.2))
    assert not cost.fits
    with pytest.raises(CapacityError, match="20 sites"):
        steady_state(weakly_driven(20, 1.0, 0.2))
    with pytest.raises(UsageError, match="splitting 'both'"):
        SteadyOptions(splitting="both")
