"""Identities of the Smith normal form used to find charges."""

import itertools

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from lbwork.symmetry.integer_lattice import quotient_group


@given(hnp.arrays(np.int64, (4, 3), elements=st.integers(-3, 3)))
def test_relations_are_zero_in_the_quotient(rows):
    group = quotient_group(rows)
    labels = rows @ group.transform
    for column, modulus in enumerate(group.moduli):
        values = labels[:, column] % modulus if modulus else labels[:, column]
        assert not values.any()


@given(hnp.arrays(np.int64, (3, 3), elements=st.integers(-3, 3)))
def test_order_of_a_finite_quotient_is_the_determinant(rows):
    determinant = round(abs(np.linalg.det(rows)))
    group = quotient_group(rows)
    if determinant == 0:
        assert 0 in group.moduli
    else:
        assert int(np.prod(group.moduli, initial=1)) == determinant


@pytest.mark.parametrize(
    ("rows", "moduli"),
    [
        (np.zeros((0, 2), dtype=np.int64), (0, 0)),
        (np.zeros((2, 2), dtype=np.int64), (0, 0)),
        (np.eye(3, dtype=np.int64), ()),
        (np.array([[2, 0], [0, 3]]), (2, 3)),
        (np.array([[1, 1], [1, 1]]), (0,)),
        (np.array([[4]]), (4,)),
    ],
)
def test_corner_matrices(rows, moduli):
    assert sorted(quotient_group(rows).moduli) == sorted(moduli)


def test_labels_separate_the_cosets():
    rows = np.array([[2, 1], [0, 3]])
    group = quotient_group(rows)
    points = np.array(list(itertools.product(range(6), range(6))))
    labels = points @ group.transform % np.array(group.moduli)
    assert len({tuple(label) for label in labels}) == 6
