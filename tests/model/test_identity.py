"""The same physics has the same identity, however it is written; other physics has another one."""

import json

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from lbwork.model import Jump, Model, Term, local_operator

X, Y, Z = (local_operator(name, 2) for name in "XYZ")
ONE = np.eye(2)


def reference():
    return Model(
        "a",
        3,
        hamiltonian=(Term("X X + Y Y"), Term("Z", coefficient=[0.1, 0.2, 0.3])),
        jumps=(Jump("S-", rate=2.0),),
    )


def test_the_same_model_written_otherwise_has_the_same_identity():
    other = Model(
        "another name",
        3,
        parameters={"unused": 4},
        description="words",
        hamiltonian=(
            Term(np.kron(X, X) + 0.1 * np.kron(Z, ONE), on=[1]),
            Term(np.kron(Y, Y), on=[2, 1]),
            Term("X X + 0.2 Z I + 0.3 I Z + 5 I I", on=[2]),
        ),
        jumps=(
            Jump("S-", on=[3], rate=1, coefficient=2**0.5 * 1j),
            Jump([[0, 0], ["sqrt(2)", 0]], on=[2, 1]),
            Jump("X", rate=0),
            Jump("I", rate=3),
        ),
    )
    assert other.identity == reference().identity
    assert other != reference()


REWRITTEN = {
    "all": Jump("Z", rate=0.3),
    "sites": Jump("Z", on="sites", rate=0.3),
    "listed": Jump("Z", on=[3, 1, 2], rate=0.3),
    "array of places": Jump("Z", on=np.array([1, 2, 3]), rate=0.3),
    "rate list": Jump("Z", rate=[0.3, 0.3, 0.3]),
    "rate expression": Jump("Z", rate="0.1*3"),
    "coefficient": Jump("Z", coefficient=0.3**0.5),
    "phase": Jump("Z", rate=0.3, coefficient="exp(0.7j)"),
    "matrix": Jump([[1, 0], [0, -1]], rate=0.3),
    "complex array": Jump(Z.astype(complex), rate=0.3),
    "spin": Jump("Sz", rate=1.2),
}


@pytest.mark.parametrize("jump", REWRITTEN.values(), ids=REWRITTEN)
def test_a_jump_rewritten(jump):
    plain = Model("a", 3, hamiltonian=(Term("X X"),), jumps=(Jump("Z", rate=0.3),))
    assert Model("a", 3, hamiltonian=(Term("X X"),), jumps=(jump,)).identity == plain.identity


def test_jumps_that_are_multiples_of_each_other_are_one():
    split = Model("a", 3, jumps=(Jump("Z", rate=0.1), Jump("S-"), Jump("2j Z", rate=0.05)))
    joined = Model("a", 3, jumps=(Jump("S-"), Jump("Z", rate=0.3)))
    assert split.identity == joined.identity


def test_one_site_terms_may_hide_in_longer_ones():
    short = Model("a", 2, hamiltonian=(Term("0.5 Z"), Term("X X")), jumps=(Jump("S-"),))
    long = Model(
        "a",
        2,
        hamiltonian=(Term("X X + Z I - 0.5 Z I + 0.5 I Z"),),
        jumps=(Jump("I S-"), Jump("S- I")),
    )
    assert short.identity == long.identity


def test_the_two_bonds_of_a_two_site_ring():
    ring = Model("a", 2, boundary="periodic", hamiltonian=(Term("X X + Sz I"),))
    listed = Model("a", 2, boundary="periodic", hamiltonian=(Term("2 X X", on=[1]), Term("Sz")))
    assert [placed.sites for placed in ring.placed_hamiltonian()] == [(0, 1), (1, 0)]
    assert ring.identity == listed.identity


def models_that_differ():
    plain = (Term("X X"),)
    return [
        reference(),
        Model("a", 3, hamiltonian=plain),
        Model("a", 3, boundary="periodic", hamiltonian=plain),
        Model("a", 4, hamiltonian=plain),
        Model("a", 3, hamiltonian=(Term("X X", coefficient=1.000001),)),
        Model("a", 3, hamiltonian=(Term("X X", coefficient=-1),)),
        Model("a", 3, hamiltonian=(Term("X Y"),)),
        Model("a", 3, hamiltonian=(Term("Y X"),)),
        Model("a", 3, hamiltonian=plain, jumps=(Jump("S-"),)),
        Model("a", 3, hamiltonian=plain, jumps=(Jump("S-", rate=2),)),
        Model("a", 3, hamiltonian=plain, jumps=(Jump("S+"),)),
        Model("a", 3, hamiltonian=plain, jumps=(Jump("X"),)),
        Model("a", 3, hamiltonian=plain, jumps=(Jump("X + Y"),)),
        Model("a", 3, hamiltonian=plain, jumps=(Jump("X"), Jump("Y"))),
        Model("a", 3, hamiltonian=plain, jumps=(Jump("X + I"),)),
        Model("a", 3, local_dimension=3, hamiltonian=(Term("Sx Sx"),)),
    ]


def test_different_models_have_different_identities():
    models = models_that_differ()
    assert len({model.identity for model in models}) == len(models)


@pytest.mark.parametrize("number", [1, 3, -2, 0])
def test_whole_and_floating_numbers_are_the_same(number):
    whole = Model("a", 2, parameters={"g": number}, hamiltonian=(Term("Z", coefficient="g"),))
    point = whole.replace(g=float(number))
    typed = whole.replace(g=np.int32(number))
    assert whole == point == typed
    assert hash(whole) == hash(point) == hash(typed)
    assert whole.identity == point.identity == typed.identity


@given(
    st.lists(st.integers(-3000, 3000), min_size=9, max_size=9),
    st.integers(0, 2**32 - 1),
    st.sampled_from([1e-9, 1e-3, 1.0, 1e6]),
)
def test_any_hamiltonian_cut_at_random(coefficients, seed, scale):
    """Pieces that add up to one bond operator, with parts that cancel, in any order."""
    generator = np.random.default_rng(seed)
    bond = sum(
        value / 1000 * np.kron(left, right)
        for value, (left, right) in zip(
            coefficients, [(a, b) for a in (X, Y, Z) for b in (X, Y, Z)], strict=True
        )
    )
    detour = generator.normal(size=(4, 4))
    detour = detour + detour.T
    pieces = [Term(scale * (bond - detour)), Term("1e-5 scale X I", on=[1])]
    pieces += [Term(scale * detour / 3)] * 3
    parameters = {"scale": scale}
    order = generator.permutation(len(pieces))
    field = Term("Z", coefficient=scale)
    cut = Model("a", 4, parameters=parameters, hamiltonian=(*[pieces[i] for i in order], field))
    tiny = Term("X", on="first", coefficient=1e-5 * scale)
    whole = Model("a", 4, hamiltonian=(field, tiny, Term(scale * bond)))
    assert cut.identity == whole.identity


@given(st.floats(0.01, 100), st.floats(0, 6.3))
def test_any_jump_with_any_phase_and_norm(factor, angle):
    text = "X X + (0.25 - 0.5j) Y Z + 0.3j Z I + I Y"
    plain = Model("a", 3, jumps=(Jump(text, rate=0.7),))
    phase = complex(factor * np.exp(1j * angle))
    turned = Model("a", 3, jumps=(Jump(text, rate=0.7 / factor**2, coefficient=phase),))
    assert turned.identity == plain.identity


@pytest.mark.parametrize("power", range(1, 20))
def test_binary_fractions_do_not_sit_on_the_edge_of_rounding(power):
    """2**-13 = 1.220703125e-4 has a 5 just behind twelve decimals."""
    value = 2.0**-power
    one = Model("a", 1, hamiltonian=(Term("X"), Term("Z", coefficient=value)))
    for noise in (1 - 3e-16, 1 + 3e-16):
        two = Model("a", 1, hamiltonian=(Term("X"), Term("Z", coefficient=value * noise)))
        assert two.identity == one.identity


def test_the_largest_coefficient_may_sit_below_a_power_of_ten():
    one = Model("a", 1, hamiltonian=(Term("X"), Term("Z", coefficient=1 / 3)))
    two = Model("a", 1, hamiltonian=(Term("0.9999999999999999 X"), Term("Z", coefficient=1 / 3)))
    assert one.identity == two.identity


def test_canonical_form_is_plain_json():
    document = json.loads(reference().canonical_json())
    assert set(document) == {"boundary", "hamiltonian", "jumps", "local_dimension", "sites"}
    assert [[1, 3], 0.1] in document["hamiltonian"]
    assert len(document["hamiltonian"]) == 2 * 2 + 3
    assert [rate for rate, _ in document["jumps"]] == [0.5, 0.5, 0.5]


def test_closed_and_empty_generators_have_an_identity():
    closed = Model("a", 2, hamiltonian=(Term("Z"),))
    nothing = Model("a", 2, jumps=(Jump("Z", rate=0),))
    assert json.loads(closed.canonical_json())["jumps"] == []
    assert len(nothing.identity) == 64
