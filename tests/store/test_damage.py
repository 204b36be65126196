"""Damaged files are listed with the reason, refused when opened, never fatal and never changed."""

from __future__ import annotations

import random
import time
from collections.abc import Callable
from pathlib import Path

import h5py
import numpy as np
import pytest

from lbwork.errors import StoreError
from lbwork.store import DamagedRunError, RunStore
from tests.store.examples import assert_sectors, assert_whole, sector_arrays, start, write_rest


def edited(change: Callable[[h5py.File], None]) -> Callable[[Path], None]:
    """A damage that edits the file through HDF5."""

    def damage(path: Path) -> None:
        with h5py.File(path, "r+") as file:
            change(file)

    return damage


def truncated(path: Path) -> None:
    path.write_bytes(path.read_bytes()[:-1000])


def headed_only(path: Path) -> None:
    path.write_bytes(path.read_bytes()[:10])


def empty(path: Path) -> None:
    path.write_bytes(b"")


def random_bytes(path: Path) -> None:
    path.write_bytes(random.Random(1).randbytes(5000))


def text(path: Path) -> None:
    path.write_text("eigenvalues: none\n", encoding="utf-8")


def folder(path: Path) -> None:
    path.unlink()
    path.mkdir()


def foreign(path: Path) -> None:
    path.unlink()
    with h5py.File(path, "w") as file:
        file["data"] = np.arange(3)


def flipped_in_text(path: Path) -> None:
    content = path.read_bytes()
    assert content.count(b"delta = 0.5") == 1
    path.write_bytes(content.replace(b"delta = 0.5", b"delta = 0.7"))


def without_options(file: h5py.File) -> None:
    del file["options"]


def without_sectors(file: h5py.File) -> None:
    del file["sectors"]


def with_data_for_text(file: h5py.File) -> None:
    del file["plan/json"]
    file["plan/json"] = np.arange(5)


def without_marker(file: h5py.File) -> None:
    del file["completion"].attrs["complete"]


def with_strange_status(file: h5py.File) -> None:
    file["completion"].attrs["status"] = "splendid"


def without_schema(file: h5py.File) -> None:
    del file.attrs["schema"]


def with_schema_zero(file: h5py.File) -> None:
    file.attrs["schema"] = 0


def with_schema_word(file: h5py.File) -> None:
    file.attrs["schema"] = "two"


def without_identity(file: h5py.File) -> None:
    del file["model/identity"]


def without_one_sector(file: h5py.File) -> None:
    del file["sectors/000001"]


def without_listing(file: h5py.File) -> None:
    del file.attrs["listing"]


def with_strange_listing(file: h5py.File) -> None:
    file.attrs["listing"] = file.attrs["listing"].replace("complete", "splendid")


def with_listing_of_another_form(file: h5py.File) -> None:
    file.attrs["listing"] = "[1]"


LISTED = [
    (truncated, "truncated file"),
    (headed_only, ""),
    (empty, "it is empty"),
    (random_bytes, "it is not an HDF5 file"),
    (text, "it is not an HDF5 file"),
    (folder, "it is a folder"),
    (foreign, "not a run of lbwork"),
    (edited(without_options), "no group 'options'"),
    (edited(without_sectors), "no group 'sectors'"),
    (edited(without_marker), "completion has no marker"),
    (edited(without_schema), "not a run of lbwork"),
    (edited(with_schema_zero), "schema number 0 does not exist"),
    (edited(with_schema_word), "two"),
    (edited(without_listing), "no attribute 'listing'"),
    (edited(with_listing_of_another_form), "its listing is a list"),
    (edited(with_strange_listing), "its listing does not match"),
]

# Too deep to be looked at for a list; found when the run is opened.
OPENED = [
    (flipped_in_text, "does not match its SHA-256"),
    (edited(with_data_for_text), "no text 'plan/json'"),
    (edited(with_strange_status), "its listing does not match"),
    (edited(without_identity), "no text 'model/identity'"),
    (edited(without_one_sector), "its listing does not match"),
]


@pytest.fixture(scope="module")
def whole(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    """The bytes of a finished run."""
    place = tmp_path_factory.mktemp("whole")
    with start(RunStore(place)) as run:
        write_rest(run)
    return (place / f"{run.run_id}.h5").read_bytes()


@pytest.mark.parametrize(("damage", "words"), LISTED + OPENED)
def test_damaged_file(
    tmp_path: Path, whole: bytes, damage: Callable[[Path], None], words: str
) -> None:
    (tmp_path / "good.h5").write_bytes(whole)
    broken = tmp_path / "broken.h5"
    broken.write_bytes(whole)
    damage(broken)
    before = broken.read_bytes() if broken.is_file() else b""
    store = RunStore(tmp_path)
    found = {summary.run_id: summary for summary in store.list()}
    assert found["good"].status == "complete"
    if (damage, words) in LISTED:
        assert (found["broken"].status, found["broken"].readable) == ("damaged", False)
        assert words in found["broken"].reason
        assert found["broken"].reason
    for use in (store.open, store.resume):
        with pytest.raises(DamagedRunError, match=r"broken.h5' is damaged: ") as caught:
            use("broken")
        assert "\n" not in str(caught.value)
        assert words in str(caught.value)
    # A new run tidies the folder, but damaged files are no litter.
    with start(store) as run:
        write_rest(run)
    assert (broken.read_bytes() if broken.is_file() else b"") == before


def test_bit_flipped_in_data(tmp_path: Path, whole: bytes) -> None:
    place = tmp_path / "flipped.h5"
    target = sector_arrays(1)["eigenvalues"][1].tobytes()
    assert whole.count(target) == 1
    place.write_bytes(whole.replace(target, bytes([target[0] ^ 1]) + target[1:]))
    run = RunStore(tmp_path).open("flipped")
    assert run.summary.status == "complete"
    with pytest.raises(DamagedRunError, match="sectors/000001 does not match its SHA-256"):
        run.verify()
    assert run.sector(0).document["dimension"] == 5


def test_hundreds_of_random_damages_are_never_fatal(tmp_path: Path, whole: bytes) -> None:
    source = random.Random(5)
    for count in range(300):
        content = bytearray(whole)
        for _ in range(source.choice([1, 4, 40])):
            content[source.randrange(len(content))] ^= source.randrange(1, 256)
        if count % 4 == 0:
            del content[source.randrange(len(content)) :]
        (tmp_path / f"run-{count:03d}.h5").write_bytes(content)
    (tmp_path / "whole.h5").write_bytes(whole)
    store = RunStore(tmp_path)
    found = store.list()
    assert len(found) == 301
    statuses = {summary.status for summary in found}
    assert statuses <= {"damaged", "newer", "complete", "unfinished"}
    sound = 0
    for summary in found:
        if not summary.readable:
            assert summary.reason
            continue
        try:
            run = store.open(summary.run_id)
            run.verify()
            sound += 1
            assert run.missing_sectors() == () or summary.status == "unfinished"
        except DamagedRunError:
            assert summary.run_id != "whole"
    # Beside the whole file, only flips of bytes that mean nothing may go unnoticed.
    assert 1 <= sound < 100


def test_damaged_part_is_set_aside_and_computed_again(tmp_path: Path) -> None:
    store = RunStore(tmp_path)
    run = start(store)
    write_rest(run)
    run.close()
    part = tmp_path / f"{run.run_id}.parts" / "sectors-000002.h5"
    part.write_bytes(part.read_bytes()[:-400])
    with pytest.raises(DamagedRunError, match=r"sectors-000002.h5' is damaged"):
        list(store.open(run.run_id).sectors())
    with store.resume(run.run_id) as again:
        assert again.missing_sectors() == (2,)
        write_rest(again)
    assert_whole(store.open(run.run_id))
    assert [one.name for one in part.parent.iterdir()] == ["sectors-000002.h5.damaged"]
    start(store).close()
    assert [one.name for one in part.parent.iterdir()] == ["sectors-000002.h5.damaged"]
    assert [one.status for one in store.list()] == ["complete", "unfinished"]


def test_run_file_removed_beside_its_parts(tmp_path: Path) -> None:
    store = RunStore(tmp_path)
    run = start(store)
    run.write_sector(0, {}, sector_arrays(0))
    run.close()
    (tmp_path / f"{run.run_id}.h5").unlink()
    (summary,) = store.list()
    assert (summary.status, summary.run_id) == ("damaged", run.run_id)
    assert "the run file is missing; finished records are in" in summary.reason
    with pytest.raises(StoreError, match="no run"):
        store.open(run.run_id)
    second = start(store)
    second.close()
    assert (tmp_path / f"{run.run_id}.parts" / "sectors-000000.h5").exists()


def test_hundreds_of_runs_are_listed_quickly(tmp_path: Path, whole: bytes) -> None:
    for count in range(400):
        (tmp_path / f"run-{count:03d}.h5").write_bytes(whole)
    begun = time.process_time()
    found = RunStore(tmp_path).list()
    assert len(found) == 400
    assert {summary.status for summary in found} == {"complete"}
    assert time.process_time() - begun < 6.0
    begun = time.process_time()
    assert RunStore(tmp_path).find("run-399") == "run-399"
    assert time.process_time() - begun < 0.1


def test_leftovers_of_a_killed_fold_do_not_matter(tmp_path: Path, whole: bytes) -> None:
    store = RunStore(tmp_path)
    run = start(store)
    write_rest(run)
    run.close()
    place = tmp_path / f"{run.run_id}.parts" / f"{run.run_id}.h5.tmp"
    place.write_bytes(whole[: len(whole) // 2])
    assert_sectors(store.open(run.run_id), [0, 1, 2, 3])
    with store.resume(run.run_id) as again:
        assert not place.exists()
        assert again.missing_sectors() == ()
        write_rest(again)
    assert_whole(store.open(run.run_id))
