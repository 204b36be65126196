"""A kill -9 at any moment loses the record in hand at most, and the run resumes to the same end."""

from __future__ import annotations

import os
import random
import subprocess
import sys
import time
from pathlib import Path

import pytest

from lbwork.errors import StoreError
from lbwork.store import LockedRunError, RunStore
from lbwork.store.housekeeping import sweep
from tests.store.examples import SECTORS, assert_sectors, assert_whole, start, write_rest

ROOT = Path(__file__).resolve().parents[2]


def writer_process(*arguments: str) -> subprocess.Popen[str]:
    environment = os.environ | {"PYTHONPATH": str(ROOT), "OMP_NUM_THREADS": "1"}
    return subprocess.Popen(
        [sys.executable, "-m", "tests.store.killed_writer", *arguments],
        cwd=ROOT,
        env=environment,
        stdout=subprocess.PIPE,
        text=True,
    )


def resume_and_check(folder: Path, said: list[str]) -> str:
    """Check what a killed writer left in ``folder``, resume it and return the status it had."""
    store = RunStore(folder)
    runs = store.list() if folder.exists() else ()
    if not runs:
        assert said == []
        return "absent"
    (summary,) = runs
    run = store.open(summary.run_id)
    finished = [index for index, _, _ in run.sectors()]
    announced = sum(word.isdigit() for word in said)
    # One sector can be on the disk before the writer could say so.
    assert len(finished) in (announced, announced + 1)
    assert_sectors(run, list(range(len(finished))))
    if summary.status != "complete":
        assert summary.status == "unfinished"
        assert summary.sectors_done == len(finished)
        with store.resume(summary.run_id) as writer:
            assert writer.finished_sectors() == tuple(finished)
            write_rest(writer)
    assert_whole(store.open(summary.run_id))
    return summary.status


def test_killed_before_each_change_of_the_disk(tmp_path: Path) -> None:
    with writer_process("steps", str(tmp_path)) as process:
        process.communicate(timeout=60)
    assert process.returncode == 0
    places = sorted(tmp_path.iterdir())
    # Header, sectors, result, figure and the fold: at least three changing calls each.
    assert len(places) > 3 * (SECTORS + 4)
    seen = set()
    for place in places:
        said = (place / "said").read_text(encoding="utf-8").split()
        seen.add(resume_and_check(place / "runs", said))
        if (place / "runs").exists():
            # What the killed writer left behind is cleared when the next run is created.
            sweep(place / "runs")
            assert {path.suffix for path in (place / "runs").iterdir()} <= {".h5"}
    assert seen == {"absent", "unfinished", "complete"}


@pytest.mark.parametrize("seed", range(20))
def test_killed_at_a_random_moment(tmp_path: Path, seed: int) -> None:
    delay = random.Random(seed).uniform(0.0, 0.15)
    folder = tmp_path / "runs"
    with writer_process("slowly", str(folder), str(seed)) as process:
        first = process.stdout.readline().split()
        time.sleep(delay)
        process.kill()
        said = first + process.stdout.read().split()
    # "created" has been said, so there is a run; the clock decides how far it got.
    assert resume_and_check(folder, said) in ("unfinished", "complete")


def test_second_process_is_refused_and_readers_are_not(tmp_path: Path) -> None:
    store = RunStore(tmp_path / "runs")
    with start(store) as run:
        attempt = (
            "import sys; from lbwork.store import RunStore, LockedRunError\n"
            "store = RunStore(sys.argv[1])\n"
            "assert store.list()[0].status == 'running'\n"
            "assert store.open('spectrum').missing_sectors()[0] == 0\n"
            "try:\n    store.resume('spectrum')\n"
            "except LockedRunError as error:\n    print(error)\n"
        )
        answer = subprocess.run(
            [sys.executable, "-c", attempt, str(store.folder)],
            env=os.environ | {"PYTHONPATH": str(ROOT)},
            capture_output=True,
            text=True,
            check=True,
        )
        assert f"being written by process {os.getpid()} on" in answer.stdout
        assert answer.stdout.count("\n") == 1
        write_rest(run)
    assert_whole(store.open(run.run_id))


def test_writers_in_one_folder_do_not_meet(tmp_path: Path) -> None:
    folder = tmp_path / "runs"
    processes = [writer_process("slowly", str(folder), str(seed)) for seed in range(3)]
    for process in processes:
        said, _ = process.communicate(timeout=60)
        assert said.split()[-1] == "finished"
    store = RunStore(folder)
    assert len(store.list()) == 3
    for summary in store.list():
        assert_whole(store.open(summary.run_id))


def test_second_writer_of_the_same_process_is_refused(tmp_path: Path) -> None:
    store = RunStore(tmp_path)
    run = start(store)
    with pytest.raises(LockedRunError, match="is being written"):
        store.resume(run.run_id)
    assert (
        store.find_resumable(
            "spectrum", identity=run.header.identity, options=run.options, plan=run.plan, seed=7
        )
        is None
    )
    run.close()
    second = store.resume(run.run_id)
    with pytest.raises(StoreError, match="is closed"):
        write_rest(run)
    second.close()


def test_full_disk_leaves_the_run_as_it_was(tmp_path: Path) -> None:
    limited = (
        "import resource, signal, sys\n"
        "from lbwork.errors import StoreError\n"
        "from lbwork.store import RunStore\n"
        "from tests.store.examples import *\n"
        "signal.signal(signal.SIGXFSZ, signal.SIG_IGN)\n"
        "run = start(RunStore(sys.argv[1]))\n"
        "run.write_sector(0, sector_metadata(0), sector_arrays(0))\n"
        "resource.setrlimit(resource.RLIMIT_FSIZE, (30_000, 30_000))\n"
        "try:\n    run.write_result('big', {}, {'a': np.zeros(100_000)})\n"
        "except StoreError as error:\n    print(error)\n"
        "run.write_sector(1, sector_metadata(1), sector_arrays(1))\n"
        "run.close()\n"
    )
    answer = subprocess.run(
        [sys.executable, "-c", limited, str(tmp_path)],
        env=os.environ | {"PYTHONPATH": str(ROOT)},
        capture_output=True,
        text=True,
        check=True,
    )
    assert "cannot write" in answer.stdout
    assert answer.stderr == ""
    store = RunStore(tmp_path)
    assert_sectors(store.open("spectrum"), [0, 1])
    with store.resume("spectrum") as run:
        write_rest(run)
    assert_whole(store.open("spectrum"))
