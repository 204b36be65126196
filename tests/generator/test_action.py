"""The matrix-free action: its runs, its arguments, and chains long enough for every kernel path."""

import numpy as np
import pytest
import scipy.sparse as sparse

from lbwork.errors import CapacityError, ModelError, UsageError
from lbwork.generator import Lindbladian, tables
from lbwork.model import Jump, Model, Term, catalogue, load_model
from tests.generator.models import random_model


def random_matrix(seed, size):
    generator = np.random.default_rng(seed)
    return generator.normal(size=(size, size)) + 1j * generator.normal(size=(size, size))


CHAINS = {
    **{entry.name: entry.model().replace(sites=4) for entry in catalogue()},
    "complex terms on a ring": random_model(21, sites=5, boundary="periodic", ranges=(1, 2, 3)),
    "spin one": random_model(22, sites=4, dimension=3),
    "complex diagonal jump": Model(
        "a", 5, hamiltonian=(Term("X Y"),), jumps=(Jump([[1, 0], [0, "1j"]]), Jump("S+ S-"))
    ),
}


@pytest.mark.parametrize("name", CHAINS)
def test_action_and_adjoint_equal_the_sparse_matrix(name):
    generator = Lindbladian(CHAINS[name])
    matrix = generator.matrix()
    rho, operator = (random_matrix(seed, generator.dimension) for seed in (1, 2))
    image, dual = generator.apply(rho), generator.apply_adjoint(operator)
    scale = generator.norm_bound * np.linalg.norm(rho)
    assert np.linalg.norm(image.ravel() - matrix @ rho.ravel()) < 1e-13 * scale
    assert np.linalg.norm(dual.ravel() - matrix.conj().T @ operator.ravel()) < 1e-13 * scale
    # <X, L rho> = <L^dag X, rho> without any matrix.
    difference = np.vdot(operator, image) - np.vdot(dual, rho)
    assert abs(difference) < 1e-13 * scale * np.linalg.norm(operator)


def test_runs_contain_every_entry_once():
    generator = np.random.default_rng(3)
    values = generator.integers(0, 3, size=(3, 24, 24)) * (1 + 1j)
    runs = tables.runs_of([sparse.csr_matrix(item) for item in values], np.complex128)
    for bounds, expected in zip(runs.bounds, values, strict=True):
        begin, longer, end = bounds
        found = np.zeros((24, 24), dtype=complex)
        for run in range(begin, end):
            row, column, length = runs.places[run].astype(int) // 2
            assert (length == 1) == (run < longer)
            steps = np.arange(length)
            found[row + steps, column + steps] += runs.values[run]
        assert np.array_equal(found, expected)


def test_a_bond_makes_long_runs():
    """An exchange on the first bond of 6 spins moves pieces of 2**4 states as they are."""
    model = Model("a", 6, hamiltonian=(Term("X X + Y Y", on=1),))
    runs = Lindbladian(model)._forward.part_runs
    assert runs.places[:, 2].tolist() == [32, 32]


def test_any_numeric_array_is_taken():
    generator = Lindbladian(load_model("xx-dephasing", sites=3))
    rho = random_matrix(4, 8)
    expected = generator.apply(rho)
    wide = np.zeros((8, 16), dtype=complex)
    wide[:, ::2] = rho
    before = wide.copy()
    for same in (np.asfortranarray(rho), wide[:, ::2], rho.tolist()):
        assert np.array_equal(generator.apply(same), expected)
    assert np.array_equal(wide, before)
    real = np.arange(64).reshape(8, 8)
    assert np.array_equal(generator.apply(real), generator.apply(real.astype(complex)))


def test_result_goes_into_the_given_array():
    generator = Lindbladian(load_model("xxz-driven", sites=3))
    rho, out = random_matrix(5, 8), np.full((8, 8), np.nan, dtype=complex)
    assert generator.apply(rho, out) is out
    assert np.array_equal(out, generator.apply(rho))
    assert generator.apply_adjoint(rho, out) is out
    assert np.array_equal(out, generator.apply_adjoint(rho))


@pytest.mark.parametrize("verb", ["apply", "apply_adjoint"])
def test_arrays_that_cannot_take_the_result_are_refused(verb):
    action = getattr(Lindbladian(load_model("xx-dephasing", sites=3)), verb)
    rho = random_matrix(6, 8)
    kept = rho.copy()
    locked = np.zeros((8, 8), dtype=complex)
    locked.flags.writeable = False
    unfit = (
        np.zeros((4, 4), dtype=complex),
        np.zeros((8, 8)),
        np.zeros((8, 8), dtype=np.complex64),
        np.zeros((8, 8), dtype=complex, order="F"),
        locked,
    )
    for out in unfit:
        with pytest.raises(UsageError, match="C-contiguous complex128"):
            action(rho, out)
    for out in (rho, np.asarray(rho)[:]):
        with pytest.raises(UsageError, match="shares memory"):
            action(rho, out)
    assert np.array_equal(rho, kept)


def test_parts_refuse_wrong_shapes():
    generator = Lindbladian(load_model("xx-driven", sites=2))
    for action in (generator.jump_part, generator.no_jump_part, generator.apply_adjoint):
        with pytest.raises(ModelError, match="shape"):
            action(np.eye(3))


def test_nan_is_not_hidden():
    generator = Lindbladian(load_model("xx-dephasing", sites=3))
    rho = np.eye(8, dtype=complex)
    rho[0, 0] = np.nan
    assert np.isnan(generator.apply(rho)[0, 0])


def test_tables_that_do_not_fit_are_refused(monkeypatch):
    generator = Lindbladian(load_model("xx-dephasing", sites=4))
    monkeypatch.setattr(tables, "usable_memory", lambda: 1000)
    with pytest.raises(CapacityError, match="diagonal jumps"):
        generator.apply(np.eye(16))


@pytest.mark.parametrize("name", ["xx-dephasing", "xxz-driven", "xxx-loss"])
def test_tables_stay_below_one_density_matrix(name):
    """Together with the result an application adds less than two vectors of the full space."""
    generator = Lindbladian(load_model(name, sites=9))
    assert generator.action_bytes < 16 * generator.dimension**2
