"""Bad models are refused in one line that names the place; nothing else escapes the reader."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from lbwork.errors import LbworkError, ModelError
from lbwork.model import Model, load_model, model_from_toml
from lbwork.model.expressions import evaluate
from lbwork.model.files import model_from_document
from tests.model.malformed import GOOD, MALFORMED

WORDS = ["X", "S+", "delta", "j", "1j", "2.5", "+", "-", "*", "/", "**", "^", ".", "(", ")", ","]
WORDS += ["exp", "random", "sqrt", "E01", "1e308", "L", "Sz", " "]


def test_the_good_file_is_good():
    assert model_from_toml(GOOD).sites == 3


def check_message(message):
    """One printable line, not a screenful, with a way out."""
    assert message.isprintable()
    assert len(message) < 400
    assert any(word in message for word in ("; ", "did you mean", "e.g."))


@pytest.mark.parametrize("name", MALFORMED)
def test_malformed_file(name):
    text, place = MALFORMED[name]
    with pytest.raises(ModelError) as caught:
        model_from_toml(text)
    message = str(caught.value)
    assert place in message
    check_message(message)


def test_there_are_enough_malformed_files():
    assert len(MALFORMED) >= 100


@given(st.text(max_size=60))
def test_any_text_as_expression(text):
    try:
        evaluate(text, {"delta": 0.5}, place="here", dimension=2)
    except LbworkError as error:
        assert str(error).startswith("here")
        check_message(str(error))


@given(st.lists(st.sampled_from(WORDS), max_size=14))
def test_any_words_as_expression(words):
    try:
        evaluate(
            " ".join(words),
            {"delta": 0.5 + 0j, "j": 1 + 0j, "L": 4 + 0j},
            place="here",
            dimension=2,
        )
    except LbworkError as error:
        assert str(error).startswith("here")
        check_message(str(error))


@given(st.text(max_size=200))
def test_any_text_as_model(text):
    try:
        model_from_toml(text)
    except LbworkError as error:
        check_message(str(error))


@given(st.binary(max_size=120))
def test_any_bytes_as_model_file(tmp_path_factory, content):
    path = tmp_path_factory.mktemp("model") / "model.toml"
    path.write_bytes(content)
    try:
        load_model(path)
    except LbworkError as error:
        check_message(str(error))


VALUES = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=8),
    lambda inner: (
        st.lists(inner, max_size=4) | st.dictionaries(st.text(max_size=6), inner, max_size=4)
    ),
    max_leaves=8,
)
KEYS = [
    "name",
    "sites",
    "boundary",
    "local_dimension",
    "parameters",
    "hamiltonian",
    "jump",
    "about",
]
TERM = st.fixed_dictionaries(
    {},
    optional={
        "operator": st.sampled_from(["Z", "X X", "delta Z", "S+ S-", ""]) | VALUES,
        "matrix": VALUES,
        "random": VALUES,
        "on": st.sampled_from(["all", "bonds", "first"]) | VALUES,
        "coefficient": VALUES,
        "rate": VALUES,
    },
)


@given(
    st.fixed_dictionaries(
        {"name": st.just("a") | VALUES, "sites": st.integers(0, 4) | VALUES},
        optional={
            "boundary": st.sampled_from(["open", "periodic"]) | VALUES,
            "local_dimension": st.integers(1, 4) | VALUES,
            "parameters": st.just({"delta": 0.5}) | VALUES,
            "hamiltonian": st.lists(TERM, max_size=2) | VALUES,
            "jump": st.lists(TERM, max_size=2) | VALUES,
        },
    )
)
def test_any_document_as_model(document):
    try:
        model = model_from_document(document)
    except LbworkError as error:
        check_message(str(error))
    else:
        assert isinstance(model, Model)
        assert len(model.identity) == 64


def test_missing_file_and_unknown_name(tmp_path):
    with pytest.raises(ModelError, match="cannot be read"):
        load_model(tmp_path / "absent.toml")
    with pytest.raises(ModelError, match="did you mean 'xx-dephasing'"):
        load_model("xx-dephasin")
    with pytest.raises(ModelError, match="folder"):
        load_model(tmp_path)


def test_unknown_parameter_is_named_with_the_nearest():
    with pytest.raises(ModelError, match="did you mean 'gamma'"):
        load_model("xx-dephasing", gama=1.0)
