"""Scalar and operator expressions against numbers and matrices written out by hand."""

import math
import operator as operators

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from lbwork.errors import ExpressionError
from lbwork.model import Jump, Model, local_operator
from lbwork.model.expressions import evaluate

X, Y, Z = (local_operator(name, 2) for name in "XYZ")
ONE = np.eye(2)


def value(text, **names):
    return evaluate(text, {key: complex(number) for key, number in names.items()}, place="here")


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("1 + 2*3", 7),
        ("(1 + 2)*3", 9),
        ("8/4/2", 1),
        ("2 - 3 - 4", -5),
        ("-2**2", -4),
        ("2^-1", 0.5),
        ("1e3 + .5 + 2.", 1002.5),
        ("1e-3j", 0.001j),
        ("(1 + 1j)*(1 - 1j)", 2),
        ("2 a", 6),
        ("1/2 a", 1.5),
        ("a (1 + a)", 12),
        ("(-1)^a", -1),
        ("exp(1j*pi)", -1),
        ("log(e)", 1),
        ("sqrt(-4)", 2j),
        ("sin(pi/6) + cos(pi/3) + tan(pi/4)", 2),
        ("cosh(1)^2 - sinh(1)^2", 1),
        ("tanh(0)", 0),
        ("abs(3 + 4j)", 5),
        ("conj(1 + 2j)", 1 - 2j),
        ("real(1 + 2j) - imag(1 + 2j)", -1),
        ("\t1\n + 1 ", 2),
    ],
)
def test_scalar_expressions(text, expected):
    assert value(text, a=3) == pytest.approx(expected, abs=1e-15)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("2 X", 2 * X),
        ("-X + Z", Z - X),
        ("0.5*(X + 1j*Y)", local_operator("S+", 2)),
        ("S+", (X + 1j * Y) / 2),
        ("S+ + S-", X),
        ("S++S-", X),
        ("Sx^2", 0.25 * ONE),
        ("X.Y", 1j * Z),
        ("X.Y.Z", 1j * ONE),
        ("exp(1j*pi/2) I", 1j * ONE),
        ("E01", np.array([[0, 1], [0, 0]])),
        ("2 E01", np.array([[0, 2], [0, 0]])),
        ("P1", np.diag([0, 1])),
        ("n", np.diag([1, 0])),
        ("X/2 - X/4", X / 4),
        ("sqrt(2)**2 Z", 2 * Z),
        ("Z^0", ONE),
    ],
)
def test_one_site_expressions(text, expected):
    model = Model("a", 1, jumps=(Jump(text), Jump("Z")))
    assert np.allclose(model.placed_jumps()[0].matrix, expected)


def operator(text, dimension=2, **names):
    numbers = {key: complex(number) for key, number in names.items()}
    return evaluate(text, numbers, place="here", dimension=dimension)


def test_juxtaposition_is_the_next_site():
    assert np.array_equal(operator("X Y").matrix, np.kron(X, Y))
    assert np.array_equal(operator("X Y Z").matrix, np.kron(np.kron(X, Y), Z))
    assert np.allclose(operator("(X + Y) Z").matrix, np.kron(X + Y, Z))
    assert np.allclose(operator("X X.Y").matrix, np.kron(X, X @ Y))
    assert operator("X I Z").count == 3


def test_phases_in_hopping():
    raising, lowering = local_operator("S+", 2), local_operator("S-", 2)
    found = operator("exp(1j*phi) S+ S- + exp(-1j*phi) S- S+", phi=0.3).matrix
    expected = np.exp(0.3j) * np.kron(raising, lowering)
    assert np.allclose(found, expected + expected.conj().T)


def test_biquadratic_coupling_of_spins_one():
    """(S.S)^2 has eigenvalues 4, 1, 1 on total spin 0, 1, 2, of dimensions 1, 3, 5."""
    found = operator("(Sx Sx + Sy Sy + Sz Sz)^2", dimension=3)
    assert np.allclose(np.linalg.eigvalsh(found.matrix), [1] * 8 + [4])
    bilinear = operator("Sx Sx + Sy Sy + Sz Sz", dimension=3).matrix
    assert np.allclose(found.matrix, bilinear @ bilinear)


def test_exchange_of_neighbours():
    swap = operator("0.5 (I I + X X + Y Y + Z Z)").matrix
    assert np.allclose(swap, np.eye(4)[[0, 2, 1, 3]])


@pytest.mark.parametrize(
    ("text", "word"),
    [
        ("__import__('os')", "not allowed"),
        ("a.b", "not a known"),
        ("a if a else a", "not a known"),
        ("a; a", "not allowed"),
        ("a == a", "not allowed"),
        ("lambda: a", "not allowed"),
        ("2a", "run together"),
        ("1E5", "run together"),
        ("0.5 0.3", "write \\*"),
        ("a 2", "write \\*"),
        ("exp", "write exp"),
        ("exp()", "unexpected"),
        ("random(1)", "2 argument"),
        ("random(1j, 1)", "real"),
        ("1/(a - a)", "division by zero"),
        ("1e308*1e308", "infinite"),
        ("1e-320/1e300/0", "zero"),
        ("10^400", "infinite"),
        ("0^-1", "infinite"),
        ("log(0)", "no finite value"),
        ("aa", "did you mean 'a'"),
        ("cso(1)", "did you mean 'cos'"),
        ("\u0663", "not allowed"),
    ],
)
def test_refused_scalars(text, word):
    with pytest.raises(ExpressionError, match=word) as caught:
        value(text, a=2)
    assert str(caught.value).startswith("here: ")


def test_depth_and_length_are_bounded_but_not_tight():
    assert value("(" * 30 + "1" + ")" * 30) == 1
    assert value("+".join(["1"] * 1000)) == 1000
    with pytest.raises(ExpressionError, match="deeper"):
        value("(" * 500 + "1" + ")" * 500)
    with pytest.raises(ExpressionError, match="deeper"):
        value("exp(" * 60 + "1" + ")" * 60)
    with pytest.raises(ExpressionError, match="longer"):
        value("1+" * 1000 + "1")


@given(st.integers(0, 10**15), st.integers(1, 256))
def test_random_numbers_are_fixed_and_bounded(seed, place):
    first = value(f"random({seed}, j)", j=place)
    assert first == value(f"random({seed}.0, {place})")
    assert -1 <= first.real <= 1
    assert first.imag == 0
    assert first != value(f"random({seed + 1}, j)", j=place)
    assert first != value(f"random({seed}, j + 1)", j=place)


def test_random_numbers_are_uniform():
    """Mean 0 and variance 1/3 of the uniform law on [-1, 1], within 5 standard errors."""
    numbers = np.array([value("random(7, j)", j=place).real for place in range(4000)])
    assert abs(numbers.mean()) < 5 * math.sqrt(1 / 3 / 4000)
    assert abs(numbers.var() - 1 / 3) < 5 * math.sqrt(4 / 45 / 4000)


ATOMS = {"a": 3, "2": 2, "0.5": 0.5, "1j": 1j, "(-3)": -3}
OPERATIONS = {"+": operators.add, "-": operators.sub, "*": operators.mul}


def joined(parts):
    (left, first), sign, (right, second) = parts
    return f"({left} {sign} {right})", OPERATIONS[sign](first, second)


@given(
    st.recursive(
        st.sampled_from(sorted(ATOMS.items())),
        lambda inner: st.tuples(inner, st.sampled_from(sorted(OPERATIONS)), inner).map(joined),
        max_leaves=12,
    )
)
def test_arithmetic(pair):
    text, expected = pair
    assert value(text, a=3) == pytest.approx(expected, rel=1e-12, abs=1e-12)
