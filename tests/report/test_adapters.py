"""From results and their documents to figures, tables and words."""

from __future__ import annotations

import json
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

from lbwork.errors import UsageError
from lbwork.levels import LevelSequence, LevelStatistics, judge_levels, level_statistics
from lbwork.report import figures_of, figures_of_run, html_table
from lbwork.report.wording import interval_text, reference_label, with_uncertainty

pytestmark = pytest.mark.filterwarnings("error")


def statistics() -> LevelStatistics:
    generator = np.random.default_rng(21)
    matrix = generator.normal(size=(2, 300, 300))
    levels = np.linalg.eigvals(matrix[0] + 1j * matrix[1])
    return level_statistics([LevelSequence(levels, label="k=1")])


def pairs(values: np.ndarray) -> list[list[float]]:
    return [[float(value.real), float(value.imag)] for value in values]


SECTORS = [
    {"label": "k=0", "dimension": 3, "multiplicity": 1, "eigenvalues": [[0, 0], [-1, 1], [-1, -1]]},
    {
        "label": "k=1",
        "dimension": 2,
        "multiplicity": 2,
        "conjugates": 1,
        "eigenvalues": [[-1, 0.5], [-2, 0.25]],
    },
]


def test_spectrum_shows_the_conjugate_half() -> None:
    figures = figures_of({"sectors": SECTORS})
    assert sorted(figures) == ["sectors", "spectrum"]
    collections = figures["spectrum"].axes[0].collections
    points = np.concatenate([np.asarray(one.get_offsets()) for one in collections])
    assert sorted(points[:, 1]) == [-1, -0.5, -0.25, 0, 0.25, 0.5, 1]


def test_plan_alone_has_the_figure_of_sectors() -> None:
    plan = [{"label": "k=0", "dimension": 3, "multiplicity": 1}]
    assert list(figures_of({"sectors": plan})) == ["sectors"]


def test_gap_steady_state_and_scaling() -> None:
    modes = figures_of({"gap": 0.5, "eigenvalue": [-0.5, 0.0], "slow_modes": [[-0.5, 0], [-1, 2]]})
    assert list(modes) == ["slow-modes"]
    steady = figures_of({"magnetisation": [0.1, -0.1], "spin_current": [0.3], "purity": 0.5})
    assert list(steady) == ["profile"]
    silent = figures_of(
        {"magnetisation": [0.1], "spin_current": None, "current_reason": "loss"}
    )
    assert "loss" in silent["profile"].axes[0].get_xlabel()
    scaling = figures_of(
        {"sizes": [4, 6, 8], "gaps": [1.0, 0.5, 0.3], "exponent": 1.7, "exponent_error": 0.1}
    )
    assert list(scaling) == ["gap"]


def test_level_statistics_bring_their_verdict() -> None:
    levels = statistics()
    figures = figures_of(levels)
    assert list(figures) == ["levels"]
    title = figures["levels"].get_suptitle()
    assert judge_levels(levels).sentence.partition(". ")[0] in title.replace("\n", " ")


def test_verdict_alone_shows_its_means() -> None:
    verdict = judge_levels(statistics())
    assert list(figures_of(verdict)) == ["means"]
    assert list(figures_of(json.loads(json.dumps(verdict.to_dict())))) == ["means"]


def test_levels_on_a_line_and_second_pool() -> None:
    line = np.random.default_rng(22).uniform(size=50)
    sequences = [
        {"geometry": "line", "expected_class": "AI+", "ratios": pairs(line), "refused": None},
        {"geometry": "plane", "expected_class": "AI+", "ratios": [[0.5, 0.5]], "refused": None},
        {"geometry": "plane", "expected_class": "A", "ratios": [], "refused": "too few"},
    ]
    assert list(figures_of({"sequences": sequences})) == ["levels", "levels-AI+"]


def test_nested_documents_give_all_their_figures() -> None:
    audit = {
        "spectrum": {"sectors": SECTORS},
        "steady": {"magnetisation": [0.0, 0.1], "spin_current": [0.2]},
        "note": "kept",
    }
    assert sorted(figures_of(audit)) == ["spectrum", "spectrum-sectors", "steady-profile"]


@pytest.mark.parametrize("record", [{}, {"purity": 0.5}, {"sectors": []}])
def test_documents_without_figures_are_refused(record: dict[str, Any]) -> None:
    with pytest.raises(UsageError, match="nothing to draw"):
        figures_of(record)


def test_strangers_are_refused() -> None:
    with pytest.raises(UsageError, match="no figure of a int"):
        figures_of(3)
    with pytest.raises(UsageError, match="not numbers"):
        figures_of({"sectors": [{"label": "k=0", "eigenvalues": ["x"]}]})


def run_of(sectors: list[Any], results: dict[str, Any]) -> SimpleNamespace:
    return SimpleNamespace(
        run_id="spectrum-example",
        header=SimpleNamespace(model_name="example"),
        sectors=lambda: iter(sectors),
        results=lambda: tuple(results),
        result=lambda name: results[name],
    )


def test_figures_of_a_kept_run() -> None:
    levels = {"eigenvalues": np.array([0j, -1 + 1j])}
    steady = SimpleNamespace(
        document={"spin_current": None}, arrays={"magnetisation": np.array([0.1, 0.2])}
    )
    run = run_of(
        [(0, {"label": "k=0", "dimension": 2}, levels)], {"steady": steady, "again": steady}
    )
    assert sorted(figures_of_run(run)) == ["again-profile", "profile", "sectors", "spectrum"]
    with pytest.raises(UsageError, match="spectrum-example"):
        figures_of_run(run_of([], {}))


@pytest.mark.parametrize(
    ("value", "error", "text"),
    [
        (2.0134, 0.028, "2.01(3)"),
        (1.5, 0.0, "1.5"),
        (1.5, float("nan"), "1.5"),
        (345.2, 12.0, "345(12)"),
        (2.5, 0.97, "2(1)"),
        (2.513, 0.0996, "2.5(1)"),
        (1.0, 10.2, "1(10)"),
    ],
)
def test_values_with_uncertainty(value: float, error: float, text: str) -> None:
    assert with_uncertainty(value, error) == text


def test_intervals_and_names() -> None:
    assert interval_text(0.738, 0.733, 0.744) == "0.738 [0.733, 0.744]"
    assert interval_text(-0.24, -0.3, -0.2) == "\u22120.24 [\u22120.30, \u22120.20]"
    assert reference_label("1d-GOE") == "GOE"
    assert reference_label("A x2") == r"A $\times2$"


def test_html_table_escapes_and_nests() -> None:
    text = html_table(
        {
            "<b>": "a & b",
            "inner": {"x": 1.0 / 3.0},
            "list": list(range(20)),
            "records": [{"k": True}, {"m": None}],
            "z": 1 - 2j,
            "array": np.array([1.5]),
        },
        caption="<run>",
    )
    assert "<caption>&lt;run&gt;</caption>" in text
    assert "&lt;b&gt;" in text and "a &amp; b" in text and "<b>" not in text
    assert "0.333333" in text and "(20 in all)" in text and "1-2i" in text and "1.5" in text
    assert text.count("<table>") == text.count("</table>") == 3
