"""Model files: what is read, what is written, what is refused before it is parsed."""

import os

import pytest
from hypothesis import given
from hypothesis import strategies as st

from lbwork.errors import LbworkError, ModelError
from lbwork.model import Jump, Model, RandomOperator, Term, load_model, model_from_toml
from lbwork.model.files import MAX_FILE_BYTES
from tests.model.malformed import GOOD


def test_every_key_is_read():
    model = model_from_toml(
        """
        name = "every key"
        description = "words"
        sites = 4
        local_dimension = 3
        boundary = "periodic"
        [parameters]
        g = 0.5
        phi = "pi/4"
        [[hamiltonian]]
        operator = "Sx Sx"
        on = "bonds"
        coefficient = "g"
        [[hamiltonian]]
        matrix = [[0, "1j*g", 0], ["-1j*g", 0, 0], [0, 0, 2]]
        on = [1, 3]
        coefficient = [1, 2]
        [[jump]]
        random = {kind = "ginibre", range = 1, seed = "4*g"}
        on = "first"
        rate = [0.5]
        coefficient = "exp(1j*phi)"
        [about]
        title = "t"
        source = "s"
        known = "k"
        integrable = "no"
        argument = "a"
        sensible_sites = [4]
        """
    )
    again = Model(
        "every key",
        4,
        3,
        "periodic",
        {"g": 0.5, "phi": "pi/4"},
        (
            Term("Sx Sx", "bonds", "g"),
            Term(((0, "1j*g", 0), ("-1j*g", 0, 0), (0, 0, 2)), [1, 3], [1, 2]),
        ),
        (Jump(RandomOperator("ginibre", 1, "4*g"), "first", [0.5], "exp(1j*phi)"),),
        "words",
    )
    assert model == again
    assert model.identity == again.identity


def test_what_may_be_left_out():
    model = model_from_toml('name = "a"\nsites = 2\n[[jump]]\noperator = "Z"\n')
    assert (model.boundary, model.local_dimension, model.description) == ("open", 2, "")
    assert [(jump.sites, jump.rate) for jump in model.placed_jumps()] == [((0,), 1), ((1,), 1)]


def test_odd_values_round_trip():
    model = Model(
        'quotes " and \\ and \u00e9',
        2,
        description="two\nlines\ttab \x7f \x01",
        parameters={"z": -0.5 - 1e-7j, "tiny": 1e-300, "big": 1e22},
        hamiltonian=(Term([[1.5, "1j*tiny"], ["-1j*tiny", 0]], on=[2], coefficient=[0.1]),),
        jumps=(
            Jump(RandomOperator("ginibre", 2, 7), rate=[0.25]),
            Jump([[0, 0.5 - 2j], [1, 0]], on="first", coefficient="z"),
        ),
    )
    again = Model.from_toml(model.to_toml())
    assert again == model
    assert again.to_toml() == model.to_toml()
    assert again.identity == model.identity
    assert again.parameters == model.parameters


NUMBERS = st.floats(-1e30, 1e30) | st.complex_numbers(max_magnitude=1e30, allow_nan=False)


@given(
    st.text(st.characters(codec="utf-8", categories=("L", "N", "P", "S")), min_size=1, max_size=20),
    st.text(st.characters(codec="utf-8"), max_size=30),
    st.lists(NUMBERS, min_size=4, max_size=4),
    st.lists(st.floats(0, 1e30), min_size=2, max_size=2),
)
def test_any_legal_model_round_trips(name, description, entries, rates):
    matrix = [entries[:2], entries[2:]]
    jump = Jump(matrix, rate=rates, coefficient="g")
    model = Model(
        name, 2, description=description, parameters={"g": entries[0]}, jumps=(jump, Jump("Z"))
    )
    again = Model.from_toml(model.to_toml())
    assert again == model
    assert again.canonical_json() == model.canonical_json()


def written(folder, content):
    path = folder / "model.toml"
    path.write_bytes(content)
    return path


def test_files_are_read_as_utf8_with_or_without_mark(tmp_path):
    path = written(tmp_path, b"\xef\xbb\xbf" + GOOD.encode())
    assert load_model(path) == model_from_toml(GOOD)
    assert load_model(str(path), delta=0.25).parameters["delta"] == 0.25


def test_a_word_that_names_a_file_is_a_path(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    for name in ("mine", "xx-dephasing", "xx-dephasing.toml"):
        (tmp_path / name).write_text(GOOD)
    assert load_model("mine").name == "chain"
    assert load_model("xx-dephasing").name == "xx-dephasing"
    assert load_model("./xx-dephasing").name == "chain"
    assert load_model("xx-dephasing.toml").name == "chain"


REFUSED = {
    "not UTF-8": (b"name = '\xff'", "UTF-8"),
    "UTF-16": (GOOD.encode("utf-16"), "UTF-8"),
    "binary": (bytes(range(256)), "UTF-8"),
    "NUL": (b"name = 'a'\x00", "not valid TOML"),
    "too large": (b"#" * (MAX_FILE_BYTES + 1), "bytes"),
    "empty": (b"", "name"),
}


@pytest.mark.parametrize("name", REFUSED)
def test_refused_files(name, tmp_path):
    content, word = REFUSED[name]
    with pytest.raises(ModelError, match=word) as caught:
        load_model(written(tmp_path, content))
    assert str(caught.value).isprintable()


@pytest.mark.parametrize(
    ("word", "reason"),
    [
        ("absent.toml", "cannot be read"),
        ("absent", "neither a bundled model"),
        ("no/absent", "cannot be read"),
        (".", "folder"),
        ("xx-dephasin", "did you mean 'xx-dephasing'"),
        ("", "neither"),
        ("a\nb", "neither"),
        ("a\0b", "neither"),
        ("a\0b.toml", "not a path"),
        ("x" * 5000, "neither"),
        ("x" * 5000 + ".toml", "cannot be read"),
        (7, "neither text nor a path"),
        (None, "neither text nor a path"),
    ],
)
def test_refused_words(word, reason, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    with pytest.raises(ModelError, match=reason) as caught:
        load_model(word)
    assert str(caught.value).isprintable()
    assert len(str(caught.value)) < 300


def test_a_file_without_end_is_not_read_to_the_end(tmp_path):
    reading, writing = os.pipe()
    with os.fdopen(writing, "wb") as pipe, os.fdopen(reading, "rb") as source:
        pipe.write(GOOD.encode())
        pipe.close()
        assert load_model(f"/dev/fd/{source.fileno()}").name == "chain"
    with pytest.raises(ModelError, match="bytes"):
        load_model("/dev/zero")


@given(st.text(max_size=40))
def test_any_word_as_model(word):
    try:
        load_model(word)
    except LbworkError as error:
        assert str(error).isprintable()
