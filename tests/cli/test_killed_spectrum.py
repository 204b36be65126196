"""A spectrum run killed at random moments: finished sectors are kept, resuming changes no bit."""

import json
import signal
import time

import numpy as np
import pytest

from lbwork.store import RunStore
from tests.cli.command import start

MODEL = ("spectrum", "xx-dephasing", "--sites", "6", "--json")


def levels_of(folder, run_id):
    """Eigenvalues of every sector of a run, by index."""
    kept = RunStore(folder).open(run_id)
    return {index: arrays["eigenvalues"] for index, _, arrays in kept.sectors()}


@pytest.fixture(scope="module")
def undisturbed(tmp_path_factory):
    """An undisturbed run: folder, id, and seconds of a second one, when compilation is cached."""
    for name in ("first", "second"):
        folder = tmp_path_factory.mktemp(name)
        started = time.monotonic()
        process = start(*MODEL, cwd=folder)
        out, err = process.communicate(timeout=300)
        assert process.returncode == 0, err
    return folder, json.loads(out)["run"], time.monotonic() - started


def kill_after_first_sector(folder):
    """Start the run and kill it as soon as a sector is kept, however fast the machine is."""
    process = start(*MODEL, cwd=folder)
    while process.poll() is None:
        if any(folder.glob("runs/*.parts/*sector*")):
            process.send_signal(signal.SIGKILL)
            break
        time.sleep(0.005)
    process.communicate(timeout=60)
    return process.returncode == -signal.SIGKILL


def kill_once(folder, delay):
    """Start the run, kill it after a delay; True when it was killed before its end."""
    process = start(*MODEL, cwd=folder)
    try:
        process.communicate(timeout=delay)
        return False
    except Exception as error:
        assert type(error).__name__ == "TimeoutExpired"
        process.send_signal(signal.SIGKILL)
        process.communicate(timeout=60)
        return True


@pytest.mark.slow
def test_twenty_kills(undisturbed, tmp_path):
    reference_folder, reference_run, duration = undisturbed
    reference = levels_of(reference_folder / "runs", reference_run)
    random = np.random.default_rng(20)
    killed = 0
    for number, delay in enumerate(random.uniform(0.3 * duration, 1.02 * duration, size=20)):
        folder = tmp_path / f"kill-{number}"
        folder.mkdir()
        if not kill_once(folder, delay):
            continue
        killed += 1
        check_kept_and_resumed(folder, reference)
    assert killed >= 10


def test_one_kill(undisturbed, tmp_path):
    reference_folder, reference_run, _ = undisturbed
    reference = levels_of(reference_folder / "runs", reference_run)
    assert kill_after_first_sector(tmp_path)
    check_kept_and_resumed(tmp_path, reference)


def check_kept_and_resumed(folder, reference):
    """What is there opens and equals the reference; resuming completes it bit for bit."""
    runs = folder / "runs"
    if runs.is_dir():
        for summary in RunStore(runs).list():
            assert summary.status in ("unfinished", "complete")
            kept = levels_of(runs, summary.run_id)
            assert len(kept) == summary.sectors_done
            for index, levels in kept.items():
                assert levels.tobytes() == reference[index].tobytes()
    process = start(*MODEL, cwd=folder)
    out, err = process.communicate(timeout=300)
    assert process.returncode == 0, err
    resumed = levels_of(runs, json.loads(out)["run"])
    assert resumed.keys() == reference.keys()
    assert all(resumed[index].tobytes() == reference[index].tobytes() for index in reference)
