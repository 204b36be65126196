"""Every schema number ever written is read; newer ones are refused; old files can be upgraded."""

from __future__ import annotations

from pathlib import Path

import h5py
import numpy as np
import pytest

from lbwork.store import SCHEMA, NewerRunError, RunStore
from lbwork.store.migration import MIGRATIONS
from tests.store.examples import assert_identical, assert_whole, sector_arrays
from tests.store.golden.write_golden import GOLDEN


def test_each_number_has_a_golden_file_and_a_step() -> None:
    names = sorted(path.name for path in GOLDEN.glob("*.h5"))
    assert names == [f"schema-{number}.h5" for number in range(1, SCHEMA + 1)]
    assert sorted(MIGRATIONS) == [(number, number + 1) for number in range(1, SCHEMA)]


@pytest.mark.parametrize("number", range(1, SCHEMA + 1))
def test_golden_file_is_read(number: int) -> None:
    store = RunStore(GOLDEN)
    place = GOLDEN / f"schema-{number}.h5"
    before = place.read_bytes()
    run = store.open(f"schema-{number}")
    assert_whole(run)
    assert run.summary.schema == number
    assert run.verify() == 6
    assert place.read_bytes() == before
    assert [summary.status for summary in store.list()] == ["complete"] * SCHEMA


def test_schema_1_kept_complex_numbers_as_a_compound() -> None:
    with h5py.File(GOLDEN / "schema-1.h5") as file:
        assert int(file.attrs["schema"]) == 1
        assert file["sectors/000000/eigenvalues"].dtype == np.complex128
        assert file["results/levels/used"].dtype == np.bool_


def test_upgrade_rewrites_the_file_once(tmp_path: Path) -> None:
    place = tmp_path / "old.h5"
    place.write_bytes((GOLDEN / "schema-1.h5").read_bytes())
    store = RunStore(tmp_path)
    assert store.upgrade("old") == ("complex numbers as pairs",)
    assert store.upgrade("old") == ()
    run = store.open("old")
    assert_whole(run)
    assert run.summary.schema == SCHEMA
    with h5py.File(place) as file:
        assert file["sectors/000000/eigenvalues"].shape == (5, 2)
    assert [path.name for path in tmp_path.iterdir()] == ["old.h5"]


def test_unfinished_run_of_an_old_schema_is_resumed(tmp_path: Path) -> None:
    with h5py.File(GOLDEN / "schema-1.h5") as old, h5py.File(tmp_path / "old.h5", "w") as header:
        header.attrs.update(old.attrs)
        for name in ("model", "options", "plan", "provenance"):
            old.copy(name, header)
        for name in ("sectors", "results", "figures", "resumptions"):
            header.create_group(name)
        (tmp_path / "old.parts").mkdir()
        for family, names in (("sectors", old["sectors"]), ("results", old["results"])):
            for name in names:
                with h5py.File(tmp_path / "old.parts" / f"{family}-{name}.h5", "w") as part:
                    part.attrs.update(old.attrs)
                    old.copy(old[family][name], part.create_group(family), name)
    store = RunStore(tmp_path)
    (summary,) = store.list()
    assert (summary.status, summary.schema, summary.sectors_done) == ("unfinished", 1, 4)
    with store.resume("old") as run:
        assert run.missing_sectors() == ()
        assert_identical(run.read_sector(3).arrays, sector_arrays(3))
        run.attach_figure("spectrum.pdf", b"%PDF-\x00\xff")
    assert_whole(store.open("old"))
    assert store.open("old").summary.schema == SCHEMA


def test_newer_schema_is_refused(tmp_path: Path) -> None:
    place = tmp_path / "later.h5"
    place.write_bytes((GOLDEN / f"schema-{SCHEMA}.h5").read_bytes())
    with h5py.File(place, "r+") as file:
        file.attrs["schema"] = SCHEMA + 1
        file.attrs["lbwork_version"] = "9.1"
    store = RunStore(tmp_path)
    (summary,) = store.list()
    assert (summary.status, summary.readable) == ("newer", False)
    for use in (store.open, store.resume, store.upgrade):
        with pytest.raises(
            NewerRunError, match=r"written by lbwork 9.1; .* up to schema 2"
        ) as error:
            use("later")
        assert "\n" not in str(error.value)
        assert "install a newer one" in str(error.value)
