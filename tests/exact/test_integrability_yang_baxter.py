"""R-matrices of published chains pass every relation; with one entry off by 1e-6 they fail by that.

Six and eight vertices: R. Baxter, Ann. Phys. 70, 193 (1972); Hubbard: B. Shastry, J. Stat. Phys.
50, 57 (1988), with the imaginary coupling of M. Medvedyeva, F. Essler, T. Prosen, Phys. Rev. Lett.
117, 137202 (2016). Weights from memory, confirmed by the relations themselves.
"""

import numpy as np
import pytest
from scipy.special import ellipj, ellipk

from lbwork.errors import ExpressionError, ModelError, NotCertifiedError, UsageError
from lbwork.integrability import (
    RMatrix,
    hamiltonian_density,
    load_r_matrix,
    local_density,
    r_matrix_from_toml,
    yang_baxter_residual,
)
from lbwork.integrability.r_matrix import permutation
from tests.integrability_chains import ring, spin_one_ring


def vertices(a, b, c, d=0.0):
    return np.array([[a, 0, 0, d], [0, b, c, 0], [0, c, b, 0], [d, 0, 0, a]], dtype=complex)


def rational(dimension):
    swap = permutation(dimension)
    return lambda u, v: (u - v) * np.eye(dimension**2) + swap


ETA = 0.7


def six_vertex(u, v):
    x = u - v
    return vertices(np.sinh(x + ETA), np.sinh(x), np.sinh(ETA))


def elliptic_sine(z, parameter):
    """sn(x + i y) by the addition theorem, from real arguments."""
    s, c, d, _ = ellipj(z.real, parameter)
    s1, c1, d1, _ = ellipj(z.imag, 1 - parameter)
    return (s * d1 + 1j * c * d * s1 * c1) / (c1**2 + parameter * s**2 * s1**2)


def eight_vertex(eta, parameter):
    root, base = np.sqrt(parameter), elliptic_sine(complex(eta), parameter)

    def function(u, v):
        x = complex(u - v)
        a, b = elliptic_sine(x + eta, parameter), elliptic_sine(x, parameter)
        return vertices(a, b, base, root * base * b * a)

    return function


def free_six_vertex(x):
    """Weights of the XX chain: a = cos x, b = sin x, c = 1."""
    return vertices(np.cos(x), np.sin(x), 1.0)


def doubled(ket, bra):
    """Operators on two kets and on two bras as one on two doubled sites (a1 b1 a2 b2)."""
    tensor = np.kron(ket, bra).reshape((2,) * 8).transpose(0, 2, 1, 3, 4, 6, 5, 7)
    return tensor.reshape(16, 16)


def dephased(rate):
    """R-matrix of XX with dephasing: ket with parameter u, bra with -u, coupling i * rate.

    The function l with ``sinh 2l = (i rate/2) sin 2u`` is on its principal branch at the points
    used here.
    """
    z = np.kron(np.diag([1.0, -1.0]), np.eye(2))

    def shift(u):
        return 0.5 * np.arcsinh(0.5j * rate * np.sin(2 * u))

    def function(u, v):
        minus, plus = u - v, u + v
        difference = shift(u) - shift(v)
        first = doubled(free_six_vertex(minus), free_six_vertex(-minus))
        second = doubled(free_six_vertex(plus) @ z, free_six_vertex(-plus) @ z)
        weight = np.cos(plus) * np.cosh(difference)
        return weight * first + np.cos(minus) * np.sinh(difference) * second

    return function


CASES = {
    "XXX": (rational(2), hamiltonian_density(ring(jx=1.0, jy=1.0, jz=1.0))),
    "SU(3)": (rational(3), hamiltonian_density(spin_one_ring(1.0, 1.0))),
    "permutation jump": (rational(4), local_density(ring(permutation=1.0))),
    "XXZ": (six_vertex, hamiltonian_density(ring(jx=1.0, jy=1.0, jz=np.cosh(ETA)))),
    "XX": (lambda u, v: free_six_vertex(u - v), hamiltonian_density(ring(jx=1.0, jy=1.0))),
    "XX + dephasing": (dephased(0.5), local_density(ring(jx=1.0, jy=1.0, dephasing=0.5))),
}


def xyz_couplings(eta, parameter):
    """Jx : Jy : Jz of the eight-vertex weights (R. Baxter (1972))."""
    s, c, d, _ = ellipj(eta, parameter)
    product = np.sqrt(parameter) * s**2
    return 1 + product, 1 - product, c * d


def cases():
    yield from CASES.items()
    for name, eta in (("XYZ", 0.5), ("free-fermion XY", float(ellipk(0.36)))):
        jx, jy, jz = xyz_couplings(eta, 0.36)
        model = ring(jx=jx, jy=jy, jz=round(jz, 14))
        yield name, (eight_vertex(eta, 0.36), hamiltonian_density(model))


ALL = dict(cases())


@pytest.mark.parametrize("name", ALL)
def test_published_r_matrices_pass(name):
    function, density = ALL[name]
    report = yang_baxter_residual(function, density, spread=0.12, points=2)
    assert report.passed, report.sentence
    assert max(relation.residual for relation in report.relations) < 1e-11
    assert not report.mirrored
    if name == "XX + dephasing":
        # The generator is -2i times the density of the weights.
        assert report.factor == pytest.approx(0.5j)


@pytest.mark.parametrize("name", ALL)
def test_one_wrong_entry_is_seen(name):
    function, density = ALL[name]
    size = density.dimension**2
    wrong = np.zeros((size, size))
    wrong[1, 1] = 1e-6
    report = yang_baxter_residual(
        lambda u, v: function(u, v) + wrong, density, spread=0.12, points=2
    )
    assert not report.passed
    assert 1e-8 < report.residual("Yang-Baxter") < 1e-4
    assert "Yang-Baxter fails by" in report.sentence


def test_wrong_density_is_told_apart_from_wrong_r_matrix():
    density = hamiltonian_density(ring(jx=1.0, jy=1.0, jz=0.2))
    report = yang_baxter_residual(six_vertex, density)
    assert report.residual("Yang-Baxter") < 1e-12
    assert report.residual("density of the model") > 0.1
    assert report.sentence.startswith("density of the model fails")


def test_density_is_compared_up_to_factor_shift_and_telescoping_parts():
    generator = np.random.default_rng(2)
    part = generator.normal(size=(2, 2))
    one = np.eye(2)
    matrix = -3.0 * permutation(2) + 5 * np.eye(4) + np.kron(part, one) - np.kron(one, part)
    report = yang_baxter_residual(rational(2), local_density(matrix))
    assert report.passed
    assert report.factor == pytest.approx(-1 / 3)


def test_mirrored_densities_are_recognised():
    """Unequal weights b tell left from right: a Dzyaloshinskii-Moriya coupling in the density."""

    def twisted(u, v):
        matrix = six_vertex(u, v)
        matrix[1, 1] *= 1.5
        matrix[2, 2] /= 1.5
        return matrix

    swap = permutation(2)
    own = swap @ RMatrix(twisted, 2).derivative(0, 0, 0)
    report = yang_baxter_residual(twisted, own)
    assert report.passed and not report.mirrored
    report = yang_baxter_residual(twisted, swap @ own @ swap)
    assert report.passed and report.mirrored
    assert "left and right exchanged" in report.sentence


def test_braid_form_is_recognised():
    with pytest.raises(UsageError, match="braid form"):
        yang_baxter_residual(lambda u, v: permutation(2) @ six_vertex(u, v))
    with pytest.raises(UsageError, match="no part along the permutation"):
        yang_baxter_residual(lambda u, v: np.diag([1.0, 2.0, 3.0, -1.0]))


def test_derivative_refuses_functions_that_are_not_analytic():
    with pytest.raises(NotCertifiedError, match="not analytic"):
        yang_baxter_residual(lambda u, v: np.conj(u - v) ** 2 * np.eye(4) + permutation(2))


def test_derivatives_are_exact():
    r_matrix = RMatrix(six_vertex, 2)
    expected = vertices(np.cosh(0.3 + ETA), np.cosh(0.3), 0.0)
    assert np.abs(r_matrix.derivative(0.5, 0.2, 0) - expected).max() < 1e-12
    assert np.abs(r_matrix.derivative(0.5, 0.2, 1) + expected).max() < 1e-12


FILE = """
name = "six vertices"
dimension = 2

[parameters]
eta = 0.7

[definitions]
x = "u - v"
a = "sinh(x + eta)"
b = "sinh(x)"

[entries]
"1, 1" = "a"
"4, 4" = "a"
"2, 2" = "b"
"3, 3" = "b"
"2, 3" = "sinh(eta)"
"3, 2" = "sinh(eta)"
"""


def test_files_of_expressions(tmp_path):
    path = tmp_path / "six.toml"
    path.write_text(FILE)
    r_matrix = load_r_matrix(path)
    assert np.abs(r_matrix(0.4, 0.1 + 0.2j) - six_vertex(0.4, 0.1 + 0.2j)).max() < 1e-14
    assert yang_baxter_residual(r_matrix, CASES["XXZ"][1]).passed
    other = load_r_matrix(path, eta=0.2j)
    assert other(0.4, 0.1)[0, 0] == pytest.approx(np.sinh(0.3 + 0.2j))


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('"4, 4"', '"5, 4"', "outside of 1..4"),
        ('"4, 4"', '"4"', "no place"),
        ("dimension = 2", "dimension = 1", "dimension = 1"),
        ("[definitions]", "[definition]", "definitions"),
        ('x = "u - v"', 'u = "v"', "spectral parameter"),
        ('"a"', '"__import__(1)"', "."),
        ("sinh(x)", "sinh(y)", "'y'"),
        ('"2, 2" = "b"', '"2, 2" = [1]', "neither a number"),
        ("[parameters]\neta = 0.7", "parameters = 3", "not a table"),
    ],
)
def test_bad_files_are_refused(old, new, message):
    with pytest.raises((ExpressionError, ModelError), match=message):
        r_matrix_from_toml(FILE.replace(old, new, 1))(0.1, 0.2)


def test_unknown_parameters_are_refused():
    with pytest.raises(ExpressionError, match="eta"):
        r_matrix_from_toml(FILE, etta=1.0)
    with pytest.raises(ExpressionError, match="no entries"):
        r_matrix_from_toml("dimension = 2")


def test_bad_arguments_are_refused():
    with pytest.raises(UsageError, match="points = 0"):
        yang_baxter_residual(six_vertex, points=0)
    with pytest.raises(UsageError, match="states per site"):
        yang_baxter_residual(six_vertex, local_density(ring(permutation=1.0)))
    with pytest.raises(UsageError, match="shape"):
        yang_baxter_residual(RMatrix(lambda u, v: np.eye(3), 2))
    with pytest.raises(UsageError, match="not finite"):
        yang_baxter_residual(RMatrix(lambda u, v: np.full((4, 4), np.nan), 2))
    with pytest.raises(UsageError, match="no relation 'crossing'"):
        yang_baxter_residual(six_vertex).residual("crossing")


def test_record_as_text_and_document():
    report = yang_baxter_residual(six_vertex, CASES["XXZ"][1])
    assert "Sutherland in u" in str(report) and "<table>" in report._repr_html_()
    assert report.to_dict()["passed"] is True
