"""Classical processes against closed forms and against the populations of the full generator."""

import numpy as np
import pytest

from lbwork.errors import CapacityError, ModelError
from lbwork.exact import (
    asymmetric_ring_eigenvalue,
    exclusion_current,
    exclusion_process,
    exclusion_profile,
    growth_rate,
    markov_generator,
    occupation_process,
    process_gap,
    stationary_process,
    symmetric_cumulants,
    symmetric_gap,
    symmetric_profile,
    symmetric_ring_gap,
    unit_rate_cumulants,
)
from lbwork.model import Jump, Model, Term
from tests.chains import driven_chain, kronecker_generator, open_exclusion

TWO_WAYS = {"right": 1.3, "left": 0.4}
ENDS = {"enter_left": 0.7, "leave_left": 0.2, "enter_right": 0.15, "leave_right": 0.9}


def asymmetric_model(sites, boundary="open"):
    """Hopping with a spectator: Ising couplings and dephasing do not touch the populations."""
    ends = (
        Jump("S+", on="first", rate=ENDS["enter_left"]),
        Jump("S-", on="first", rate=ENDS["leave_left"]),
        Jump("S+", on="last", rate=ENDS["enter_right"]),
        Jump("S-", on="last", rate=ENDS["leave_right"]),
    )
    return Model(
        name="asymmetric exclusion",
        sites=sites,
        boundary=boundary,
        hamiltonian=(Term("Z Z"),),
        jumps=(
            Jump("S- S+", rate=TWO_WAYS["right"]),
            Jump("S+ S-", rate=TWO_WAYS["left"]),
            Jump("Z", rate=0.3),
            *(ends if boundary == "open" else ()),
        ),
    )


@pytest.mark.parametrize("boundary", ["open", "periodic"])
def test_markov_matrix_is_the_population_block(boundary):
    sites = 4
    model = asymmetric_model(sites, boundary)
    ends = ENDS if boundary == "open" else {}
    process = exclusion_process(sites, **TWO_WAYS, periodic=boundary == "periodic", **ends)
    chosen = np.arange(2**sites) * (2**sites + 1)
    block = kronecker_generator(model)[np.ix_(chosen, chosen)]
    assert np.allclose(block, markov_generator(process).toarray(), atol=1e-14)
    assert np.allclose(block, markov_generator(occupation_process(model)).toarray(), atol=1e-14)


def test_moves_read_from_a_model_know_their_bonds():
    read = occupation_process(asymmetric_model(5))
    built = exclusion_process(5, **TWO_WAYS, **ENDS)
    assert sorted(map(str, read.moves)) == sorted(map(str, built.moves))


@pytest.mark.parametrize(("sites", "rates"), [(1, (0.3, 0.8)), (5, (0.3, 0.8)), (12, (2.0, 0.4))])
def test_stationary_state_of_the_open_process(sites, rates):
    state = stationary_process(exclusion_process(sites, enter_left=rates[0], leave_right=rates[1]))
    assert state.residual < 1e-13
    assert np.allclose(state.profile, exclusion_profile(sites, *rates), atol=1e-12)
    assert sorted(state.currents) == list(range(sites + 1))
    assert np.allclose(list(state.currents.values()), exclusion_current(sites, *rates), atol=1e-12)


def test_stationary_state_of_the_symmetric_process():
    ends = {"enter_left": 0.7, "leave_left": 0.3, "enter_right": 0.2, "leave_right": 0.8}
    process = exclusion_process(9, 1, 1, **ends)
    assert np.allclose(
        stationary_process(process).profile, symmetric_profile(9, 0.7, 0.2), atol=1e-11
    )
    assert process_gap(process).gap == pytest.approx(symmetric_gap(9), abs=1e-10)


def test_an_empty_chain_is_absorbing():
    state = stationary_process(exclusion_process(4, leave_right=1.0))
    assert np.allclose(state.profile, 0) and state.probabilities[-1] == 1


OPEN_GAPS = (1, 0.6073532183, 0.4140680258, 0.3039469068, 0.2347236635, 0.1880566557)


@pytest.mark.parametrize("sites", range(2, 8))
def test_open_gap_values(sites):
    """Dense values at entry = exit = 1 of an independent script."""
    gap = process_gap(exclusion_process(sites, enter_left=1, leave_right=1))
    assert gap.gap == pytest.approx(OPEN_GAPS[sites - 2], abs=6e-11)
    assert gap.zero_modes == 1 and gap.residual < 1e-13


def test_open_gap_by_iteration():
    """Twelve sites, beyond the dense limit; ``N^{3/2}`` times the gap rises to 3.578."""
    gaps = {n: process_gap(exclusion_process(n, enter_left=1, leave_right=1)) for n in (9, 12)}
    assert gaps[9].gap == pytest.approx(0.1304145424, abs=6e-11)
    assert gaps[12].residual < 1e-12
    assert gaps[9].gap * 9**1.5 < gaps[12].gap * 12**1.5 < 3.578


@pytest.mark.parametrize(("sites", "particles"), [(8, 3), (13, 7), (12, 4)])
def test_ring_gaps(sites, particles):
    gap = process_gap(exclusion_process(sites, periodic=True), particles)
    assert gap.eigenvalue == pytest.approx(asymmetric_ring_eigenvalue(sites, particles), abs=1e-10)
    gap = process_gap(exclusion_process(sites, 1, 1, periodic=True), particles)
    assert gap.gap == pytest.approx(symmetric_ring_gap(sites), abs=1e-10)


def test_ring_without_a_particle_number_has_a_zero_mode_per_filling():
    gap = process_gap(exclusion_process(6, 1, 1, periodic=True))
    assert gap.zero_modes == 7
    assert gap.gap == pytest.approx(symmetric_ring_gap(6), abs=1e-10)


@pytest.mark.parametrize("bond", [0, 2, 4])
def test_growth_rate_and_cumulants(bond):
    """The cumulants are the same on every bond."""
    process = exclusion_process(4, enter_left=1, leave_right=1)
    fields = np.array([-0.1, -0.05, 0.0, 0.05, 0.1])
    rates = np.array([growth_rate(process, x, bond) for x in fields])
    # Five values give a polynomial of fourth degree: errors of order 0.1^4 and 0.1^3.
    slopes = np.linalg.solve(np.vander(fields, increasing=True), rates)
    exact = [float(value) for value in unit_rate_cumulants(4, 2)]
    assert slopes[1] == pytest.approx(exact[0], abs=1e-6)
    assert 2 * slopes[2] == pytest.approx(exact[1], abs=1e-4)


def test_growth_rate_of_a_longer_symmetric_process():
    ends = {"enter_left": 1.0, "leave_right": 1.0}
    process, field = exclusion_process(11, 1, 1, **ends), 0.02
    cumulants = symmetric_cumulants(11, 1.0, 0.0)
    series = np.polyval([*(cumulants / (1, 2, 6, 24))[::-1], 0.0], field)
    assert growth_rate(process, field) == pytest.approx(series, abs=1e-10)


def test_growth_rate_obeys_the_fluctuation_symmetry():
    """``E(x) = E(-x - A)`` with the affinity A of the reservoirs (Gallavotti and Cohen)."""
    process = exclusion_process(4, **TWO_WAYS, **ENDS)
    affinity = np.log(0.7 * 0.9 / (0.2 * 0.15) * (1.3 / 0.4) ** 3)
    for field in (0.3, -1.0):
        assert growth_rate(process, field) == pytest.approx(growth_rate(process, -field - affinity))


REFUSED = [
    (driven_chain(3), "moves populations coherently"),
    (Model(name="x", sites=2, jumps=(Jump("X + Z"),)), "makes coherences"),
    (Model(name="spin one", sites=2, local_dimension=3, jumps=(Jump("S+"),)), "local dimension 3"),
]


@pytest.mark.parametrize(("model", "words"), REFUSED)
def test_models_that_are_not_classical(model, words):
    with pytest.raises(ModelError, match=words):
        occupation_process(model)


@pytest.mark.parametrize(
    ("call", "words"),
    [
        (lambda: exclusion_process(4, periodic=True, enter_left=1), "enter_left = 1 on a ring"),
        (lambda: exclusion_process(4, right=-1), "right = -1"),
        (lambda: stationary_process(exclusion_process(4, periodic=True)), "5 stationary states"),
        (lambda: stationary_process(occupation_process(open_exclusion(4, 1, 1)), 2), "particles"),
        (lambda: markov_generator(exclusion_process(3, enter_left=1), bond=3, field=1), "bond = 3"),
        (lambda: process_gap(exclusion_process(3, 0, 0)), "8 of 8 levels are stationary"),
    ],
)
def test_bad_requests(call, words):
    with pytest.raises(ModelError, match=words):
        call()


def test_too_many_configurations():
    with pytest.raises(CapacityError, match="22 sites"):
        stationary_process(exclusion_process(22, enter_left=1, leave_right=1))
