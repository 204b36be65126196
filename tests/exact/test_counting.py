"""Counting statistics: published cumulants, dense tilted generators, one current counted twice."""

import numpy as np
import pytest

from lbwork import load_model, steady_state
from lbwork.counting import counting_statistics
from lbwork.errors import ModelError, NotCertifiedError, UsageError
from lbwork.exact import symmetric_cumulants, unit_rate_cumulants
from lbwork.model import Jump, Model, Term
from tests.chains import driven_chain, embed, kronecker_generator, open_exclusion


def _reservoirs(sites, left, right):
    return Model(
        name="reservoirs",
        sites=sites,
        jumps=(
            Jump("S+", on="first", rate=left),
            Jump("S-", on="first", rate=1 - left),
            Jump("S+ S-"),
            Jump("S- S+"),
            Jump("S+", on="last", rate=right),
            Jump("S-", on="last", rate=1 - right),
        ),
    )


@pytest.mark.parametrize(
    ("sites", "left", "right", "table"),
    [
        (2, 1, 0, [1 / 3, 0.14814815, 0.04938272, 0.01508916]),
        (3, 1, 0, [0.25, 0.10416667, 0.03125, 0.00390625]),
        (4, 1, 0, [0.2, 0.08, 0.0224, 0.00176]),
        (2, 0.7, 0.2, [0.16666667, 0.16037037, 0.02839506, 0.01979493]),
        (4, 0.7, 0.2, [0.1, 0.094, 0.0112, 0.006958]),
        (6, 0.7, 0.2, None),
    ],
)
def test_symmetric_exclusion(sites, left, right, table):
    """B. Derrida, B. Doucot, P.-E. Roche, J. Stat. Phys. 115, 717 (2004); tabulated values."""
    found = counting_statistics(_reservoirs(sites, left, right), jumps={1: 1, 2: -1})
    exact = symmetric_cumulants(sites, left, right)
    assert np.abs(found.cumulants - np.array(exact, dtype=float)).max() < 1e-10
    if table is not None:
        assert np.abs(found.cumulants - table).max() < 2e-8


@pytest.mark.parametrize("sites", [2, 4])
def test_totally_asymmetric_exclusion(sites):
    """A. Lazarescu, K. Mallick, Phys. Rev. Lett. 106, 180601 (2011)."""
    found = counting_statistics(open_exclusion(sites, 1.0, 1.0), jumps={2: 1})
    exact = [float(value) for value in unit_rate_cumulants(sites)]
    assert np.abs(found.cumulants - exact).max() < 1e-10


def test_every_bond_and_both_ends_count_the_same():
    """Charge cannot pile up: one set of cumulants, for coherent transport as well."""
    model = driven_chain(7, delta=0.6, drive=1.4, bias=0.5, dephasing=0.1)
    ends = counting_statistics(model, jumps={1: 2, 2: -2})
    assert (
        np.abs(counting_statistics(model, jumps={3: -2, 4: 2}).cumulants - ends.cumulants).max()
        < 1e-9
    )
    current = steady_state(model).spin_current
    for bond in (1, 4):
        found = counting_statistics(model, bond=bond)
        assert np.abs(found.cumulants - ends.cumulants).max() < 1e-9
        assert found.mean_difference < 1e-10
        assert found.cumulants[0] == pytest.approx(current[bond - 1], abs=1e-9)


def test_growth_rate_is_the_leading_level_of_the_tilted_generator():
    """Against all levels of the dense tilted generator (Kronecker products, LAPACK), and against
    the cumulants by a series in the field."""
    model = driven_chain(3, delta=0.6, drive=1.4, bias=0.5)
    fields = (-1.0, -0.3, 0.01, 0.4, 1.2)
    found = counting_statistics(model, jumps={1: 1, 2: -1}, fields=fields)
    for field, value in zip(fields, found.growth.values, strict=True):
        tilted = kronecker_generator(model)
        for jump in model.placed_jumps():
            weight = {1: 1, 2: -1}.get(jump.number, 0)
            operator = embed(jump.matrix, jump.sites, 3, 2)
            tilted += jump.rate * np.expm1(field * weight) * np.kron(operator, operator.conj())
        levels = np.linalg.eigvals(tilted)
        assert value == pytest.approx(levels.real.max(), abs=1e-9)
    small = fields[2]
    series = sum(
        cumulant * small**order / np.prod(range(1, order + 1))
        for order, cumulant in enumerate(found.cumulants, start=1)
    )
    assert found.growth.values[2] == pytest.approx(series, abs=1e-10)
    assert np.all(found.growth.smallest > -1e-10)


def test_growth_rates_on_a_longer_chain():
    """The symmetry of driven chains under reversal: theta(chi) = theta(-chi - affinity) for a
    single-site drive (J. L. Lebowitz, H. Spohn, J. Stat. Phys. 95, 333 (1999); from memory)."""
    left, right = 0.8, 0.3
    affinity = np.log(left * (1 - right) / ((1 - left) * right))
    model = _reservoirs(6, left, right)
    fields = (0.4, -0.4 - affinity)
    found = counting_statistics(model, jumps={1: 1, 2: -1}, fields=fields)
    assert found.growth.values[0] == pytest.approx(found.growth.values[1], abs=1e-8)


def test_spin_one_and_a_range_three_bond():
    """Any local dimension, terms that straddle several bonds."""
    model = Model(
        name="spin one",
        sites=3,
        local_dimension=3,
        hamiltonian=(Term("Sx Sx + Sy Sy + 0.4 Sz Sz"), Term("Sx Sz Sx + Sy Sz Sy")),
        jumps=(
            Jump("S+", on="first", rate=0.5),
            Jump("S-", on="first", rate=0.2),
            Jump("S-", on="last", rate=0.4),
        ),
    )
    one, two = (counting_statistics(model, bond=bond) for bond in (1, 2))
    ends = counting_statistics(model, jumps={3: 2})
    assert np.abs(one.cumulants - ends.cumulants).max() < 1e-9
    assert np.abs(two.cumulants - ends.cumulants).max() < 1e-9
    assert one.mean_difference < 1e-10


def test_single_site_by_hand():
    """One site filled at rate a and emptied at rate b: c1 = ab/(a+b), c2 = ab(a^2+b^2)/(a+b)^3."""
    fill, empty = 0.7, 0.4
    model = Model(name="dot", sites=1, jumps=(Jump("S+", rate=fill), Jump("S-", rate=empty)))
    found = counting_statistics(model, jumps={2: 1})
    total = fill + empty
    assert found.cumulants[0] == pytest.approx(fill * empty / total, abs=1e-12)
    expected = fill * empty * (fill**2 + empty**2) / total**3
    assert found.cumulants[1] == pytest.approx(expected, abs=1e-12)
    assert found.fano_factor == pytest.approx((fill**2 + empty**2) / total**2)


def test_refusals():
    model = driven_chain(3)
    with pytest.raises(UsageError, match="either jumps or a bond"):
        counting_statistics(model)
    with pytest.raises(UsageError, match="jump 7 is not one of the 5"):
        counting_statistics(model, jumps={7: 1})
    with pytest.raises(UsageError, match="bond 3"):
        counting_statistics(model, bond=3)
    with pytest.raises(UsageError, match="nothing is counted"):
        counting_statistics(model, jumps={1: 0})
    with pytest.raises(ModelError, match="is a ring"):
        counting_statistics(load_model("xx-dephasing", sites=4), bond=1)
    with pytest.raises(NotCertifiedError, match="steady states"):
        counting_statistics(load_model("xx-dephasing", sites=4), jumps={1: 1})
