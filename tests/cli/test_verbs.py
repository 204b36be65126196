"""Each verb does its work, prints JSON with the promised fields and keeps a run."""

import csv
import json

import numpy as np
import pytest

from lbwork.cli.verbs import ALL
from tests.cli.command import lbwork


@pytest.fixture
def here(tmp_path, monkeypatch):
    """An empty folder to work in."""
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_every_verb_has_help(capsys):
    for verb in ALL:
        outcome = lbwork(capsys, verb.NAME, "--help")
        assert outcome.status == 0
        assert "--json" in outcome.out


def test_no_word_shows_the_verbs(capsys):
    outcome = lbwork(capsys)
    assert all(verb.NAME in outcome.out for verb in ALL)


def test_about(capsys):
    document = lbwork(capsys, "about", "--json").document
    assert {"numpy", "scipy", "quspin", "h5py"} <= set(document["versions"])
    assert document["run_file_schema"] >= 1
    assert "numpy" in lbwork(capsys, "about").out


def test_catalogue(capsys):
    models = lbwork(capsys, "catalogue", "--json").document["models"]
    assert len(models) >= 14
    assert all(model["source"] and model["integrable"] for model in models)
    one = lbwork(capsys, "catalogue", "xx-driven")
    assert "[[jump]]" in one.out


def test_inspect(capsys):
    document = lbwork(capsys, "inspect", "xx-dephasing", "--sites", 4, "--json").document
    total = sum(item["dimension"] * item["multiplicity"] for item in document["sectors"])
    assert total == document["total_dimension"] == 4**4
    assert document["generator"]["certified"]
    assert {task["task"] for task in document["tasks"]} == {"spectrum", "gap", "steady", "audit"}
    assert "translation" in lbwork(capsys, "inspect", "xx-dephasing", "--sites", 4).out


def test_spectrum(capsys, here):
    outcome = lbwork(capsys, "spectrum", "xx-driven", "--sites", 3, "--json")
    document = outcome.document
    assert outcome.status == 0
    count = sum(item["multiplicity"] * len(item["eigenvalues"]) for item in document["sectors"])
    assert count == 64
    assert {"label", "dimension", "multiplicity", "eigenvalues", "certificate"} <= set(
        document["sectors"][0]
    )
    runs = lbwork(capsys, "runs", "--json").document["runs"]
    assert [run["run_id"] for run in runs] == [document["run"]]
    assert runs[0]["status"] == "complete"


def test_levels_of_a_model_and_of_its_run_agree(capsys, here):
    run = lbwork(capsys, "spectrum", "random-two-site", "--sites", 4, "--json").document["run"]
    kept = lbwork(capsys, "levels", run, "--json").document
    fresh = lbwork(capsys, "levels", "random-two-site", "--sites", 4, "--json").document
    fields = {"verdict", "levels_used", "mean_ratio", "mean_cosine", "log_likelihood"}
    assert fields <= set(kept)
    assert all(kept[name] == fresh[name] for name in fields)


def test_gap(capsys, here):
    # Gap of the open totally asymmetric process at alpha = beta = 1, N = 2: 1 (reference values,
    # checked dense); coherences decay at least as slowly, so it is a bound for the whole space.
    document = lbwork(capsys, "gap", "tasep-open", "--sites", 2, "--json").document
    assert {"gap", "eigenvalue", "zero_modes", "residual", "sector"} <= set(document)
    assert 0 < document["gap"] <= 1 + 1e-10
    assert document["zero_modes"] == 1


def test_gap_over_sizes(capsys, here):
    document = lbwork(capsys, "gap", "xxx-driven", "--sites", "2:4", "--json").document
    assert document["sites"] == [2, 3, 4]
    assert all(gap > 0 for gap in document["gaps"])
    figure = lbwork(capsys, "figure", document["run"], "--format", "svg", "--json")
    assert any("gap" in path for path in figure.document["figures"])


def test_steady(capsys, here):
    """M. Znidaric, J. Stat. Mech. (2010) L05002: bond current 0.404040404 at the values below."""
    words = ["--sites", 2, "--set", "gamma=1", "--set", "mu=0.5", "--set", "dephasing=0.7"]
    outcome = lbwork(capsys, "steady", "xx-driven-dephasing", *words, "--json")
    document = outcome.document
    assert document["spin_current"] == pytest.approx([0.404040404], abs=1e-9)
    assert document["magnetisation"][0] == pytest.approx(0.095959596, abs=1e-9)
    wanted = {"trace", "hermiticity_error", "min_eigenvalue", "residual", "zero_modes", "purity"}
    assert wanted <= set(document)


def test_model_file_and_parameters(capsys, here):
    (here / "mine.toml").write_text(
        'name = "mine"\nsites = 2\n[parameters]\ng = 1.0\n[[jump]]\noperator = "S-"\nrate = "g"\n'
    )
    document = lbwork(capsys, "gap", "mine.toml", "--set", "g=0.5", "--json").document
    # Single-site decay: coherence decays at half the rate (closed form).
    assert document["gap"] == pytest.approx(0.25, abs=1e-12)


def test_audit_from_end_to_end(capsys, here):
    outcome = lbwork(capsys, "audit", "random-two-site", "--sites", 4, "--json")
    document = outcome.document
    assert outcome.status == 0
    assert document["certified"]
    assert document["levels"]["verdict"]
    assert document["gap"]["residual"] < 1e-9
    assert document["steady"]["residual"] < 1e-9
    assert document["figures"]
    assert all((here / path).stat().st_size > 1000 for path in document["figures"])
    shown = lbwork(capsys, "show", document["run"])
    assert "conclusion" in shown.out


def test_show_compare_and_export(capsys, here):
    one = lbwork(capsys, "spectrum", "xx-driven", "--sites", 3, "--json").document["run"]
    words = ["spectrum", "xx-driven", "--sites", 3, "--set", "mu=0.4", "--json"]
    two = lbwork(capsys, *words).document["run"]
    same = lbwork(capsys, "compare", one, one, "--json").document
    assert same["same_model"] and max(same["levels"].values()) == 0
    other = lbwork(capsys, "compare", one, two, "--json").document
    assert not other["same_model"]
    assert max(other["levels"].values()) > 1e-6
    assert lbwork(capsys, "export", one, "--out", "levels.csv").status == 0
    with open(here / "levels.csv", encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    assert sum(int(row["multiplicity"]) for row in rows) == 64
    assert lbwork(capsys, "export", one, "--out", "all.npz").status == 0
    with np.load(here / "all.npz") as arrays:
        assert any(name.endswith("eigenvalues") for name in arrays)
    assert lbwork(capsys, "export", one, "--out", "model.toml").status == 0
    assert lbwork(capsys, "inspect", "model.toml", "--json").document["sites"] == 3
    assert lbwork(capsys, "export", one, "--out", "all.json").status == 0
    assert json.loads((here / "all.json").read_text())["summary"]["run_id"] == one


def test_figures_in_every_format(capsys, here):
    run = lbwork(capsys, "steady", "xx-driven", "--sites", 3, "--json").document["run"]
    for suffix in ("pdf", "svg", "png"):
        outcome = lbwork(capsys, "figure", run, "--format", suffix, "--json")
        assert all((here / path).stat().st_size > 500 for path in outcome.document["figures"])


def test_damaged_run_is_listed_and_not_fatal(capsys, here):
    run = lbwork(capsys, "steady", "xx-driven", "--sites", 2, "--json").document["run"]
    (here / "runs" / f"{run}.h5").write_bytes(b"not a run file")
    listed = lbwork(capsys, "runs", "--json").document["runs"]
    assert [one["status"] for one in listed] == ["damaged"]
    outcome = lbwork(capsys, "show", run)
    assert outcome.status == 1
    assert "Traceback" not in outcome.err
