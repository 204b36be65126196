"""Bytes that are on the disk under their final name, or not there at all.

HDF5 never writes to the disk here: a full disk or a kill in mid-flush leaves a broken file, and the
library can even take the process down with it. A file is built in memory, its image is written to a
temporary name, forced to the disk, and renamed over the target; the folder entry is forced as well.
The price is memory for one file image, which is small beside the matrices that were diagonalised.
"""

from __future__ import annotations

import contextlib
import io
import os
from pathlib import Path

import h5py

from lbwork.errors import StoreError

__all__ = ["TEMPORARY", "force_folder", "in_memory", "make_folder", "replace_file"]

TEMPORARY = ".tmp"
"""Suffix of files that are not finished; a leftover of a killed process is worthless."""


def in_memory(content: io.BytesIO) -> h5py.File:
    """A writable HDF5 file over the bytes of ``content``, a new one when there are none.

    The bytes are a whole file again once the returned file is closed; an image taken of an open
    file has, with HDF5 1.14, a checksum that is not its own. The format of HDF5 1.8 is asked for:
    every tool in use reads it, and unlike older ones it has checksums on its own book-keeping, so
    that a damaged file is found before it is believed.
    """
    mode = "r+" if content.getbuffer().nbytes else "w"
    return h5py.File(content, mode, libver=("v108", "v108"))


def replace_file(target: Path, image: bytes, workshop: Path) -> None:
    """Put ``image`` under the name ``target``, all or nothing.

    ``workshop`` is the folder, on the same file system, of the temporary file. Raises StoreError
    when the disk is full or not writable; the target is then what it was.
    """
    temporary = workshop / (target.name + TEMPORARY)
    try:
        with open(temporary, "wb") as stream:
            stream.write(image)
            stream.flush()
            os.fsync(stream.fileno())
        os.replace(temporary, target)
        force_folder(target.parent)
    except OSError as error:
        with contextlib.suppress(OSError):
            temporary.unlink(missing_ok=True)
        raise StoreError(
            f"cannot write '{target}' ({error.strerror}); free space or choose another run folder"
        ) from error


def make_folder(folder: Path) -> None:
    """Make a folder, if there is none, in a parent that exists; StoreError when it cannot be."""
    try:
        folder.mkdir(exist_ok=True)
        force_folder(folder.parent)
    except OSError as error:
        raise StoreError(
            f"cannot make folder '{folder}' ({error.strerror}); its parent must exist and be yours "
            "to write"
        ) from error


def force_folder(folder: Path) -> None:
    """Force the entries of a folder to the disk, so that a rename survives a power failure."""
    descriptor = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)
