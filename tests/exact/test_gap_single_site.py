"""Spectra of one two-level system, known in closed form (any textbook of quantum optics)."""

import numpy as np
import pytest

from lbwork.model import Jump, Model, Term
from lbwork.spectrum import full_spectrum, spectral_gap
from tests.matching import assert_same_spectrum


def single(terms, jumps):
    return Model(name="single site", sites=1, hamiltonian=terms, jumps=jumps)


def test_dephasing():
    """``H = h Z``, jump Z at rate g: populations stay, coherences have ``-2g +- 2ih``."""
    model = single((Term("Z", coefficient=0.7),), (Jump("Z", rate=0.3),))
    assert_same_spectrum(
        full_spectrum(model).eigenvalues(), [0, 0, -0.6 + 1.4j, -0.6 - 1.4j], 1e-14
    )
    result = spectral_gap(model)
    assert result.zero_modes == 2
    assert result.gap == pytest.approx(0.6, abs=1e-14)
    assert abs(result.eigenvalue - (-0.6 + 1.4j)) < 1e-14


def test_decay():
    """Jump S- at rate g: ``0, -g, -g/2 +- 2ih``."""
    model = single((Term("Z", coefficient=0.7),), (Jump("S-", rate=0.3),))
    assert_same_spectrum(
        full_spectrum(model).eigenvalues(), [0, -0.3, -0.15 + 1.4j, -0.15 - 1.4j], 1e-14
    )


@pytest.mark.parametrize("drive", [0.1, 2.0])
def test_driven_decay(drive):
    """``H = W/2 X``, decay g: ``0, -g/2, -3g/4 +- sqrt(g^2/16 - W^2)``
    (B. R. Mollow, Phys. Rev. 188, 1969 (1969))."""
    rate = 0.9
    model = single((Term("X", coefficient=drive / 2),), (Jump("S-", rate=rate),))
    root = np.emath.sqrt(rate**2 / 16 - drive**2)
    expected = [0, -rate / 2, -3 * rate / 4 + root, -3 * rate / 4 - root]
    assert_same_spectrum(full_spectrum(model).eigenvalues(), expected, 1e-13)


def test_exceptional_point_is_flagged_by_its_error_bound():
    """At ``W = g/4`` two levels coalesce: rounding moves them by its square root, and it shows."""
    model = single((Term("X", coefficient=0.125),), (Jump("S-", rate=1.0),))
    (spectrum, *_rest) = sorted(
        full_spectrum(model).sectors, key=lambda item: -float(item.error_bounds.max())
    )
    coalesced = np.abs(spectrum.eigenvalues + 0.75) < 1e-6
    assert coalesced.sum() == 2
    assert np.all(spectrum.error_bounds[coalesced] > 1e-10)
    assert spectrum.certificate.unreliable_levels > 0
