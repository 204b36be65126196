"""Matrix-free sector generators and their preconditioners against the generator itself."""

import numpy as np
import pytest
import scipy.linalg

from lbwork import Lindbladian, catalogue, find_symmetries
from lbwork.iterative import chain_equations, differences, part_generators, whole_space
from lbwork.iterative.action import LocalMap, SectorGenerator
from lbwork.iterative.effective import EffectiveResolvent, sylvester_triangular
from lbwork.iterative.gmres import gmres
from lbwork.iterative.hamiltonian import HamiltonianResolvent, energy_basis
from lbwork.model import Jump, Model, RandomOperator, Term
from tests.chains import driven_chain

RANDOM = np.random.default_rng(5)

EXCEPTIONAL = Model(
    name="exceptional",
    sites=4,
    parameters={"w": 0.5},
    hamiltonian=(Term("X", coefficient="w"),),
    jumps=(Jump("S-", rate="4*w"),),
)
"""Heff = w X - i w (1 + Z) on each site is defective: a site sits at its exceptional point."""


def _models():
    for entry in catalogue():
        model = entry.model()
        sites = {2: 4, 3: 3}[model.local_dimension] if model.sites > 1 else 1
        yield pytest.param(model.replace(sites=sites), id=entry.name)
    matrix = RANDOM.normal(size=(3, 3)) + 1j * RANDOM.normal(size=(3, 3))
    yield pytest.param(
        Model(
            name="spin one, jumps with a trace",
            sites=3,
            local_dimension=3,
            hamiltonian=(Term("Sz Sz + Sx Sx"),),
            jumps=(Jump(matrix.tolist(), on="first", rate=0.4), Jump("Sz", rate=0.3)),
        ),
        id="spin-one",
    )
    yield pytest.param(
        Model(
            name="random",
            sites=3,
            hamiltonian=(Term("X Y + 0.3 Z X + 0.3 X Z"),),
            jumps=(Jump(RandomOperator("ginibre", 2, 3), rate=0.5),),
        ),
        id="random-jump",
    )


def _rotation(report, sites, dimension):
    turn = np.eye(1)
    for site in range(sites):
        local = np.eye(dimension)
        if report.rotation is not None:
            local = report.rotation[site % len(report.rotation)]
        turn = np.kron(turn, local)
    return turn


def _vector(space):
    vector = RANDOM.normal(size=space.size)
    return vector if space.hermitian else vector + 1j * RANDOM.normal(size=space.size)


@pytest.mark.parametrize("model", list(_models()))
def test_sectors_reproduce_the_generator(model):
    report = find_symmetries(model)
    equations = chain_equations(model, report)
    generator = Lindbladian(model)
    turn = _rotation(report, model.sites, model.local_dimension)
    total = 0
    for gap in differences(equations.groups):
        space = whole_space(equations.groups, gap)
        vector = _vector(space)
        operator = turn @ space.to_matrix(vector) @ turn.conj().T
        expected = turn.conj().T @ generator.apply(operator) @ turn
        image = SectorGenerator(space, equations.form).apply(vector)
        assert np.allclose(space.to_matrix(image), expected, atol=1e-13 * generator.norm_bound)
        assert np.allclose(space.from_matrix(space.to_matrix(vector)), vector, atol=1e-14)
        mirror = tuple(equations.groups.reduced(-np.array(gap, dtype=int)).tolist())
        total += space.size * (1 if mirror == gap else 2)
    assert total == generator.dimension**2


@pytest.mark.parametrize("difference", [0, 1])
@pytest.mark.parametrize("complex_energy", [False, True])
def test_energy_resolvent_is_an_inverse(difference, complex_energy):
    """``(s + i ad_H) R x = x`` for real and complex H, in Hermitian and charged sectors."""
    extra = Term("X Y - Y X", coefficient=0.4) if complex_energy else Term("Z")
    model = Model(
        name="resolvent",
        sites=5,
        hamiltonian=(Term("X X + Y Y + 0.3 Z Z"), extra),
        jumps=(Jump("S-", on="first"), Jump("S+", on="last")),
    )
    equations = chain_equations(model)
    space = whole_space(equations.groups, (difference,))
    basis = energy_basis(equations.form.hamiltonian, space)
    vector = _vector(space)
    found = space.to_matrix(HamiltonianResolvent(space, basis, 0.7).apply(vector))
    energy = equations.form.hamiltonian
    back = 0.7 * found + 1j * (energy @ found - found @ energy.toarray())
    assert np.allclose(back, space.to_matrix(vector), atol=1e-12)


@pytest.mark.parametrize("difference", [0, 1])
def test_sylvester_resolvent_is_an_inverse(difference):
    equations = chain_equations(driven_chain(5, delta=0.8, bias=0.9, dephasing=0.1))
    space = whole_space(equations.groups, (difference,))
    resolvent = EffectiveResolvent(space, equations.form.no_jump, 1e-9)
    assert not resolvent.defective
    vector = _vector(space)
    found = space.to_matrix(resolvent.apply(vector))
    one = equations.form.no_jump.toarray()
    assert np.allclose(one @ found + found @ one.conj().T, space.to_matrix(vector), atol=1e-7)


def test_sylvester_resolvent_at_an_exceptional_point():
    """The Schur form takes over where the eigenvectors of Heff are useless."""
    equations = chain_equations(EXCEPTIONAL)
    space = whole_space(equations.groups)
    resolvent = EffectiveResolvent(space, equations.form.no_jump, 1e-9)
    assert resolvent.defective
    vector = _vector(space)
    found = space.to_matrix(resolvent.apply(vector))
    one = equations.form.no_jump.toarray()
    assert np.allclose(one @ found + found @ one.conj().T, space.to_matrix(vector), atol=1e-6)


@pytest.mark.parametrize("shape", [(5, 9), (130, 70), (60, 150)])
def test_triangular_sylvester_equation(shape):
    """Against scipy.linalg.solve_sylvester (LAPACK)."""
    left, right = (
        np.triu(RANDOM.normal(size=(n, n)) + 1j * RANDOM.normal(size=(n, n))) / n - 2 * np.eye(n)
        for n in shape
    )
    values = RANDOM.normal(size=shape) + 1j * RANDOM.normal(size=shape)
    expected = scipy.linalg.solve_sylvester(left, right.conj().T, values)
    assert np.allclose(sylvester_triangular(left, right, values), expected, atol=1e-11)


@pytest.mark.parametrize("precision", [np.float64, np.float32])
@pytest.mark.parametrize("restart", [7, 60])
def test_gmres_reaches_its_target(precision, restart):
    """Against numpy.linalg.solve; single-precision bases must not limit the answer."""
    matrix = np.eye(50) + 0.15 * RANDOM.normal(size=(50, 50)) / np.sqrt(50)
    right = RANDOM.normal(size=50)
    found = gmres(
        lambda x: (matrix @ x).astype(x.dtype),
        lambda x: x,
        right,
        target=1e-12,
        restart=restart,
        limit=200,
        precision=precision,
    )
    assert found.converged
    assert found.residual == pytest.approx(np.linalg.norm(right - matrix @ found.solution))
    assert np.allclose(found.solution, np.linalg.solve(matrix, right), atol=1e-11)


def test_gmres_says_when_it_stops_short():
    matrix = np.diag(np.linspace(1e-6, 1.0, 50))
    found = gmres(lambda x: matrix @ x, lambda x: x, np.ones(50), target=1e-12, restart=5, limit=10)
    assert not found.converged
    assert found.applies == 10


def test_local_maps_preserve_hermiticity_with_complex_entries():
    """A superoperator with complex entries on real vectors of Hermitian matrices."""
    equations = chain_equations(EXCEPTIONAL.replace(sites=3))
    space = whole_space(equations.groups)
    jump = RANDOM.normal(size=(4, 4)) + 1j * RANDOM.normal(size=(4, 4))
    tensor = np.einsum("ac,bd->abcd", jump, jump.conj())
    image = LocalMap(space, [((0, 2), tensor)], equations.form).apply(vector := _vector(space))
    whole = np.einsum("acbd,xy->axcbyd", jump.reshape(2, 2, 2, 2), np.eye(2)).reshape(8, 8)
    expected = whole @ space.to_matrix(vector) @ whole.conj().T
    assert np.allclose(space.to_matrix(image), expected, atol=1e-12)


def test_components_follow_the_jumps():
    """Bulk dephasing keeps the ket's charge: one part for each; a drive joins them."""
    kept = Model(name="kept", sites=4, hamiltonian=(Term("X X + Y Y"),), jumps=(Jump("Z"),))
    for model, parts in ((kept, 5), (driven_chain(4), 1)):
        equations = chain_equations(model)
        space = whole_space(equations.groups)
        assert len(part_generators(equations, space)) == parts
