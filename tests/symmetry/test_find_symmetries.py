"""Symmetries of models whose symmetries are known beforehand."""

import numpy as np
import pytest

from lbwork.model import Jump, Term
from lbwork.symmetry import find_symmetries
from tests.symmetry.models import DRIVE, chain, random_unitary

XX = "X X + Y Y"


def charge_names(model):
    return {charge.name for charge in find_symmetries(model).charges}


def symmetry_names(model):
    return {item.name for item in find_symmetries(model).symmetries}


def test_dephasing_keeps_ket_and_bra_charge():
    # Strong U(1): B. Buca, T. Prosen, New J. Phys. 14, 073007 (2012), from memory.
    assert charge_names(chain(XX, [Jump("Z")])) == {"ket S^z", "bra S^z"}


def test_boundary_driving_keeps_only_the_difference():
    model = chain(XX + " + 0.5 Z Z", DRIVE, boundary="open")
    report = find_symmetries(model)
    assert [(c.name, c.kind) for c in report.charges] == [("S^z difference", "weak")]


def test_anisotropy_leaves_parities():
    names = charge_names(chain("X X + 0.4 Y Y", [Jump("Z")]))
    assert names == {"ket parity", "bra parity"}


def test_anisotropy_with_loss_leaves_the_joint_parity():
    assert charge_names(chain("X X + 0.4 Y Y", [Jump("S-")])) == {"joint parity"}


def test_staggered_charge_of_decoupled_sublattices():
    bonds = Term("S+ S- + S- S+", on=[1, 3])
    model = chain("", [Jump("Z")], sites=4, boundary="open", extra=[bonds, Term("Z Z")])
    assert len(find_symmetries(model).charges) == 2


def test_charge_along_a_tilted_axis_is_found_by_rotation():
    u = random_unitary(5)
    x, y, z = (np.array(m) for m in ([[0, 1], [1, 0]], [[0, -1j], [1j, 0]], [[1, 0], [0, -1]]))
    uu = np.kron(u, u)
    hopping = uu @ (np.kron(x, x) + np.kron(y, y)) @ uu.conj().T
    model = chain(hopping, [Jump(u @ z @ u.conj().T)])
    report = find_symmetries(model)
    assert report.rotation is not None
    assert {charge.name for charge in report.charges} == {"ket S^z", "bra S^z"}


def test_random_generator_has_no_symmetry():
    generator = np.random.default_rng(8)
    h = generator.normal(size=(4, 4)) + 1j * generator.normal(size=(4, 4))
    jump = generator.normal(size=(4, 4)) + 1j * generator.normal(size=(4, 4))
    report = find_symmetries(chain(h + h.conj().T, [Jump(jump)], boundary="open"))
    assert report.charges == ()
    assert report.symmetries == ()
    assert report.unresolved == ()


@pytest.mark.parametrize("sites", [3, 4, 5])
def test_translation_and_reflection_of_a_ring(sites):
    names = symmetry_names(chain(XX, [Jump("Z")], sites=sites))
    assert {"translation", "reflection", "spin flip"} <= names


def test_disorder_breaks_translation():
    model = chain(XX, [Jump("Z")], extra=[Term("Z", coefficient=[0.1, 0.2, 0.3, 0.4])])
    assert symmetry_names(model).isdisjoint({"translation", "reflection", "spin flip"})


def test_unit_cell_of_two_sites():
    model = chain(XX, [Jump("Z")], sites=6, extra=[Term("Z", coefficient="0.3*(-1)**j")])
    assert "translation by 2 sites" in symmetry_names(model)


def test_staggered_transposition_of_the_hopping_chain():
    # Sublattice symmetry of bipartite hopping: the signs alternate along the chain.
    assert "transposition and signs" in symmetry_names(chain(XX, [Jump("Z")]))


def test_hidden_rotations_of_dephased_hopping_are_listed():
    # Hubbard form: M. Medvedyeva, F. Essler, T. Prosen, Phys. Rev. Lett. 117, 137202 (2016).
    unresolved = find_symmetries(chain(XX, [Jump("Z")])).unresolved
    assert any("string" in item.name and item.generators >= 4 for item in unresolved)


def test_interaction_removes_the_hidden_rotations():
    assert find_symmetries(chain(XX + " + 0.5 Z Z", [Jump("Z")])).unresolved == ()


def test_isotropic_chain_has_unresolved_rotations():
    model = chain(XX + " + Z Z", [Jump("X"), Jump("Y"), Jump("Z")])
    assert any("SU(2)" in item.name for item in find_symmetries(model).unresolved)


def test_field_removes_the_rotations():
    model = chain(XX + " + Z Z", [Jump("Z")], extra=[Term("Z", coefficient=0.3)])
    assert not any("SU(2)" in item.name for item in find_symmetries(model).unresolved)


def test_every_residual_is_recomputed_and_small():
    for item in find_symmetries(chain(XX, [Jump("Z")])).symmetries:
        assert item.residual < 1e-12
