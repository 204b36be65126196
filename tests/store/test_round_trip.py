"""What goes into a run comes out of it, bit by bit, through this package and through plain HDF5."""

from __future__ import annotations

import json
from pathlib import Path

import h5py
import numpy as np
import pytest

import lbwork
from lbwork.errors import StoreError
from lbwork.store import SCHEMA, RunStore
from tests.store.examples import (
    IDENTITY,
    SECTORS,
    assert_identical,
    assert_sectors,
    assert_whole,
    plan,
    sector_arrays,
    sector_metadata,
    start,
    write_rest,
    write_results,
)


def test_finished_run(tmp_path: Path) -> None:
    store = RunStore(tmp_path / "runs")
    with start(store) as run:
        assert run.missing_sectors() == tuple(range(SECTORS))
        write_rest(run)
    assert_whole(store.open(run.run_id))
    assert [path.name for path in store.folder.iterdir()] == [run.run_id + ".h5"]
    summary = store.open(run.run_id).summary
    assert (summary.kind, summary.model_name, summary.seed) == ("spectrum", "σ-chain", 7)
    assert (summary.sectors_done, summary.sectors_planned) == (SECTORS, SECTORS)
    assert (summary.schema, summary.version) == (SCHEMA, lbwork.__version__)
    assert summary.wall_time > 0
    assert summary.peak_memory > 1_000_000
    assert summary.created <= summary.finished
    assert store.open(run.run_id).provenance["versions"]["numpy"] == np.__version__
    assert store.open(run.run_id).verify() == SECTORS + 2
    assert json.loads(json.dumps(summary.to_dict()))["results"] == ["levels"]


def test_plain_hdf5_reading(tmp_path: Path) -> None:
    with start(RunStore(tmp_path)) as run:
        write_rest(run)
    with h5py.File(tmp_path / f"{run.run_id}.h5") as file:
        pairs = file["sectors/000001/eigenvalues"]
        assert (pairs.dtype, pairs.shape) == (np.float64, (6, 2))
        assert (pairs[:, 0] == sector_arrays(1)["eigenvalues"].real).all()
        assert (pairs[:, 1] == sector_arrays(1)["eigenvalues"].imag).all()
        assert file["results/levels/used"].dtype == np.uint8
        assert json.loads(file["plan/json"].asstr()[()]) == plan()
        assert file["completion"].attrs["status"] == "complete"
        kinds = set()
        file.visititems(
            lambda _, item: kinds.add(item.dtype.kind if hasattr(item, "dtype") else "g")
        )
        # Groups, floats, integers, bytes and text: nothing made up on the fly.
        assert kinds == {"g", "f", "i", "u", "O"}


def test_unfinished_run_is_readable_and_resumes(tmp_path: Path) -> None:
    store = RunStore(tmp_path)
    with pytest.raises(KeyError), start(store) as run:
        run.write_sector(2, sector_metadata(2), sector_arrays(2))
        raise KeyError("a bug elsewhere")
    (summary,) = store.list()
    assert (summary.status, summary.sectors_done, summary.finished) == ("unfinished", 1, "")
    assert_sectors(store.open(run.run_id), [2])
    assert_identical(store.open(run.run_id).sector(2).arrays, sector_arrays(2))
    with store.resume(run.run_id) as second:
        assert (second.finished_sectors(), second.missing_sectors()) == ((2,), (0, 1, 3))
        assert_identical(second.read_sector(2).arrays, sector_arrays(2))
        assert (second.plan, second.header) == (plan(), run.header)
        write_rest(second)
    kept = store.open(run.run_id)
    assert_whole(kept)
    assert [one.name for one in kept.resumptions()] == ["002"]
    assert kept.resumptions()[0].document["versions"]["h5py"] == h5py.__version__
    with pytest.raises(StoreError, match="has ended; start a new one"):
        store.resume(run.run_id)


def test_reader_follows_a_run_into_its_final_file(tmp_path: Path) -> None:
    store = RunStore(tmp_path)
    run = start(store)
    run.write_sector(0, sector_metadata(0), sector_arrays(0))
    early = store.open(run.run_id)
    under_way = early.sectors()
    write_rest(run)
    assert next(under_way)[0] == 0
    run.finish()
    assert [index for index, _, _ in under_way] == [1, 2, 3]
    assert_sectors(early, list(range(SECTORS)))
    assert_identical(early.sector(0).arrays, sector_arrays(0))


def test_resumable_run_is_found_by_its_task(tmp_path: Path) -> None:
    store = RunStore(tmp_path / "runs")
    task = {"identity": IDENTITY, "options": {"b": 1, "a": 2.0}, "plan": plan(), "seed": 7}
    assert store.find_resumable("spectrum", **task) is None
    run = start(store, options={"a": 2.0, "b": 1})
    run.close()
    assert store.find_resumable("spectrum", **task) == run.run_id
    for change in (
        {"identity": "f" * 64},
        {"options": {"a": 2.5, "b": 1}},
        {"plan": plan(2)},
        {"seed": 8},
    ):
        assert store.find_resumable("spectrum", **(task | change)) is None
    assert store.find_resumable("levels", **task) is None
    with store.resume(run.run_id) as second:
        write_rest(second)
    assert store.find_resumable("spectrum", **task) is None


def test_runs_started_in_one_second_get_names_of_their_own(tmp_path: Path) -> None:
    store = RunStore(tmp_path)
    runs = [start(store) for _ in range(3)]
    assert len({run.run_id for run in runs}) == 3
    for run in runs:
        run.close()


@pytest.mark.parametrize("name", ["../../etc/passwd", "", "...", "a/b c", "x" * 300, "-"])
def test_any_model_name_makes_a_plain_file_name(tmp_path: Path, name: str) -> None:
    store = RunStore(tmp_path / "runs")
    with start(store, model_name=name) as run:
        write_rest(run)
    assert [path.name for path in tmp_path.iterdir()] == ["runs"]
    assert store.open(run.run_id).header.model_name == name


def test_find_by_prefix(tmp_path: Path) -> None:
    store = RunStore(tmp_path)
    for kind in ("gap", "steady"):
        with start(store, kind=kind, model_name="ising", plan=[]) as run:
            run.write_result(kind, {})
    assert store.find("steady") == run.run_id
    assert store.find(run.run_id + ".h5") == run.run_id
    with start(store, kind="gap", model_name="ising", plan=[]) as run:
        run.write_result("gap", {})
    with pytest.raises(StoreError, match="fits 2 runs, write more of it: gap-ising"):
        store.find("gap")
    with pytest.raises(StoreError, match=r"no run 'stady-ising.*nearest: steady-ising"):
        store.find("stady-ising-01234567")
    with pytest.raises(StoreError, match="it holds 3 runs"):
        store.find("")


def test_seed_of_128_bits_and_no_seed(tmp_path: Path) -> None:
    store = RunStore(tmp_path)
    for seed in (2**127 + 1, 0, None):
        with start(store, seed=seed) as run:
            write_rest(run)
        assert store.open(run.run_id).header.seed == seed
        assert store.open(run.run_id).summary.seed == seed


def test_large_plan_and_awkward_text(tmp_path: Path) -> None:
    store = RunStore(tmp_path)
    wide = {"sectors": plan(2000), "note": "line\r\n\ttab \u2028 \U0001f9ea \x01"}
    with start(store, plan=wide) as run:
        write_results(run)
        run.finish("uncertified")
    assert store.open(run.run_id).plan == wide
    assert store.open(run.run_id).summary.status == "uncertified"
    assert store.open(run.run_id).summary.sectors_planned == 2000


def test_result_may_be_redone_and_sector_not(tmp_path: Path) -> None:
    store = RunStore(tmp_path)
    with start(store) as run:
        write_rest(run)
        run.write_result("levels", {"verdict": "A"})
        with pytest.raises(StoreError, match=r"sector 0 of run .* is finished already"):
            run.write_sector(0, {}, {})
    assert store.open(run.run_id).result("levels").document == {"verdict": "A"}
