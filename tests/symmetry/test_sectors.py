"""The sector law, the isometries and the transposition structure of blocks."""

import numpy as np
import pytest

from lbwork.generator import Lindbladian, vector_to_doubled
from lbwork.model import Jump, Term
from lbwork.symmetry import plan_sectors
from lbwork.symmetry.sector_basis import digits_of, numbers_of
from tests.symmetry.models import DRIVE, chain, random_unitary

X = np.array([[0, 1], [1, 0]], dtype=complex)
Z = np.diag([1, -1]).astype(complex)
TILT = random_unitary(11)

MODELS = {
    "hopping-dephasing-ring": chain("X X + Y Y", [Jump("Z", rate=0.5)]),
    "hopping-dephasing-odd-ring": chain("X X + Y Y", [Jump("Z", rate=0.5)], sites=3),
    "driven": chain("X X + Y Y + 0.5 Z Z", DRIVE, sites=3, boundary="open"),
    "transverse-field": chain("X X", [Jump("Z")], extra=[Term("Z", coefficient=0.7)]),
    "one-way-hopping": chain("", [Jump("S- S+")]),
    "staggered": chain("X X + Y Y", [Jump("Z")], extra=[Term("Z", coefficient="0.3*(-1)**j")]),
    "chiral": chain("X X + Y Y + 0.4 X Y - 0.4 Y X", [Jump("S-", rate=0.3)]),
    "tilted": chain(
        np.kron(TILT, TILT) @ np.kron(X, X) @ np.kron(TILT, TILT).conj().T,
        [Jump(TILT @ Z @ TILT.conj().T)],
        sites=3,
    ),
    "three-site": chain("X X + Y Y", [Jump("Z")], extra=[Term("X Z X", coefficient=0.3)]),
    "spin-one": chain(
        "Sx Sx + Sy Sy + Sz Sz", [Jump("Sz", rate=0.4)], sites=2, boundary="open", dimension=3
    ),
    "two-site-ring": chain("X X + Y Y + Z Z", [Jump("S- S+")], sites=2),
    "single-site": chain("", [Jump("S-"), Jump("Z")], sites=1, boundary="open"),
}


def doubled_matrix(model):
    matrix = Lindbladian(model).matrix().toarray()
    order = vector_to_doubled(np.arange(matrix.shape[0]), model.sites, model.local_dimension)
    return matrix[np.ix_(order, order)]


@pytest.mark.parametrize("name", MODELS)
def test_dimensions_add_up(name):
    plan = plan_sectors(MODELS[name])
    total = sum(sector.dimension * sector.multiplicity for sector in plan.sectors)
    assert total == MODELS[name].local_dimension ** (2 * MODELS[name].sites)


@pytest.mark.parametrize("name", MODELS)
def test_isometries_are_orthonormal_and_invariant(name):
    model = MODELS[name]
    generator = doubled_matrix(model)
    scale = max(np.linalg.norm(generator, 2), 1.0)
    plan = plan_sectors(model)
    for sector in plan.sectors:
        block = plan.block(sector)
        columns = block.isometry.toarray()
        assert np.abs(columns.conj().T @ columns - np.eye(sector.dimension)).max() < 1e-12
        defect = generator @ columns - columns @ block.matrix.toarray()
        assert np.abs(defect).max() < 1e-12 * scale
        assert block.matrix.dtype == (np.float64 if sector.self_conjugate else np.complex128)


@pytest.mark.parametrize("name", [name for name in MODELS if name not in ("spin-one", "tilted")])
def test_transposition_acts_as_announced(name):
    """``B X = X B^T`` with X unitary and symmetric or antisymmetric (definition of the class)."""
    model = MODELS[name]
    plan = plan_sectors(model)
    base = 4
    for sector in plan.sectors:
        if sector.transposition_map is None:
            assert sector.transposition == "none"
            continue
        block = plan.block(sector)
        states = np.arange(base**model.sites, dtype=np.uint64)
        image, signs = sector.transposition_map.apply(digits_of(states, model.sites, base))
        columns = block.isometry.toarray()
        moved = np.zeros_like(columns)
        moved[numbers_of(image, base).astype(int)] = signs[:, None] * columns.conj()
        exchange = columns.conj().T @ moved
        matrix = block.matrix.toarray()
        sign = 1 if sector.transposition == "symmetric" else -1
        assert np.allclose(exchange @ exchange.conj().T, np.eye(sector.dimension))
        assert np.allclose(matrix @ exchange, exchange @ matrix.T)
        assert np.allclose(exchange, sign * exchange.T)


def test_plan_is_the_same_every_time():
    labels = [sector.label for sector in plan_sectors(MODELS["hopping-dephasing-ring"]).sectors]
    again = [sector.label for sector in plan_sectors(MODELS["hopping-dephasing-ring"]).sectors]
    assert labels == again
