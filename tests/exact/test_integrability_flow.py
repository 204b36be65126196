"""R-matrices integrated from densities alone satisfy Yang-Baxter; where there is none it is said.

Known to be integrable: Heisenberg chains (R. Baxter (1972)), XX with dephasing as Hubbard chain
(M. Medvedyeva, F. Essler, T. Prosen (2016)), one-way hopping (M. de Leeuw, C. Paletta, B. Pozsgay,
Phys. Rev. Lett. 126, 240403 (2021)), permutations (B. Sutherland (1975)), spin-1 chains of
L. Takhtajan and H. Babujian (1982), self-dual dissipative Ising (N. Shibata, H. Katsura (2019)).
"""

import numpy as np
import pytest

from lbwork.errors import CapacityError, UsageError
from lbwork.integrability import (
    hamiltonian_density,
    local_density,
    r_matrix_flow,
    yang_baxter_residual,
)
from lbwork.integrability.flow import _density_series, _r_series
from lbwork.integrability.r_matrix import permutation
from lbwork.model import load_model
from tests.integrability_chains import ring, spin_one_ring

XX = {"jx": 1.0, "jy": 1.0}

FOUND = {
    "XXX": (ring(**XX, jz=1.0), "difference"),
    "XYZ": (hamiltonian_density(ring(jx=1.0, jy=0.7, jz=0.4)), "difference"),
    "XXZ + field": (hamiltonian_density(ring(**XX, jz=0.5, field_z=0.3)), "non-difference"),
    "XX + dephasing": (ring(**XX, dephasing=0.5), "non-difference"),
    "XX + dephasing + field": (ring(**XX, field_z=0.6, dephasing=2.0), "non-difference"),
    "one-way hopping": (ring(right=1.0), "non-difference"),
    "permutation": (ring(permutation=1.0), "difference"),
    "self-dual Ising": (load_model("ising-self-dual"), "difference"),
    "SU(3)": (hamiltonian_density(spin_one_ring(1.0, 1.0)), "difference"),
    "Takhtajan-Babujian": (hamiltonian_density(spin_one_ring(1.0, -1.0)), "difference"),
}

MISSING = {
    "XYZ + field": hamiltonian_density(ring(jx=1.0, jy=0.7, jz=0.4, field_z=0.3)),
    "XXZ + dephasing": ring(**XX, jz=0.5, dephasing=0.5),
    "two-way hopping": ring(right=1.0, left=0.3),
    "XX + loss": ring(**XX, loss=1.0),
    "random": ring(random_energy=3, random_jump=4),
    "bilinear-biquadratic": hamiltonian_density(spin_one_ring(1.0, 0.3)),
    "tilted Ising": hamiltonian_density(load_model("tilted-ising-driven")),
}


@pytest.mark.parametrize("name", FOUND)
def test_integrable_densities_have_an_r_matrix(name):
    source, form = FOUND[name]
    flow = r_matrix_flow(source)
    assert flow.found and flow.form == form
    assert flow.yang_baxter < 1e-13 and flow.unitarity < 1e-13
    assert max(flow.density_residuals) < 1e-13 and max(flow.residuals) < 1e-13


@pytest.mark.parametrize("name", MISSING)
def test_other_densities_are_reported(name):
    flow = r_matrix_flow(MISSING[name])
    assert not flow.found and flow.form == "none"
    assert "no R-matrix" in flow.sentence and "has no solution at order" in flow.sentence
    with pytest.raises(UsageError, match="nothing to evaluate"):
        flow.r_matrix()


def test_what_is_left_is_of_the_order_of_the_perturbation():
    flow = r_matrix_flow(ring(**XX, jz=1e-4, dephasing=0.5))
    assert not flow.found
    assert 1e-6 < flow.density_residuals[0] < 1e-3


def test_the_sign_of_the_derivative_matters():
    """Followed the wrong way, the density of one-way hopping leads to no R-matrix."""
    density = local_density(ring(right=1.0))
    series, _ = _density_series(density, 8)
    backwards = tuple((-1) ** order * part for order, part in enumerate(series))
    assert max(_r_series(density, series)[1]) < 1e-13
    assert max(_r_series(density, backwards)[1]) > 1e-3


@pytest.mark.parametrize("name", ["XX + dephasing", "XYZ", "one-way hopping"])
def test_result_passes_the_independent_check(name):
    source, _ = FOUND[name]
    r_matrix = r_matrix_flow(source).r_matrix()
    report = yang_baxter_residual(r_matrix, local_density(source), points=1, spread=0.02, seed=5)
    assert report.passed, report.sentence
    assert report.factor is not None and not report.mirrored


def test_series_agree_with_the_closed_form():
    """XXX: ``R = 1 + u P`` up to the factor that makes P R_k traceless, so P R ~ P + w(u)."""
    flow = r_matrix_flow(hamiltonian_density(ring(**XX, jz=1.0)))
    value = flow.r_matrix()(0.11, 0.02)
    swap = permutation(2)
    basis = np.stack([np.eye(4).ravel(), swap.ravel()], axis=1)
    _, rest, _, _ = np.linalg.lstsq(basis, value.ravel(), rcond=None)
    assert rest[0] < 1e-28
    assert np.abs(flow.r_matrix()(0.07, 0.07) - swap).max() < 1e-14


def test_bad_arguments_are_refused():
    with pytest.raises(UsageError, match="orders = 2"):
        r_matrix_flow(ring(**XX), orders=2)
    with pytest.raises(UsageError, match="no flow"):
        r_matrix_flow(np.eye(4))
    with pytest.raises(CapacityError, match="9 states per site"):
        r_matrix_flow(load_model("spin1-bilinear-biquadratic"))


def test_record_as_text_and_document():
    flow = r_matrix_flow(ring(right=1.0), orders=12)
    assert "non-difference form" in str(flow) and str(flow) in flow._repr_html_()
    document = flow.to_dict()
    assert document["found"] and document["orders"] == 12
    missing = r_matrix_flow(MISSING["XX + loss"]).to_dict()
    assert missing["yang_baxter"] is None
