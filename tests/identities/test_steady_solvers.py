"""Both solvers find the same states, and what is not certified is refused."""

import numpy as np
import pytest

from lbwork.errors import CapacityError, NotCertifiedError, UsageError
from lbwork.generator import Lindbladian
from lbwork.model import Jump, Model, Term
from lbwork.steady import SteadyOptions, steady_state, zero_modes
from lbwork.steady.ness import Finding, certified_state
from lbwork.symmetry import plan_sectors
from tests.chains import driven_chain, kronecker_generator, weakly_driven

MODELS = {
    "driven": driven_chain(5, delta=0.7, bias=0.6, dephasing=0.1, field=0.4),
    "transverse": Model(
        name="transverse",
        sites=4,
        hamiltonian=(Term("Z Z"), Term("X", coefficient=0.8)),
        jumps=(Jump("S-", rate=0.5),),
    ),
    "dark": Model(
        name="dark",
        sites=3,
        boundary="periodic",
        hamiltonian=(Term("X X + Y Y"),),
        jumps=(Jump("S-", rate=0.5),),
    ),
}


@pytest.mark.parametrize("name", MODELS)
def test_steady_state_is_the_null_vector(name):
    """Against the null vector of the Kronecker-product generator (plain NumPy)."""
    model = MODELS[name]
    _, values, right = np.linalg.svd(kronecker_generator(model))
    assert values[-1] < 1e-12 < values[-2]
    size = model.local_dimension**model.sites
    expected = right[-1].conj().reshape(size, size)
    expected = expected / np.trace(expected)
    state = steady_state(model)
    assert np.allclose(state.density, expected, atol=1e-10)
    assert state.min_eigenvalue > -1e-12
    assert state.residual < 1e-12


@pytest.mark.parametrize("search_all", [False, True])
def test_solvers_agree(search_all):
    model = weakly_driven(5, 1.0, 0.2)
    direct = steady_state(model, options=SteadyOptions("factorised", search_all))
    krylov = steady_state(model, options=SteadyOptions("filtered", search_all))
    assert np.allclose(direct.density, krylov.density, atol=1e-11)
    assert direct.zero_modes == krylov.zero_modes == 1
    assert ("excluded" in direct.zero_mode_method) is not search_all


def test_degenerate_kernel_inside_one_sector():
    """Without symmetry labels to help: the Krylov search joins starts until the kernel is complete.

    Jumps that keep two orthogonal pure states of a structureless chain (random unitary frame).
    """
    generator = np.random.default_rng(4)
    frame = np.linalg.qr(generator.normal(size=(16, 16)) + 1j * generator.normal(size=(16, 16)))[0]
    frame = frame[:4, :4]
    frame = np.linalg.qr(frame)[0]
    jumps = tuple(
        Jump(np.outer(frame[:, target], frame[:, source].conj()), rate=0.4 + 0.1 * source)
        for target, source in ((0, 2), (1, 3))
    )
    level = np.diag([0.0, 0.9, 2.1, 3.7])
    model = Model(
        name="two sinks",
        sites=2,
        hamiltonian=(Term(frame @ level @ frame.conj().T),),
        jumps=jumps,
    )
    direct = steady_state(model, options=SteadyOptions("factorised"))
    krylov = steady_state(model, options=SteadyOptions("filtered"))
    assert direct.zero_modes == krylov.zero_modes == 2
    assert len(direct.states) == len(krylov.states) == 2
    assert np.allclose(direct.density, krylov.density, atol=1e-10)


def test_number_of_zero_modes_agrees_with_singular_values():
    model = Model(name="pair loss", sites=3, jumps=(Jump("S- S-", rate=0.8),))
    values = np.linalg.svd(kronecker_generator(model), compute_uv=False)
    found = zero_modes(plan_sectors(model))
    assert found.count == np.sum(values < 1e-10)


def test_a_wrong_state_is_refused_with_what_was_computed():
    model = driven_chain(3, bias=0.5, dephasing=0.2)
    mixed = np.eye(8, dtype=complex) / 8
    with pytest.raises(NotCertifiedError, match="residual") as caught:
        certified_state(Lindbladian(model), mixed, (), Finding(1, "assumed", 1.0))
    assert caught.value.partial.certified is False
    assert caught.value.partial.purity == pytest.approx(1 / 8)


def test_unknown_method_is_refused():
    with pytest.raises(UsageError, match="magic"):
        SteadyOptions(method="magic")


def test_long_chains_are_refused_before_they_start():
    with pytest.raises(CapacityError, match="17 sites"):
        steady_state(driven_chain(17))


def test_kernel_with_exactly_singular_pivots():
    """A closed ring whose real block leaves several zero pivots: eight zero modes in one sector."""
    model = Model(
        name="closed",
        sites=3,
        boundary="periodic",
        hamiltonian=(Term("X X + 0.4 Y Z + 0.4 Z Y"), Term("Z", on="first", coefficient=0.6)),
    )
    values = np.linalg.svd(kronecker_generator(model), compute_uv=False)
    state = steady_state(model)
    assert state.zero_modes == np.sum(values < 1e-10) == 8
    assert len(state.states) == 8


def test_closed_system_is_refused_by_the_filter():
    """Without a decaying level the Krylov search cannot tell how many zero modes it missed."""
    model = Model(
        name="closed",
        sites=3,
        boundary="periodic",
        hamiltonian=(Term("X X + 0.4 Y Z + 0.4 Z Y"), Term("Z", on="first", coefficient=0.6)),
    )
    with pytest.raises(NotCertifiedError, match=r"imaginary axis|converge"):
        steady_state(model, options=SteadyOptions("filtered"))
