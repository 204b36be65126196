"""What the README shows is what happens."""

import contextlib
import io
import re
from pathlib import Path

import pytest

import lbwork
from lbwork.cli import verbs
from lbwork.model import load_model

ROOT = Path(__file__).resolve().parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")


def blocks(language):
    return re.findall(rf"^```{language}\n(.*?)^```$", README, re.DOTALL | re.MULTILINE)


@pytest.fixture
def model_folder(tmp_path, monkeypatch):
    (tmp_path / "source-sink.toml").write_text(blocks("toml")[0], encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_the_model_file_is_legal(model_folder):
    model = load_model(model_folder / "source-sink.toml", delta=0.5)
    assert (model.sites, model.parameters["delta"]) == (6, 0.5)


def test_the_example_prints_what_it_says(model_folder):
    shown = io.StringIO()
    with contextlib.redirect_stdout(shown):
        exec(blocks("python")[0], {})
    assert [line.rstrip() for line in shown.getvalue().splitlines()] == blocks("text")[
        0
    ].splitlines()


def test_the_table_lists_the_verbs_in_order():
    rows = re.findall(r"^\| (`[^|]*) \|", README, re.MULTILINE)
    assert re.findall(r"`([^`]+)`", " ".join(rows)) == [verb.NAME for verb in verbs.ALL]


@pytest.mark.parametrize("name", ["main", "test"])
def test_each_command_is_one_line(name):
    command = re.search(rf"^<!-- {name} command -->\n```sh\n(.*?)```", README, re.DOTALL | re.M)
    assert command is not None
    assert command[1].count("\n") == 1


@pytest.mark.parametrize("target", re.findall(r"\]\(([^)]+)\)", README))
def test_links_lead_somewhere(target):
    assert (ROOT / target).is_file()


@pytest.mark.parametrize("name", lbwork.__all__)
def test_public_names_can_be_imported(name):
    assert getattr(lbwork, name) is not None
