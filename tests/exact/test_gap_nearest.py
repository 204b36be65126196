"""Matrix-free gaps: published values, dense levels, complex pairs, charged sectors, refusals."""

import numpy as np
import pytest

from lbwork import Lindbladian, catalogue, load_model, spectral_gap
from lbwork.errors import CapacityError, NotCertifiedError, UsageError
from lbwork.exact import symmetric_gap, symmetric_ring_gap
from lbwork.iterative import (
    SectorSolver,
    chain_equations,
    dense_matrix,
    differences,
    nearest_levels,
    whole_space,
)
from lbwork.model import Jump, Model, Term
from lbwork.spectrum import GapOptions, gap_cost
from lbwork.study import gap_range
from tests.chains import driven_chain, open_exclusion, weakly_driven

NEAREST = GapOptions(method="nearest")


@pytest.mark.parametrize(
    ("sites", "gap"), [(8, 0.12331000), (10, 0.06634411)], ids=["8 sites", "10 sites"]
)
def test_driven_xxz(sites, gap):
    """Equal-charge sector, Delta 1, mu .2: values on which independent solvers agree."""
    result = spectral_gap(weakly_driven(sites, 1.0, 0.2))
    assert result.gap == pytest.approx(gap, abs=6e-9)
    assert result.residual < 1e-10
    assert result.zero_modes == 1
    assert "equal ket and bra charge" in result.scope
    image = Lindbladian(result.model).apply(result.mode)
    assert np.linalg.norm(image - result.eigenvalue * result.mode) < 1e-7
    assert abs(np.trace(result.mode)) < 1e-10


def test_driven_xx_with_dephasing():
    """Rate .5 with the drive 1 +- .2 (values of an independent solver)."""
    model = driven_chain(8, drive=2.0, bias=0.2, dephasing=0.5)
    assert spectral_gap(model).gap == pytest.approx(0.29332542, abs=6e-9)


@pytest.mark.parametrize("entry", catalogue(), ids=lambda entry: entry.name)
def test_catalogue_agrees_with_dense_levels(entry, monkeypatch):
    """Against dense diagonalisation of every sector of equal charge (LAPACK)."""
    # Hidden symmetries leave it degenerate kernels, random terms no slow level to find.
    if entry.name in ("ising-self-dual", "random-two-site"):
        with pytest.raises(NotCertifiedError, match=r"did not converge|zero modes"):
            spectral_gap(entry.model().replace(sites=5), options=NEAREST)
        return
    monkeypatch.setattr("lbwork.defaults.ITERATIVE_DENSE_SIZE", 120)
    model = entry.model()
    if model.sites > 1:
        model = model.replace(sites={2: 5, 3: 3}[model.local_dimension])
    found = spectral_gap(model, options=NEAREST)
    dense = spectral_gap(model, options=GapOptions(method="exhaustive", populations_only=True))
    assert found.gap == pytest.approx(dense.gap, abs=1e-9)
    assert found.residual < 1e-9


def test_tabulated_ring_gap():
    """Half-filled totally asymmetric ring of 8 sites (L.-H. Gwa, H. Spohn, Phys. Rev. A 46, 844
    (1992); the value is a dense one); 70 configurations, 4900 operators."""
    result = spectral_gap(load_model("hopping-one-way", sites=8), options=NEAREST)
    rates = dict(zip(result.searched, result.sector_gaps, strict=True))
    half = [rate for label, rate in rates.items() if "ket S^z = 0 and" in label]
    assert min(half) == pytest.approx(0.337173037528, abs=1e-9)


def test_symmetric_exclusion():
    """``2 (1 - cos(pi / (L + 1)))`` in the open chain (one-particle level of the reservoirs)."""
    model = Model(
        name="reservoirs",
        sites=7,
        jumps=(
            Jump("S+ S-"),
            Jump("S- S+"),
            Jump("S+", on="first", rate=0.8),
            Jump("S-", on="first", rate=0.2),
            Jump("S+", on="last", rate=0.3),
            Jump("S-", on="last", rate=0.7),
        ),
    )
    assert spectral_gap(model, options=NEAREST).gap == pytest.approx(symmetric_gap(7), abs=1e-9)
    ring = load_model("hopping-symmetric", sites=7)
    result = spectral_gap(ring, options=NEAREST)
    assert result.gap == pytest.approx(symmetric_ring_gap(7), abs=1e-9)


@pytest.mark.parametrize("difference", [0, 1, 2, 4])
def test_nearest_levels_of_charged_sectors(difference):
    """Complex sectors against dense levels, two starts; their levels oscillate."""
    model = driven_chain(5, delta=0.8, bias=0.5, field=0.3)
    equations = chain_equations(model)
    space = whole_space(equations.groups, (difference,))
    solver = SectorSolver(equations, space)
    levels = np.linalg.eigvals(dense_matrix(solver))
    if difference == 0:
        levels = levels[np.abs(levels) > 1e-9]
    nearest = levels[np.argmin(np.abs(levels))]
    assert difference == 0 or abs(nearest.imag) > 1e-3
    excluded = None
    if difference == 0:
        excluded = (space.identity() / np.linalg.norm(space.identity()))[None, :]
    for seed in (1, 2):
        found = nearest_levels(solver, seed=seed, tolerance=1e-9, excluded=excluded)
        assert min(abs(found.levels[0] - nearest), abs(found.levels[0] - nearest.conj())) < 1e-8
        assert found.residuals[0] < 1e-9


def test_complex_pair_sets_the_gap(monkeypatch):
    """A driven one-way chain whose slowest neutral levels are a conjugate pair."""
    monkeypatch.setattr("lbwork.defaults.ITERATIVE_DENSE_SIZE", 30)
    model = Model(
        name="circulating",
        sites=5,
        boundary="periodic",
        jumps=(Jump("S- S+"), Jump("Z", rate=0.4)),
        hamiltonian=(Term("Z Z"),),
    )
    found = spectral_gap(model, options=NEAREST)
    dense = spectral_gap(model, options=GapOptions(method="exhaustive", populations_only=True))
    assert abs(dense.eigenvalue.imag) > 0.1
    assert found.eigenvalue == pytest.approx(dense.eigenvalue, abs=1e-9)


def test_all_sectors_find_the_charged_gap():
    """Six sites: the slowest level of all carries a charge and is real; see the dense answer."""
    model = weakly_driven(5, 1.0, 0.2)
    found = spectral_gap(model, options=GapOptions(method="nearest", populations_only=False))
    dense = spectral_gap(model)
    assert found.zero_modes == dense.zero_modes == 1
    assert len(found.searched) == len(differences(chain_equations(model).groups))
    # A level that oscillates faster than the stated reach may be slower; it says so.
    assert found.gap >= dense.gap - 1e-9


def test_closed_chains_do_not_relax():
    model = Model(name="closed", sites=8, hamiltonian=(Term("X X + 0.3 Z Z"),))
    result = spectral_gap(model)
    assert result.gap == 0
    assert result.zero_modes + result.oscillating_modes == 4**8
    energies = np.linalg.eigvalsh(Lindbladian(model).hamiltonian().toarray())
    steps = np.diff(energies)
    assert result.eigenvalue.imag == pytest.approx(steps[steps > 1e-8].min(), abs=1e-9)


def test_starts_that_disagree_are_refused(monkeypatch):
    """A second start that converges to another level must not pass."""
    from lbwork.spectrum import nearest

    honest = nearest.nearest_levels

    def lying(solver, *, seed, **rest):
        found = honest(solver, seed=seed, **rest)
        if seed % 2 == 0:
            found.levels[0] *= 1.001
        return found

    monkeypatch.setattr(nearest, "nearest_levels", lying)
    with pytest.raises(NotCertifiedError, match="independent starts give"):
        spectral_gap(weakly_driven(7, 1.0, 0.2), options=NEAREST)


def test_scaling_compares_like_with_like(monkeypatch):
    """When the longest chain is searched in neutral sectors, all are; the fit has two errors."""
    monkeypatch.setattr("lbwork.defaults.GAP_EXHAUSTIVE_SPACE", 4**5)
    found = gap_range(weakly_driven(4, 1.0, 0.2), (4, 5, 6))
    assert [result.gap for result in found.results][-1] == pytest.approx(0.264256263, abs=1e-8)
    assert all("equal ket and bra" in result.scope for result in found.results)
    assert found.scaling.exponent == pytest.approx(2.6, abs=0.3)
    assert found.scaling.exponent_error > found.scaling.fit_error > 0
    exact = gap_range(open_exclusion(3, 1.0, 1.0), (3, 4, 5))
    assert [round(result.gap, 9) for result in exact.results] == [
        0.607353218,
        0.414068026,
        0.303946907,
    ]


def test_refusals():
    cost = gap_cost(weakly_driven(20, 1.0, 0.2))
    assert not cost.fits
    with pytest.raises(CapacityError, match="20 sites"):
        spectral_gap(weakly_driven(20, 1.0, 0.2))
    with pytest.raises(UsageError, match="method 'fast'"):
        GapOptions(method="fast")
