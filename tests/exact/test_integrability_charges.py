"""How many local operators are conserved, range by range.

The dimensions are those of an earlier experiment (translation-summed operators, first site
traceless); two-way hopping has 8, 54, 499 at unequal rates only, and 10, 56, 565 at equal ones.
Towers of XXX, XXZ, XYZ: M. Grabowski, P. Mathieu, J. Phys. A 28, 4777 (1995); fragmentation of
incoherent hopping: F. Essler, L. Piroli, Phys. Rev. E 102, 062210 (2020).
"""

import time

import numpy as np
import pytest

from lbwork.errors import CapacityError, UsageError
from lbwork.integrability import conserved_charges, hamiltonian_density, local_density
from lbwork.model import catalogue, load_model
from tests.integrability_chains import ring, spin_one_ring

XX = {"jx": 1.0, "jy": 1.0}
XXX = XX | {"jz": 1.0}
XXZ = XX | {"jz": 0.5}
XYZ = {"jx": 1.0, "jy": 0.7, "jz": 0.4}

ROWS = {
    "XXX": (XXX, (6, 8, 10, 12), "tower"),
    "XXZ": (XXZ, (2, 4, 6, 8, 10), "tower"),
    "XYZ": (XYZ, (0, 2, 4, 6), "tower"),
    "XYZ + field": (XYZ | {"field_z": 0.3}, (0, 2, 2, 2), "none"),
    "XX + dephasing": (XX | {"dephasing": 0.5}, (2, 3, 4, 5, 6), "tower"),
    "XXZ + dephasing": (XXZ | {"dephasing": 0.5}, (2, 3, 3, 3, 3), "none"),
    "XXX + dephasing": (XXX | {"dephasing": 0.5}, (2, 3, 3, 3, 3), "none"),
    "permutation": ({"permutation": 1.0}, (15, 16, 17, 18), "tower"),
    "permutation + XXX": (XXX | {"permutation": 1.0}, (6, 7, 7, 7), "none"),
    "two-way hopping + XX": (XX | {"right": 1.0, "left": 0.3}, (2, 3, 3, 3), "none"),
    "XX + loss": (XX | {"loss": 1.0}, (1, 2, 2, 2), "none"),
    "XXZ + loss": (XXZ | {"loss": 1.0}, (1, 2, 2, 2), "none"),
    "random generator": ({"random_energy": 3, "random_jump": 4}, (0, 1, 1), "none"),
    "random energy": ({"random_energy": 3}, (0, 2, 2), "none"),
}


@pytest.mark.parametrize("name", ROWS)
def test_dimensions_of_the_table(name):
    parameters, dimensions, growth = ROWS[name]
    result = conserved_charges(ring(**parameters), max_range=len(dimensions))
    assert result.dimensions == dimensions
    assert result.growth == growth
    assert len(result.charges) == dimensions[-1]
    assert result.residual < 1e-12
    assert result.margin[0] < 1e-12 and result.margin[1] > 1e-3


def test_two_way_hopping_is_fragmented():
    result = conserved_charges(ring(right=1.0, left=0.3))
    assert result.dimensions == (3, 8, 54, 499)
    assert result.growth == "fragmented"
    assert "no sign of integrability" in result.sentence
    assert result.listed_range == 3 and len(result.charges) == 54
    equal = conserved_charges(ring(right=1.0, left=1.0))
    assert equal.dimensions == (5, 10, 56, 565) and equal.growth == "fragmented"


@pytest.mark.parametrize("name", sorted(set(ROWS) - {"random generator", "random energy"}))
def test_both_methods_agree(name):
    parameters, dimensions, _ = ROWS[name]
    result = conserved_charges(ring(**parameters), max_range=3, method="elimination")
    assert result.dimensions == dimensions[:3]
    assert result.methods == ("elimination",) * 3
    assert result.residual < 1e-12


@pytest.mark.parametrize("name", ["XX + dephasing", "XYZ"])
def test_both_methods_agree_at_range_four(name):
    parameters, dimensions, _ = ROWS[name]
    result = conserved_charges(ring(**parameters), max_range=4, method="elimination")
    assert result.dimensions == dimensions[:4]


def test_closed_chain_counts_half_of_its_generator():
    model = ring(**XXZ)
    single = conserved_charges(hamiltonian_density(model), max_range=5)
    doubled = conserved_charges(model, max_range=5)
    assert tuple(2 * count for count in single.dimensions) == doubled.dimensions
    sides = [charge.acts_on for charge in doubled.charges]
    assert sides.count("ket") == sides.count("bra") == 5


def test_third_charge_of_the_isotropic_chain_in_words():
    """Q3 of XXX is ``sum (S_1 x S_2) . S_3``: M. Grabowski, P. Mathieu (1995)."""
    result = conserved_charges(hamiltonian_density(ring(**XXX)), max_range=3)
    third = result.charges[-1].matrix()
    pauli = [np.array([[0, 1], [1, 0]]), np.array([[0, -1j], [1j, 0]]), np.diag([1, -1])]
    expected = np.zeros((8, 8), dtype=complex)
    for a, b, c in ((0, 1, 2), (1, 2, 0), (2, 0, 1)):
        expected += np.kron(np.kron(pauli[a], pauli[b]), pauli[c])
        expected -= np.kron(np.kron(pauli[b], pauli[a]), pauli[c])
    overlap = abs(np.vdot(third, expected)) / np.linalg.norm(third) / np.linalg.norm(expected)
    assert overlap == pytest.approx(1, abs=1e-12)


def test_named_charges_come_first():
    result = conserved_charges(ring(**XX, dephasing=0.5), max_range=3)
    assert [str(charge).partition(":")[0] for charge in result.charges[:3]] == [
        "range 1, on ket",
        "range 1, on bra",
        "generator, on ket and bra",
    ]
    assert result.charges[0].terms() == "Z:I"
    closed = conserved_charges(ring(**XXZ), max_range=2)
    assert [charge.name for charge in closed.charges[2:]] == [
        "energy of the ket",
        "energy of the bra",
    ]
    assert closed.charges[2].terms() == "S+:I S-:I + S-:I S+:I + 0.25 Z:I Z:I"


def test_weights_label_the_rotations_of_the_isotropic_chain():
    result = conserved_charges(hamiltonian_density(ring(**XXX)), max_range=1)
    assert sorted(charge.weights for charge in result.charges) == [
        (("S^z", -1),),
        (("S^z", 0),),
        (("S^z", 1),),
    ]


@pytest.mark.parametrize(
    ("bilinear", "biquadratic", "growth"),
    # Integrable points: G. Uimin (1970), B. Sutherland (1975); L. Takhtajan, H. Babujian (1982).
    [(1.0, 1.0, "tower"), (1.0, -1.0, "tower"), (0.0, 1.0, "tower"), (1.0, 0.3, "none")],
)
def test_spin_one_chains(bilinear, biquadratic, growth):
    density = hamiltonian_density(spin_one_ring(bilinear, biquadratic))
    assert conserved_charges(density, max_range=4).growth == growth


def test_self_dual_line_of_the_ising_ring():
    """Charges exist on the self-dual line only (N. Shibata, H. Katsura, PRB 99, 224432 (2019))."""
    on = conserved_charges(load_model("ising-self-dual"), max_range=3)
    off = conserved_charges(load_model("ising-self-dual", gamma_field=0.9), max_range=3)
    assert on.dimensions == (0, 2, 4) and on.growth == "tower"
    assert off.dimensions == (0, 1, 1) and off.growth == "none"


def test_ising_chain_has_charges_at_every_range():
    """Free fermions: two charges per range for the closed transverse-field ring (from memory)."""
    density = hamiltonian_density(ring(jx=1.0, field_z=0.6))
    assert conserved_charges(density, max_range=5).increments[1:] == (2, 2, 2, 2)


def test_dense_random_density_at_range_three_is_quick():
    model = ring(random_energy=8, random_jump=9)
    start = time.perf_counter()
    result = conserved_charges(model, max_range=3)
    assert result.dimensions == (0, 1, 1)
    assert time.perf_counter() - start < 5


UNIFORM = [e for e in catalogue() if e.name not in ("compass-dephasing", "two-level")]


@pytest.mark.slow
@pytest.mark.parametrize("entry", UNIFORM, ids=lambda entry: entry.name)
def test_catalogue_at_range_four(entry):
    start = time.perf_counter()
    result = conserved_charges(entry.model(), max_range=4)
    assert time.perf_counter() - start < 30
    assert result.growth in ("tower", "fragmented", "none")


def test_small_perturbations_are_not_taken_for_symmetries():
    result = conserved_charges(ring(**XX, jz=1e-5, dephasing=0.5), max_range=3)
    assert result.dimensions == (2, 3, 3)


@pytest.mark.parametrize("length", [0, -1, 2.0, True])
def test_bad_ranges_are_refused(length):
    with pytest.raises(UsageError, match="max_range"):
        conserved_charges(ring(**XX), max_range=length)


def test_bad_methods_are_refused():
    with pytest.raises(UsageError, match="guess"):
        conserved_charges(ring(**XX), method="guess")
    with pytest.raises(UsageError, match="commutes with an on-site operator"):
        conserved_charges(ring(right=1.0), method="leading parts")


def test_densities_without_content_are_refused():
    with pytest.raises(UsageError, match="every operator is conserved"):
        conserved_charges(np.eye(4))


def test_ranges_out_of_reach_are_refused():
    with pytest.raises(CapacityError, match="range 6"):
        conserved_charges(ring(jz=1.0, field_x=0.5), max_range=6)


def test_record_as_text_and_document():
    result = conserved_charges(ring(**XXX), max_range=3)
    document = result.to_dict()
    assert document["dimensions"] == [6, 8, 10] and len(document["charges"]) == 10
    assert "range 3, on ket" in str(result) and "<table>" in result._repr_html_()
    assert local_density(ring(**XXX)).name in str(result)
