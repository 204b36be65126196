"""What cannot be kept is refused in one line that names it, and nothing is written."""

from __future__ import annotations

import errno
import os
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from lbwork.errors import StoreError
from lbwork.store import RunStore
from tests.store.examples import sector_arrays, start, write_rest


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"kind": "Spectrum!"}, "run kind 'Spectrum!'"),
        ({"kind": "../x"}, "run kind"),
        ({"identity": "abc"}, "identity 'abc' is not 64"),
        ({"options": {"step": float("nan")}}, "options.step is nan"),
        ({"options": {"step": [1.0, np.inf]}}, r"options.step\[1\] is inf"),
        ({"plan": [{"index": 1}, {"index": 1}]}, "names sector 1 2 times"),
        ({"plan": [{"index": -1}]}, "sector index -1 is not in"),
        ({"seed": 1.5}, "seed 1.5 is not a whole number"),
        ({"plan": "all"}, "the plan is a str"),
        ({"model_toml": "a\0b"}, "the model file holds a NUL"),
        ({"model_name": "\ud800"}, "the model name is not valid UTF-8 at character 1"),
    ],
)
def test_run_is_refused(tmp_path: Path, changes: dict[str, Any], words: str) -> None:
    with pytest.raises(StoreError, match=words):
        start(RunStore(tmp_path), **changes)
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(
    ("index", "metadata", "arrays", "words"),
    [
        (99, {}, {}, "sector 99 is not in the plan"),
        (-1, {}, {}, "sector index -1"),
        (0, {"a": np.nan}, {}, "sectors/000000.a is nan"),
        (0, [1], {}, "is a list; pass a dict"),
        (0, {}, {"eigenvalues": np.array([1j, np.nan])}, "eigenvalue 2 of sector 0 is"),
        (0, {}, {"eigenvalues": np.ones((2, 2)) * 1j}, r"eigenvalues of sector 0 are complex128"),
        (0, {}, {"eigenvalues": np.ones(3)}, "pass complex"),
        (0, {}, sector_arrays(0) | {"error_bounds": np.ones(2)}, "5 eigenvalues but error bounds"),
        (0, {}, sector_arrays(0) | {"parts": (1, 2)}, "add up to 3, not to its 5"),
        (0, {}, {"document": np.ones(2)}, "is named 'document'"),
        (0, {}, {"a/b": np.ones(2)}, "array name 'a/b'"),
        (0, {}, {"names": np.array(["a", "b"])}, "of type str"),
        (0, {}, {"objects": np.array([None])}, "of type object"),
        (0, {}, {"rows": [[1], [1, 2]]}, "rows of different lengths"),
    ],
)
def test_sector_is_refused(
    tmp_path: Path, index: int, metadata: Any, arrays: dict[str, Any], words: str
) -> None:
    run = start(RunStore(tmp_path))
    with pytest.raises(StoreError, match=words) as caught:
        run.write_sector(index, metadata, arrays)
    assert "\n" not in str(caught.value)
    assert run.finished_sectors() == ()
    assert list((tmp_path / f"{run.run_id}.parts").iterdir()) == []
    run.close()


def test_complete_needs_every_planned_sector(tmp_path: Path) -> None:
    run = start(RunStore(tmp_path))
    run.write_sector(0, {}, {})
    with pytest.raises(StoreError, match="sector 1 and 2 more of 4 are missing"):
        run.finish()
    with pytest.raises(StoreError, match="status 'done' is unknown; use complete"):
        run.finish("done")
    assert run.finish("failed").status == "failed"


def test_a_run_that_kept_nothing_is_not_complete(tmp_path: Path) -> None:
    with (
        pytest.raises(StoreError, match="neither sectors nor results"),
        start(RunStore(tmp_path), plan=[]),
    ):
        pass
    assert RunStore(tmp_path).list()[0].status == "unfinished"


def test_missing_records_are_named(tmp_path: Path) -> None:
    store = RunStore(tmp_path)
    with start(store) as run:
        with pytest.raises(StoreError, match="no finished sector '000003'"):
            run.read_sector(3)
        write_rest(run)
    with pytest.raises(StoreError, match="has no result 'level'; nearest: levels"):
        store.open(run.run_id).result("level")
    with pytest.raises(StoreError, match="has no sector '000009'"):
        store.open(run.run_id).sector(9)


def test_folders_that_cannot_be_used(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("x", encoding="utf-8")
    for folder, words in (
        (tmp_path / "a" / "b", "No such file"),
        (tmp_path / "file", "File exists"),
        (tmp_path / "file" / "runs", "Not a directory"),
    ):
        with pytest.raises(StoreError, match=f"cannot make folder .*{words}"):
            start(RunStore(folder))
        with pytest.raises(StoreError, match="cannot list run folder"):
            RunStore(folder).list()
        with pytest.raises(StoreError, match="cannot list run folder"):
            RunStore(folder).open("x")
    assert sorted(path.name for path in tmp_path.iterdir()) == ["file"]


def test_folder_that_is_read_only(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    opening = os.open

    def refusing(path: Any, flags: int, *mode: int) -> int:
        if flags & (os.O_WRONLY | os.O_RDWR):
            raise PermissionError(errno.EACCES, "Permission denied")
        return opening(path, flags, *mode)

    # A file mode would not stop the administrator, who may be running the tests.
    monkeypatch.setattr(os, "open", refusing)
    with pytest.raises(StoreError, match=r"cannot write '.*' \(Permission denied\); choose a run"):
        start(RunStore(tmp_path))


def test_parts_removed_under_a_writer(tmp_path: Path) -> None:
    run = start(RunStore(tmp_path))
    write_rest(run)
    (tmp_path / f"{run.run_id}.parts" / "sectors-000001.h5").unlink()
    with pytest.raises(StoreError, match=r"sectors-000001.h5' has vanished; resume run"):
        run.finish()
    run.close()
    with RunStore(tmp_path).resume(run.run_id) as again:
        assert again.missing_sectors() == (1,)
        write_rest(again)
