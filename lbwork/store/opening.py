"""Opening files of the store read-only, at the current schema, with one error for every damage."""

from __future__ import annotations

import contextlib
import io
from collections.abc import Iterator
from pathlib import Path
from typing import Final

import h5py

from lbwork.errors import StoreError
from lbwork.store.durable import in_memory
from lbwork.store.migration import NewerRunError, migrate, schema_of
from lbwork.store.schema import SCHEMA

__all__ = ["STORED_SCHEMA", "DamagedRunError", "damage_named", "opened"]

STORED_SCHEMA: Final = "stored_schema"
"""Root attribute, in memory only, of a migrated file: the schema number it has on the disk."""

# What the HDF5 library and NumPy raise on broken content, one way or another.
_FAILURES = (
    OSError,
    LookupError,
    ValueError,
    TypeError,
    RuntimeError,
    MemoryError,
    OverflowError,
)


class DamagedRunError(StoreError):
    """A file of the store is not readable, wholly or in part; ``reason`` is the bare cause."""

    def __init__(self, path: Path, reason: str) -> None:
        super().__init__(
            f"'{path}' is damaged: {reason}; it is left as it is, repeat the run or restore a copy"
        )
        self.reason = reason


@contextlib.contextmanager
def opened(path: Path) -> Iterator[h5py.File]:
    """The file at ``path``, read-only; one of an older schema is migrated in memory.

    Raises FileNotFoundError when there is none, NewerRunError for a newer schema, and
    DamagedRunError for any failure of reading, here or while the block runs.
    """
    with damage_named(path):
        _look_at(path)
        # No HDF5 lock: files are replaced, never written in place, and a reader must not be able
        # to disturb a writer.
        with h5py.File(path, "r", locking=False) as file:
            current = schema_of(file) == SCHEMA
            if current:
                yield file
        if not current:
            with in_memory(io.BytesIO(path.read_bytes())) as file:
                stored = schema_of(file)
                migrate(file)
                file.attrs[STORED_SCHEMA] = stored
                yield file


@contextlib.contextmanager
def damage_named(path: Path) -> Iterator[None]:
    """Turn whatever reading a broken file raises into a DamagedRunError that names ``path``."""
    try:
        yield
    except (FileNotFoundError, DamagedRunError):
        raise
    except NewerRunError as error:
        raise NewerRunError(f"'{path}' cannot be read: {error}") from None
    except _FAILURES as error:
        raise DamagedRunError(path, _reason(error)) from error


def _look_at(path: Path) -> None:
    if path.is_dir():
        raise StoreError("it is a folder")
    if path.stat().st_size == 0:
        raise StoreError("it is empty")
    with open(path, "rb") as stream:
        signature = stream.read(8)
    if signature != b"\x89HDF\r\n\x1a\n":
        raise StoreError("it is not an HDF5 file")


def _reason(error: BaseException) -> str:
    if isinstance(error, MemoryError):
        return "it asks for more memory than there is"
    words = error.args[0] if isinstance(error, KeyError) and error.args else error
    return str(words).strip().splitlines()[0][:200] if str(words).strip() else "it cannot be read"
