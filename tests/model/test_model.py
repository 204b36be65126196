"""Models: terms are what they say, stand where they are put, and nothing changes afterwards."""

import copy
import pickle

import numpy as np
import pytest

from lbwork.errors import ModelError
from lbwork.model import (
    Jump,
    Model,
    RandomOperator,
    Term,
    load_model,
    local_operator,
)

X, Y, Z = (local_operator(name, 2) for name in "XYZ")
ONE = np.eye(2)


def total_hamiltonian(model):
    """Plain Kronecker products, for short open or periodic chains."""
    dimension, sites = model.local_dimension, model.sites
    total = np.zeros((dimension**sites,) * 2, dtype=complex)
    for placed in model.placed_hamiltonian():
        rest = [site for site in range(sites) if site not in placed.sites]
        full = np.kron(placed.matrix, np.eye(dimension ** len(rest)))
        back = np.argsort([*placed.sites, *rest])
        tensor = full.reshape((dimension,) * (2 * sites))
        total += tensor.transpose([*back, *(sites + back)]).reshape(total.shape)
    return total


def test_expression_is_the_kronecker_sum():
    model = Model("a", 2, parameters={"delta": 0.7}, hamiltonian=(Term("X X + Y Y + delta Z Z"),))
    expected = np.kron(X, X) + np.kron(Y, Y) + 0.7 * np.kron(Z, Z)
    assert np.allclose(total_hamiltonian(model), expected)


def test_disorder_is_a_function_of_its_address():
    term = Term("Z", coefficient="0.5*random(3, j)")
    long = Model("a", 6, hamiltonian=(term,)).placed_hamiltonian()
    short = Model("a", 4, hamiltonian=(term,)).placed_hamiltonian()
    assert all(np.array_equal(a.matrix, b.matrix) for a, b in zip(long, short, strict=False))
    values = [placed.matrix[0, 0].real for placed in long]
    assert len(set(values)) == 6
    assert all(abs(value) <= 0.5 for value in values)


def test_ring_wraps_and_open_chain_does_not():
    ring = Model("a", 4, boundary="periodic", hamiltonian=(Term("X I X"),))
    assert [placed.sites for placed in ring.placed_hamiltonian()][-2:] == [(2, 3, 0), (3, 0, 1)]
    chain = Model("a", 4, hamiltonian=(Term("X I X"),))
    assert [placed.sites for placed in chain.placed_hamiltonian()] == [(0, 1, 2), (1, 2, 3)]


def test_first_last_and_listed_places():
    model = Model(
        "a",
        4,
        hamiltonian=(Term("X X", on="last"), Term("X X", on="first"), Term("X X", on=[2])),
    )
    assert [placed.sites for placed in model.placed_hamiltonian()] == [(2, 3), (0, 1), (1, 2)]


def test_replace_reevaluates_expressions():
    model = load_model("xxz-dephasing", delta=0.25, sites=5)
    assert model.sites == 5
    assert model.parameters["delta"] == 0.25
    bond = model.placed_hamiltonian()[0].matrix
    assert bond[0, 0].real == 0.25


def test_hermitian_sum_of_non_hermitian_terms_is_legal():
    model = Model("a", 3, hamiltonian=(Term("S+ S-"), Term("S- S+")))
    assert np.allclose(total_hamiltonian(model), total_hamiltonian(model).conj().T)


def test_random_operator_is_seeded_and_normalised():
    one = Model("a", 2, jumps=(Jump(RandomOperator("ginibre", 2, 5)),)).placed_jumps()[0].matrix
    two = Model("b", 2, jumps=(Jump(RandomOperator("ginibre", 2, 5)),)).placed_jumps()[0].matrix
    assert np.array_equal(one, two)
    assert np.linalg.norm(one) ** 2 == pytest.approx(4)


def reference():
    return Model(
        "a",
        3,
        parameters={"g": 2.0, "phase": 0.5j},
        hamiltonian=(Term("X X + Y Y"), Term("Z", coefficient=[0.1, 0.2, 0.3])),
        jumps=(Jump("S-", rate="g", coefficient="exp(phase)"),),
    )


def test_models_are_frozen():
    model = reference()
    with pytest.raises(AttributeError):
        model.sites = 4
    with pytest.raises(TypeError):
        model.parameters["x"] = 1
    with pytest.raises(ValueError, match="read-only"):
        model.placed_hamiltonian()[0].matrix[0, 0] = 1
    with pytest.raises(ValueError, match="read-only"):
        model.placed_jumps()[0].matrix[0, 0] = 1


@pytest.mark.parametrize(
    "again", [copy.copy, copy.deepcopy, lambda m: pickle.loads(pickle.dumps(m))]
)
def test_models_can_be_copied_and_sent_to_other_processes(again):
    model = reference()
    assert again(model) == model
    assert again(model).identity == model.identity
    assert len({model, again(model)}) == 1


def test_per_place_list_must_fit_the_new_size():
    with pytest.raises(ModelError, match="3 values for 4 places"):
        reference().replace(sites=4)


def test_replace_knows_its_names():
    changed = reference().replace(sites=3, boundary="open", name="b", g=3, phase=0)
    assert (changed.name, changed.parameters["g"]) == ("b", 3)
    assert isinstance(changed.parameters["phase"], float)
    assert reference().replace(g="sqrt(16)").parameters["g"] == 4
    with pytest.raises(ModelError, match="did you mean 'phase'"):
        reference().replace(pahse=1)
    with pytest.raises(ModelError, match="negative"):
        reference().replace(g=-1)
    with pytest.raises(ModelError, match="uses the parameter"):
        reference().replace(g="2*phase")


def test_coefficients_multiply_jumps_and_rates_stand_outside():
    jump = Model("a", 1, jumps=(Jump("S-", rate=0.3, coefficient=2j),)).placed_jumps()[0]
    assert jump.rate == 0.3
    assert np.array_equal(jump.matrix, 2j * local_operator("S-", 2))


def test_values_per_place():
    model = Model(
        "a",
        4,
        boundary="periodic",
        hamiltonian=(Term("Z Z", coefficient="j + 10*L"), Term("X", on=[4, 2], coefficient=[5, 7])),
        jumps=(Jump("Z", rate="j - 1"), Jump("X", on="last", rate=[2])),
    )
    hamiltonian = model.placed_hamiltonian()
    assert [placed.matrix[0, 0].real for placed in hamiltonian[:4]] == [41, 42, 43, 44]
    assert hamiltonian[3].sites == (3, 0)
    assert [(p.sites, p.matrix[0, 1].real) for p in hamiltonian[4:]] == [((3,), 5), ((1,), 7)]
    jumps = [(placed.sites, placed.rate) for placed in model.placed_jumps()]
    assert jumps == [((1,), 1), ((2,), 2), ((3,), 3), ((3,), 2)]


def test_hermiticity_is_asked_of_the_sum():
    with pytest.raises(
        ModelError, match=r"hamiltonian term 2, 3: not Hermitian on site\(s\) 1, 2 "
    ):
        Model("a", 3, hamiltonian=(Term("X X"), Term("S+ S-"), Term("2 S- S+")))
    with pytest.raises(ModelError, match="constant"):
        Model("a", 3, hamiltonian=(Term("1j I"),))
    almost = Term([[1, 1e-15], [0, 1]])
    assert Model("a", 1, hamiltonian=(almost,)).sites == 1


WRONG = {
    "hamiltonian is text": {"hamiltonian": "Z"},
    "hamiltonian is a number": {"hamiltonian": 3},
    "jump among terms": {"hamiltonian": (Jump("Z"),)},
    "parameters is None": {"parameters": None},
    "parameters is a list": {"parameters": [1]},
    "parameter is an array": {"parameters": {"a": np.array([1, 2])}},
    "parameter name is a number": {"parameters": {1: 1}},
    "boundary is an array": {"boundary": np.array(["open"])},
    "description is None": {"description": None},
    "name with half a surrogate": {"name": "a\ud800"},
    "description with half a surrogate": {"description": "\ud800"},
    "sites is complex": {"sites": 3 + 0j},
}


@pytest.mark.parametrize("change", WRONG.values(), ids=WRONG)
def test_wrong_types_in_python(change):
    good = {"name": "a", "sites": 3, "jumps": (Jump("Z"),)}
    with pytest.raises(ModelError) as caught:
        Model(**(good | change))
    assert str(caught.value).isprintable()


@pytest.mark.parametrize(
    "make",
    [
        lambda: Term(None),
        lambda: Term([]),
        lambda: Term(np.eye(2)[0]),
        lambda: Term(np.zeros((2, 2, 2))),
        lambda: Term([[1, 2], [3]]),
        lambda: Term("Z", on=1.5),
        lambda: Term("Z", on=[1.0]),
        lambda: Term("Z", on=None),
        lambda: Term("Z", coefficient=None),
        lambda: Term("Z", coefficient=np.zeros((2, 2))),
        lambda: Jump("Z", rate=np.bool_(True)),
        lambda: RandomOperator("gue", 2, 1),
        lambda: RandomOperator("ginibre", 2.0, 1),
        lambda: RandomOperator("ginibre", 2, 1.5),
        lambda: RandomOperator("ginibre", 2, 2**63),
        lambda: RandomOperator(3, 2, 1),
    ],
)
def test_wrong_terms_in_python(make):
    with pytest.raises(ModelError):
        make()


def test_what_python_makes_easy():
    """Generators, single terms, NumPy numbers, arrays and ranges are taken for what they mean."""
    plain = Model("a", 3, hamiltonian=(Term("Z", coefficient=[1.0, 2.0, 3.0]),), jumps=(Jump("X"),))
    easy = Model(
        "a",
        np.int64(3),
        local_dimension=np.int8(2),
        hamiltonian=(Term("Z", coefficient=np.arange(1, 4)) for _ in range(1)),
        jumps=Jump("X", on=range(1, 4)),
    )
    assert easy.identity == plain.identity
    assert hash(easy.replace(name="b")) != hash(easy)


def test_an_integer_seed_keeps_all_its_digits():
    one, two = (
        Model("a", 2, jumps=(Jump(RandomOperator("ginibre", 1, seed)),))
        for seed in (2**60, 2**60 + 1)
    )
    assert one.identity != two.identity


def test_huge_operators_are_refused_before_they_are_built():
    big = Term(RandomOperator("hermitian", 3, 1))
    with pytest.raises(ModelError, match="4000000 entries"):
        Model("a", 20, local_dimension=10, hamiltonian=(big,))


@pytest.mark.parametrize("dimension", [2, 4])
def test_long_chains_are_cheap(dimension):
    text = "Sx Sx + Sy Sy + 0.3 Sz Sz"
    model = Model(
        "a", 64, dimension, "periodic", hamiltonian=(Term(text),), jumps=(Jump("S-"), Jump("Sz"))
    )
    assert len(model.placed_hamiltonian()) == 64
    assert len({id(placed.matrix) for placed in model.placed_hamiltonian()}) == 1
    assert len(model.identity) == 64
