"""Operators that are almost conserved near integrable points."""

import numpy as np
import pytest

from lbwork.errors import CapacityError, UsageError
from lbwork.integrability import conserved_charges, hamiltonian_density, nearly_conserved
from lbwork.integrability.string_vectors import commuted
from tests.integrability_chains import ring

XX = {"jx": 1.0, "jy": 1.0, "dephasing": 0.5}


def test_broken_third_charge_is_the_only_small_value():
    """Its singular value is of the order of the perturbation."""
    weak = nearly_conserved(ring(**XX, jz=1e-3))
    weaker = nearly_conserved(ring(**XX, jz=1e-4))
    assert weak.exact == weaker.exact == 3
    assert weak.below(0.05) == weaker.below(0.05) == 1
    assert weak.values[0] / weaker.values[0] == pytest.approx(10, rel=0.01)


def test_values_are_norms_of_commutators():
    result = nearly_conserved(ring(**XX, jz=0.3), count=4)
    norms = commuted(result.density.table, result.operators).norms
    assert norms == pytest.approx(result.values, abs=1e-12)
    assert result.operators.norms == pytest.approx(1, abs=1e-12)
    assert np.all(np.diff(result.values) >= 0)


@pytest.mark.parametrize("parameters", [XX, {"right": 1.0, "left": 0.3}, {"jx": 1.0, "jz": 0.4}])
def test_exact_ones_are_counted_as_charges(parameters):
    model = ring(**parameters)
    assert nearly_conserved(model).exact == conserved_charges(model, max_range=3).dimensions[-1]


def test_parts_beyond_direct_decomposition():
    """A dense Hamiltonian density at range five is one part with 3 * 4**4 = 768 strings."""
    density = hamiltonian_density(ring(random_energy=3))
    result = nearly_conserved(density, max_range=5, count=3)
    assert result.exact == 1
    shorter = nearly_conserved(density, max_range=4, count=3)
    assert np.all(result.values <= shorter.values + 1e-12)
    norms = commuted(density.table, result.operators).norms
    assert norms == pytest.approx(result.values, abs=1e-10)


def test_bad_arguments_are_refused():
    with pytest.raises(UsageError, match="count = 0"):
        nearly_conserved(ring(**XX), count=0)
    with pytest.raises(CapacityError, match="range 5"):
        nearly_conserved(ring(**XX), max_range=5)


def test_record_as_text():
    result = nearly_conserved(ring(**XX), max_range=2, count=2)
    assert "3 conserved, then" in str(result)
    assert result.to_dict()["values"] == result.values.tolist()
