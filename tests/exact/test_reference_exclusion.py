"""Closed forms of exclusion processes against published values and a Markov matrix built here."""

from itertools import combinations, product

import numpy as np
import pytest

from lbwork.errors import CapacityError, ModelError
from lbwork.exact import (
    asymmetric_ring_eigenvalue,
    exclusion_current,
    exclusion_phase,
    exclusion_profile,
    log_partition,
    omega_coefficients,
    symmetric_cumulants,
    symmetric_current,
    symmetric_gap,
    symmetric_profile,
    symmetric_ring_gap,
    unit_rate_cumulants,
    unit_rate_profile,
)
from tests.chains import kronecker_generator, open_exclusion


def populations(model):
    """The Markov matrix: the block of the Kronecker generator that maps diagonals to diagonals."""
    size = 2**model.sites
    chosen = np.arange(size) * (size + 1)
    return kronecker_generator(model)[np.ix_(chosen, chosen)].real


def stationary(matrix):
    state = np.linalg.svd(matrix)[2][-1]
    return state / state.sum()


def occupations(state, sites):
    # Basis state 0 is occupied.
    bits = np.array(list(product((1, 0), repeat=sites)))
    return state @ bits


def ring(sites, particles, back):
    """Markov matrix of a ring: rate 1 to the right, ``back`` to the left."""
    states = list(combinations(range(sites), particles))
    place = {state: index for index, state in enumerate(states)}
    matrix = np.zeros((len(states), len(states)))
    for state, index in place.items():
        for site in state:
            for step, rate in ((1, 1.0), (-1, back)):
                target = (site + step) % sites
                if target not in state:
                    moved = tuple(sorted({*state, target} - {site}))
                    matrix[place[moved], index] += rate
                    matrix[index, index] -= rate
    return matrix


def slowest(matrix):
    levels = np.linalg.eigvals(matrix)
    levels = levels[np.abs(levels) > 1e-9]
    return levels[np.argmax(levels.real + 1e-9 * levels.imag)]


@pytest.mark.parametrize(
    ("rates", "values"),
    [
        ((0.3, 0.8), (0.2139384117, 0.2114051811, 0.2106310754)),
        ((0.4, 0.4), (0.2105263158, 0.2193146417, 0.2235242352)),
        ((1.0, 1.0), (0.4, 1 / 3, 4 / 13)),
    ],
)
def test_open_current_values(rates, values):
    """Derrida, Evans, Hakim, Pasquier, J. Phys. A 26, 1493 (1993); digits from a dense script."""
    for sites, value in zip((2, 4, 6), values, strict=True):
        assert exclusion_current(sites, *rates) == pytest.approx(value, abs=6e-11)
        logs = log_partition(sites, *rates)
        assert exclusion_current(sites, *rates) == pytest.approx(np.exp(logs[-2] - logs[-1]))


@pytest.mark.parametrize("rates", [(0.3, 0.8), (0.4, 0.4), (2.5, 0.2), (1.7, 3.0)])
@pytest.mark.parametrize("sites", [2, 3, 5])
def test_open_profile_and_current_against_the_markov_matrix(sites, rates):
    matrix = populations(open_exclusion(sites, *rates))
    profile = occupations(stationary(matrix), sites)
    assert np.allclose(exclusion_profile(sites, *rates), profile, atol=1e-12)
    assert exclusion_current(sites, *rates) == pytest.approx(rates[1] * profile[-1], abs=1e-12)


def test_single_site():
    assert exclusion_current(1, 0.3, 0.8) == pytest.approx(0.24 / 1.1)
    assert exclusion_profile(1, 0.3, 0.8) == pytest.approx([0.3 / 1.1])


def test_long_open_chain():
    """Bulk density and current of each phase; site N empties at rate ``exit_rate``."""
    for rates in ((0.3, 0.8), (0.9, 0.2), (0.25, 0.25), (0.7, 2.0)):
        phase = exclusion_phase(*rates)
        profile = exclusion_profile(400, *rates)
        current = exclusion_current(400, *rates)
        assert current == pytest.approx(phase.current, abs=2e-3)
        assert profile[-1] * rates[1] == pytest.approx(current, rel=1e-10)
        assert (1 - profile[0]) * rates[0] == pytest.approx(current, rel=1e-10)
        # On the coexistence line the mean profile is straight, with 1/2 in the middle.
        assert profile[199:201].mean() == pytest.approx(np.mean(phase.densities), abs=1e-2)


def test_phases():
    rates = ((0.2, 0.9), (0.9, 0.2), (0.3, 0.3), (1, 0.5))
    names = [exclusion_phase(*pair).name for pair in rates]
    assert names == ["low density", "high density", "coexistence", "maximal current"]
    assert exclusion_phase(0.3, 0.3).densities == (0.3, 0.7)


@pytest.mark.parametrize("sites", [1, 2, 7, 60])
def test_unit_rate_profile(sites):
    assert np.allclose(unit_rate_profile(sites), exclusion_profile(sites, 1, 1), atol=1e-12)
    assert exclusion_current(sites, 1, 1) == pytest.approx((sites + 2) / (2 * (2 * sites + 1)))


def test_unit_rate_cumulants():
    """Lazarescu, Mallick, Phys. Rev. Lett. 106, 180601 (2011); digits from a tilted generator."""
    second = (0.25, 0.144, 0.10422740524781, 0.08352229780801, 0.0707801152016)
    third = (0.125, 0.04672, 0.02350954959243, 0.01321337302873, 0.00760126278149)
    for sites in range(1, 6):
        cumulants = [float(value) for value in unit_rate_cumulants(sites, 3)]
        assert cumulants[0] == pytest.approx((sites + 2) / (2 * (2 * sites + 1)), rel=1e-14)
        assert cumulants[1] == pytest.approx(second[sites - 1], abs=2e-14)
        assert cumulants[2] == pytest.approx(third[sites - 1], abs=2e-14)


CUMULANTS = [
    (1, 1.0, 0.0, (0.5, 0.25, 0.125, 0.0625)),
    (2, 1.0, 0.0, (1 / 3, 0.14814815, 0.04938272, 0.01508916)),
    (3, 1.0, 0.0, (0.25, 0.10416667, 0.03125, 0.00390625)),
    (4, 1.0, 0.0, (0.2, 0.08, 0.0224, 0.00176)),
    (6, 1.0, 0.0, (0.14285714, 0.05442177, 0.01399417, 0.00031203)),
    (2, 0.7, 0.2, (0.16666667, 0.16037037, 0.02839506, 0.01979493)),
    (4, 0.7, 0.2, (0.1, 0.094, 0.0112, 0.006958)),
]


@pytest.mark.parametrize(("sites", "left", "right", "values"), CUMULANTS)
def test_symmetric_cumulants(sites, left, right, values):
    """Digits from a dense tilted generator."""
    assert np.allclose(symmetric_cumulants(sites, left, right), values, atol=1.1e-8)


@pytest.mark.parametrize("sites", [1, 2, 3, 5])
def test_omega_coefficients_against_the_tilted_matrix(sites):
    """Largest eigenvalue at several counting fields, with densities that give the same omega."""
    for left, right, field in ((1.0, 0.0, 0.08), (0.7, 0.2, 0.1), (0.1, 0.9, 0.05)):
        omega = left * (1 - right) * np.expm1(field) + right * (1 - left) * np.expm1(-field)
        level = np.linalg.eigvals(_tilted_symmetric(sites, left, right, field)).real.max()
        series = np.polyval([*omega_coefficients(sites)[::-1], 0.0], omega)
        # What is left out is of order omega^5.
        assert level == pytest.approx(series, abs=0.1 * abs(omega) ** 5 + 1e-14)


def _tilted_symmetric(sites, left, right, field):
    """Counts particles that enter through the first site."""
    matrix = np.zeros((2**sites, 2**sites))
    for state in range(2**sites):
        bits = [(state >> place) & 1 for place in range(sites)]
        moves = [
            (state ^ (3 << place), 1.0, 1.0)
            for place in range(sites - 1)
            if bits[place] != bits[place + 1]
        ]
        ends = ((0, left, np.exp(field), np.exp(-field)), (sites - 1, right, 1.0, 1.0))
        for place, density, enter, leave in ends:
            rate, weight = (1 - density, leave) if bits[place] else (density, enter)
            moves.append((state ^ (1 << place), rate, weight))
        for target, rate, weight in moves:
            matrix[target, state] += rate * weight
            matrix[state, state] -= rate
    return matrix


def test_omega_coefficients_of_long_chains():
    """``arcsinh(sqrt w)^2 = w - w^2/3 + 8 w^3/45 - 4 w^4/35 + ...`` (Derrida et al. 2004)."""
    limits = np.array([1, -1 / 3, 8 / 45, -4 / 35])
    assert np.allclose(1e6 * omega_coefficients(1_000_000), limits, atol=1e-5)


@pytest.mark.parametrize("sites", [1, 2, 3, 5])
def test_symmetric_gap_and_profile(sites):
    matrix = _tilted_symmetric(sites, 0.7, 0.2, 0.0)
    assert -slowest(matrix) == pytest.approx(symmetric_gap(sites), abs=1e-10)
    state = stationary(matrix)
    bits = (np.arange(2**sites)[:, None] >> np.arange(sites)) & 1
    assert np.allclose(state @ bits, symmetric_profile(sites, 0.7, 0.2), atol=1e-12)
    assert symmetric_current(sites, 0.7, 0.2) == pytest.approx(
        0.7 - symmetric_profile(sites, 0.7, 0.2)[0]
    )


@pytest.mark.parametrize(("sites", "particles"), [(6, 1), (6, 2), (6, 3), (8, 4), (8, 6)])
def test_symmetric_ring_gap(sites, particles):
    assert -slowest(ring(sites, particles, 1.0)) == pytest.approx(symmetric_ring_gap(sites))


@pytest.mark.parametrize("sites", range(2, 10))
def test_bethe_equations_in_every_filling(sites):
    for particles in range(1, sites):
        level = asymmetric_ring_eigenvalue(sites, particles)
        assert level == pytest.approx(slowest(ring(sites, particles, 0.0)), abs=1e-10)


def test_half_filled_ring_values():
    """Dense values; the limit is that of Gwa and Spohn (1992)."""
    values = {4: 1.0, 6: 0.534428768123, 8: 0.337173037528, 10: 0.235677640033}
    values |= {12: 0.176085548385, 14: 0.137789561, 16: 0.111530646}
    for sites, value in values.items():
        level = asymmetric_ring_eigenvalue(sites, sites // 2)
        assert -level == pytest.approx(value, abs=6e-10)
    scaled = [-asymmetric_ring_eigenvalue(n, n // 2).real * n**1.5 for n in (500, 1000)]
    # The correction falls as 1/L.
    assert 2 * scaled[1] - scaled[0] == pytest.approx(6.509189337, abs=1e-4)


def test_ring_values_of_other_fillings():
    values = {
        (6, 2): -0.52643852 + 0.44477181j,
        (9, 3): -0.27143714 + 0.28236121j,
        (12, 3): -0.16224482 + 0.30562109j,
        (12, 4): -0.17006498 + 0.20426591j,
    }
    for (sites, particles), value in values.items():
        assert asymmetric_ring_eigenvalue(sites, particles) == pytest.approx(value, abs=1e-8)


@pytest.mark.parametrize(
    ("call", "words"),
    [
        (lambda: exclusion_current(3, -0.1, 1), "entry = -0.1"),
        (lambda: exclusion_current(0, 1, 1), "sites = 0"),
        (lambda: exclusion_profile(2.5, 1, 1), "sites = 2.5"),
        (lambda: exclusion_phase(1, float("nan")), "exit_rate = nan"),
        (lambda: symmetric_cumulants(3, 1.2, 0), "left = 1.2"),
        (lambda: asymmetric_ring_eigenvalue(5, 5), "holes = 0"),
    ],
)
def test_bad_arguments(call, words):
    with pytest.raises(ModelError, match=words):
        call()


def test_too_long():
    with pytest.raises(CapacityError, match="sites = 100000"):
        exclusion_current(100_000, 1, 1)
