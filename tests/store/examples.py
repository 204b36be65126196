"""Runs with known content, shared by the tests of the store."""

from __future__ import annotations

from typing import Any

import numpy as np

from lbwork.store import RunFile, RunStore, RunWriter

SECTORS = 4
IDENTITY = "0123456789abcdef" * 4
TOML = 'name = "σ-chain"\r\n[parameters]\ndelta = 0.5\n'
OPTIONS = {"tolerance": 1e-10, "window": [0.0, 2.5], "figures": True}


def plan(sectors: int = SECTORS) -> list[dict[str, Any]]:
    """A plan of ``sectors`` sectors."""
    return [{"index": k, "label": f"m={k}", "dimension": 5 + k} for k in range(sectors)]


def start(store: RunStore, **changes: Any) -> RunWriter:
    """Start the example run, with some arguments changed."""
    arguments: dict[str, Any] = {
        "kind": "spectrum",
        "model_name": "σ-chain",
        "model_toml": TOML,
        "canonical_json": '{"sites": 4}',
        "identity": IDENTITY,
        "options": OPTIONS,
        "plan": plan(),
        "seed": 7,
    }
    return store.create(**(arguments | changes))


def sector_metadata(index: int) -> dict[str, Any]:
    """Metadata of one sector: text, numbers, None and nesting."""
    certificate = {"residual": 1.5e-13 * (index + 1), "passed": True, "note": None}
    return {"label": f"m={index} (σ^z)", "dimension": 5 + index, "certificate": certificate}


def sector_arrays(index: int) -> dict[str, np.ndarray]:
    """Arrays of one sector, with signed zeros and an infinite bound to keep exactly."""
    source = np.random.default_rng(index)
    size = 5 + index
    eigenvalues = source.normal(size=size) + 1j * source.normal(size=size)
    eigenvalues[0] = complex(-0.0, -0.0)
    bounds = source.random(size)
    bounds[-1] = np.inf
    return {"eigenvalues": eigenvalues, "error_bounds": bounds, "parts": np.array([2, 3 + index])}


def result_arrays() -> dict[str, np.ndarray]:
    """Arrays of the example result: every kind of number that is kept."""
    return {
        "density": np.array([[0.5, 0.25j], [-0.25j, 0.5]]),
        "single": np.array([1 + 2j, -0.0j], dtype=np.complex64),
        "used": np.array([True, False, True]),
        "counts": np.arange(4, dtype=np.int16),
        "empty": np.zeros((0, 3)),
        "scalar": np.array(2.5),
        "scalar_complex": np.array(2.5 - 1j),
    }


def write_results(run: RunWriter) -> None:
    """Write the example result and figure."""
    run.write_result("levels", {"verdict": "AI+", "mean_ratio": {"value": 0.72}}, result_arrays())
    run.attach_figure("spectrum.pdf", b"%PDF-\x00\xff")


def write_rest(run: RunWriter) -> None:
    """Write every sector that is missing, the result and the figure."""
    for index in run.missing_sectors():
        run.write_sector(index, sector_metadata(index), sector_arrays(index))
    write_results(run)


def assert_identical(actual: Any, expected: Any) -> None:
    """Two dicts of arrays agree in names, types, shapes and every bit."""
    assert sorted(actual) == sorted(expected)
    for name, array in expected.items():
        assert actual[name].dtype == array.dtype
        assert actual[name].shape == array.shape
        assert actual[name].tobytes() == array.tobytes()


def assert_sectors(run: RunFile, indices: list[int]) -> None:
    """The run holds these sectors and no other, bit by bit."""
    found = list(run.sectors())
    assert [index for index, _, _ in found] == indices
    for index, metadata, arrays in found:
        assert metadata == sector_metadata(index)
        assert_identical(arrays, sector_arrays(index))


def assert_whole(run: RunFile) -> None:
    """The run is the finished example run, bit by bit."""
    assert run.summary.status == "complete"
    assert run.missing_sectors() == ()
    assert_sectors(run, list(range(SECTORS)))
    assert run.results() == ("levels",)
    assert run.result("levels").document == {"verdict": "AI+", "mean_ratio": {"value": 0.72}}
    assert_identical(run.result("levels").arrays, result_arrays())
    assert run.figures() == ("spectrum.pdf",)
    assert run.figure("spectrum.pdf") == b"%PDF-\x00\xff"
    assert (run.model_toml, run.options, run.plan) == (TOML, OPTIONS, plan())
    assert (run.canonical_json, run.header.identity) == ('{"sites": 4}', IDENTITY)
    assert run.header.seed == 7
