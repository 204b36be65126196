"""Exclusion processes as chains of jumps alone."""

from math import factorial

import numpy as np
import pytest

from lbwork.model import Jump, Model
from lbwork.steady import steady_state
from tests.chains import open_exclusion


def partition(sites, entry, exit_rate):
    """Z_N of B. Derrida, M. Evans, V. Hakim, V. Pasquier, J. Phys. A 26, 1493 (1993)."""
    return sum(
        p
        * factorial(2 * sites - 1 - p)
        / (factorial(sites) * factorial(sites - p))
        * (exit_rate ** (-p - 1) - entry ** (-p - 1))
        / (1 / exit_rate - 1 / entry)
        for p in range(1, sites + 1)
    )


@pytest.mark.parametrize("sites", [2, 3, 4])
@pytest.mark.parametrize(("entry", "exit_rate"), [(0.3, 0.8), (0.6, 0.45)])
def test_open_current(sites, entry, exit_rate):
    """``J = Z_{N-1} / Z_N``; the magnetisation current is twice the particle current."""
    previous = partition(sites - 1, entry, exit_rate) if sites > 1 else 1.0
    state = steady_state(open_exclusion(sites, entry, exit_rate))
    assert np.allclose(state.spin_current, 2 * previous / partition(sites, entry, exit_rate))


def test_open_current_values():
    """J(.4, .4) = 0.2105263158 at N = 2, 0.2193146417 at N = 4 (independent dense script)."""
    for sites, current in ((2, 0.2105263158), (4, 0.2193146417)):
        state = steady_state(open_exclusion(sites, 0.4, 0.4))
        assert np.allclose(state.spin_current, 2 * current, atol=3e-10)


@pytest.mark.parametrize("sites", [2, 3, 4, 5])
def test_open_profile(sites):
    """Entry and exit 1: ``J = (N+2)/(2(2N+1))`` and the closed-form profile of Derrida et al."""
    state = steady_state(open_exclusion(sites, 1.0, 1.0))
    assert np.allclose(state.spin_current, (sites + 2) / (2 * sites + 1))
    for place in range(1, sites + 1):
        rest = sites - place + 1
        occupation = 0.5 + (sites - 2 * place + 1) / 4 * (
            factorial(2 * place) / factorial(place) ** 2
        ) * (factorial(sites) ** 2 / factorial(2 * sites + 1)) * (
            factorial(2 * rest) / factorial(rest) ** 2
        )
        assert state.magnetisation[place - 1] == pytest.approx(2 * occupation - 1, abs=1e-12)


def test_symmetric_process_has_a_linear_profile():
    """``J = (rho_a - rho_b)/(L+1)`` (exact for independent-particle averages; Derrida et al.)."""
    sites, left, right = 4, 0.7, 0.2
    model = Model(
        name="symmetric exclusion",
        sites=sites,
        jumps=(
            Jump("S- S+"),
            Jump("S+ S-"),
            Jump("S+", on="first", rate=left),
            Jump("S-", on="first", rate=1 - left),
            Jump("S+", on="last", rate=right),
            Jump("S-", on="last", rate=1 - right),
        ),
    )
    state = steady_state(model)
    assert np.allclose(state.spin_current, 2 * (left - right) / (sites + 1), atol=1e-12)
    occupation = left + (right - left) * np.arange(1, sites + 1) / (sites + 1)
    assert np.allclose(state.magnetisation, 2 * occupation - 1, atol=1e-12)
