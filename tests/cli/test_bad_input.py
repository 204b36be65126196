"""Malformed model files and command lines: one line that names the place, no file left behind."""

import pytest

from tests.cli.command import lbwork
from tests.model.malformed import GOOD, MALFORMED

# words, exit status, a word that the message must contain
COMMANDS = {
    "unknown verb": (["frobnicate"], 2, "frobnicate"),
    "no model": (["gap"], 2, "MODEL"),
    "unknown model": (["gap", "xx-drivn"], 1, "did you mean 'xx-driven'"),
    "absent file": (["inspect", "absent.toml"], 1, "absent.toml"),
    "a folder": (["inspect", "./"], 1, "folder"),
    "unknown option": (["gap", "xx-driven", "--sitess", "4"], 2, "--sitess"),
    "option without value": (["gap", "xx-driven", "--sites"], 2, "--sites"),
    "sites is a word": (["gap", "xx-driven", "--sites", "four"], 2, "four"),
    "sites is fractional": (["gap", "xx-driven", "--sites", "4.5"], 2, "4.5"),
    "range runs backwards": (["gap", "xx-driven", "--sites", "6:4"], 2, "6:4"),
    "range is open": (["gap", "xx-driven", "--sites", "4:"], 2, "4:"),
    "range of four numbers": (["gap", "xx-driven", "--sites", "1:2:3:4"], 2, "1:2:3:4"),
    "step of zero": (["gap", "xx-driven", "--sites", "4:6:0"], 2, "4:6:0"),
    "range where one size is meant": (["steady", "xx-driven", "--sites", "3:4"], 2, "one size"),
    "no site": (["steady", "xx-driven", "--sites", "0"], 1, "sites"),
    "negative sites": (["steady", "xx-driven", "--sites=-3"], 1, "-3"),
    "huge chain": (["spectrum", "xx-driven", "--sites", "40"], 1, "sites"),
    "unknown parameter": (["steady", "xx-driven", "--set", "gama=1"], 1, "did you mean 'gamma'"),
    "parameter without value": (["steady", "xx-driven", "--set", "gamma"], 2, "name=value"),
    "parameter without name": (["steady", "xx-driven", "--set", "=1"], 2, "name=value"),
    "parameter is a word": (["steady", "xx-driven", "--set", "gamma=abc"], 2, "abc"),
    "parameter is nan": (["steady", "xx-driven", "--set", "gamma=nan"], 1, "gamma"),
    "parameter is infinite": (["steady", "xx-driven", "--set", "gamma=inf"], 1, "gamma"),
    "parameter twice": (
        ["steady", "xx-driven", "--set", "mu=0", "--set", "mu=1"],
        2,
        "twice",
    ),
    "sites through set": (["steady", "xx-driven", "--set", "sites=4"], 2, "--sites"),
    "negative rate": (["steady", "xx-driven", "--set", "mu=2"], 1, "negative"),
    "complex rate": (["steady", "xx-driven", "--set", "gamma=1j"], 1, "complex"),
    "unknown boundary": (["inspect", "xx-driven", "--boundary", "round"], 2, "round"),
    "superfluous word": (["gap", "xx-driven", "xx-driven"], 2, "xx-driven"),
    "unknown catalogue name": (["catalogue", "xx-drivn"], 1, "did you mean 'xx-driven'"),
    "absent run": (["show", "nothing"], 1, "runs"),
    "absent run for levels": (["levels", "spectrum-nothing"], 1, "spectrum-nothing"),
    "sites of a run": (["show", "nothing", "--sites", "4"], 2, "--sites"),
    "one run to compare": (["compare", "nothing"], 2, "Missing argument"),
    "absent runs to compare": (["compare", "one", "two"], 1, "one"),
    "figure of an absent run": (["figure", "nothing"], 1, "runs"),
    "figure in an unknown format": (["figure", "nothing", "--format", "gif"], 2, "gif"),
    "export without a file": (["export", "nothing"], 2, "--out"),
    "export in an unknown form": (["export", "nothing", "--out", "x.doc"], 2, "x.doc"),
    "export into an absent folder": (["export", "nothing", "--out", "no/x.csv"], 2, "no"),
    "runs folder below a file": (
        ["steady", "xx-driven", "--sites", "2", "--runs", "file/runs"],
        1,
        "file",
    ),
}


def check_refused(outcome, status, word):
    """One line on stderr with the word, nothing on stdout, the right status, no traceback."""
    lines = [line for line in outcome.err.splitlines() if line.startswith("lbwork: ")]
    assert outcome.status == status
    assert len(lines) == 1
    assert word in lines[0]
    assert "Traceback" not in outcome.err
    assert outcome.out == ""


def test_there_are_enough_cases():
    assert len(COMMANDS) >= 40


@pytest.mark.parametrize("name", COMMANDS)
def test_bad_command_line(name, capsys, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "file").write_text("not a folder")
    words, status, word = COMMANDS[name]
    check_refused(lbwork(capsys, *words), status, word)
    assert [path.name for path in tmp_path.iterdir()] == ["file"]


@pytest.mark.parametrize("name", MALFORMED)
def test_malformed_model_file(name, capsys, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    text, word = MALFORMED[name]
    (tmp_path / "model.toml").write_text(text)
    check_refused(lbwork(capsys, "spectrum", "model.toml"), 1, word)
    assert [path.name for path in tmp_path.iterdir()] == ["model.toml"]


def test_file_that_is_not_text(capsys, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "model.toml").write_bytes(b"\xff\xfe\x00name")
    check_refused(lbwork(capsys, "inspect", "model.toml"), 1, "UTF-8")


def test_the_good_file_runs(capsys, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "model.toml").write_text(GOOD)
    assert lbwork(capsys, "spectrum", "model.toml").status == 0
