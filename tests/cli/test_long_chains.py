"""The verbs of long chains as a user types them: options, words, errors, JSON."""

import numpy as np
import pytest

from tests.cli.command import lbwork


@pytest.fixture(autouse=True)
def _own_folder(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)


def test_steady_with_observables(capsys):
    done = lbwork(
        capsys,
        *("steady", "xxz-driven", "--sites", 7, "--entanglement", "--operator", "X X@2"),
        *("--against", "mixed", "--json"),
    )
    assert done.status == 0
    document = done.document
    assert document["method"] == "matrix-free"
    assert document["applies"] <= 50
    more = document["observables"]
    assert len(more["negativity"]) == 6
    assert np.allclose(more["profile"]["z"], document["magnetisation"], atol=1e-12)
    assert "X X@2" in more["expectations"] and "mixed" in more["closeness"]
    assert "expected time" in done.err and "memory" in done.err


def test_steady_prints_what_it_did(capsys):
    done = lbwork(capsys, "steady", "xxz-driven", "--sites", 7, "--splitting", "no-jump")
    assert done.status == 0
    assert "no-jump splitting" in done.out


def test_gap_says_what_it_searched(capsys):
    done = lbwork(capsys, "gap", "xxz-driven", "--sites", 8, "--set", "delta=1", "--json")
    assert done.status == 0
    assert done.document["gap"] == pytest.approx(0.12331000, abs=6e-9)
    assert "equal ket and bra charge" in done.document["scope"]
    every = lbwork(capsys, "gap", "xxz-driven", "--sites", 5, "--sectors", "all", "--json")
    neutral = lbwork(capsys, "gap", "xxz-driven", "--sites", 5, "--sectors", "neutral", "--json")
    assert every.document["gap"] <= neutral.document["gap"] + 1e-9
    assert len(every.document["searched"]) > len(neutral.document["searched"])


def test_count(capsys):
    done = lbwork(capsys, "count", "xxz-driven", "--sites", 4, "--bond", 2, "--json")
    ends = lbwork(
        capsys, "count", "xxz-driven", "--sites", 4, "--jump", "1:2", "--jump", "2:-2", "--json"
    )
    assert done.status == ends.status == 0
    assert np.allclose(done.document["cumulants"], ends.document["cumulants"], atol=1e-10)
    assert done.document["mean_difference"] < 1e-10
    table = lbwork(capsys, "count", "xxz-driven", "--sites", 4, "--fields=-0.5,0.5")
    assert "fourth cumulant" in table.out and "growth rate" in table.out


def test_relax(capsys):
    done = lbwork(
        capsys,
        *("relax", "xxz-driven", "--sites", 4, "--start", "domain-wall", "--times", "0:2:1"),
        *("--operator", "X Y@1", "--rate", "--json"),
    )
    assert done.status == 0
    assert done.document["times"] == [0, 1, 2]
    assert done.document["profile"][0] == [1, 1, -1, -1]
    assert done.document["error_bound"] < 1e-9
    gap = lbwork(capsys, "gap", "xxz-driven", "--sites", 4, "--sectors", "neutral", "--json")
    assert done.document["decay"]["rate"] == pytest.approx(gap.document["gap"], rel=1e-5)


@pytest.mark.parametrize(
    ("words", "status", "message"),
    [
        (("steady", "xxz-driven", "--method", "fast"), 2, "method 'fast'"),
        (("steady", "xxz-driven", "--splitting", "both"), 2, "splitting 'both'"),
        (("steady", "xxz-driven", "--operator", "X X@6"), 2, "does not fit"),
        (("steady", "xxz-driven", "--operator", "X X"), 2, "first site"),
        (("steady", "xxz-driven", "--operator", "Q@1"), 1, "Q"),
        (("steady", "xxz-driven", "--against", "warm"), 2, "not a state"),
        (("steady", "xxz-driven", "--against", "missing.npy"), 2, "cannot be read"),
        (("steady", "xxz-driven", "--sites", 30), 1, "use fewer sites"),
        (("gap", "xxz-driven", "--sites", 30), 1, "use fewer sites"),
        (("gap", "xxz-driven", "--sectors", "some"), 2, "--sectors some"),
        (("gap", "xxz-driven", "--method", "fast"), 2, "method 'fast'"),
        (("count", "xxz-driven", "--jump", "x:1"), 2, "--jump x:1"),
        (("count", "xxz-driven", "--jump", "9:1"), 2, "jump 9"),
        (("count", "xxz-driven", "--bond", 9), 2, "bond 9"),
        (("count", "xxz-driven", "--fields", "a"), 2, "--fields a"),
        (("count", "xx-dephasing", "--sites", 4), 2, "a ring has no ends"),
        (("relax", "xxz-driven", "--times", "3:1:1"), 2, "--times 3:1:1"),
        (("relax", "xxz-driven", "--times=-1,2"), 2, "ascending"),
        (("relax", "xxz-driven", "--start", "0 1"), 2, "not a state"),
        (("relax", "xxz-driven", "--sites", 30), 1, "use fewer sites"),
    ],
)
def test_mistakes_get_one_line(capsys, words, status, message):
    done = lbwork(capsys, *words)
    assert done.status == status
    assert message in done.err
    lines = done.err.strip().splitlines()
    assert [line for line in lines if line.startswith("lbwork: ")] == lines[-1:]
    assert "Traceback" not in done.err
    assert done.out == ""


def test_inspect_says_what_does_not_fit(capsys):
    done = lbwork(capsys, "inspect", "xxz-driven", "--sites", 20, "--json")
    assert done.status == 0
    tasks = {task["task"]: task for task in done.document["tasks"]}
    assert not tasks["steady"]["fits"] and tasks["steady"]["seconds"] is None
    assert "too long" in lbwork(capsys, "inspect", "xxz-driven", "--sites", 20).out
