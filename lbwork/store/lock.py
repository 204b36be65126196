"""One writer per run, by a lock that dies with its process.

The kernel drops an advisory lock (flock) when the last descriptor of it closes, at a kill -9 too,
so no lock can go stale. A child process forked while the lock is held shares it until the child
ends. Readers need no lock: files change by renaming only.
"""

from __future__ import annotations

import contextlib
import fcntl
import os
import socket
import time
from pathlib import Path

from lbwork.errors import StoreError

__all__ = ["LockedRunError", "RunLock", "is_held"]


class LockedRunError(StoreError):
    """Another process, or another writer of this one, is writing the run."""


# A reader that asks whether a run is being written holds a shared lock for an instant; a writer
# must not mistake it for another writer.
_ATTEMPTS = 10
_PAUSE = 0.02


class RunLock:
    """The exclusive right to write one run, held from construction until :meth:`release`.

    Raises LockedRunError, naming the process that holds the lock, when there is one; StoreError
    when the folder cannot be written.
    """

    def __init__(self, path: Path, run_id: str) -> None:
        self._path = path
        self._descriptor: int | None = _acquire(path, run_id)

    @property
    def held(self) -> bool:
        """False once released."""
        return self._descriptor is not None

    def release(self) -> None:
        """Remove the lock file and let go of the lock; may be called twice."""
        if self._descriptor is None:
            return
        # Unlinked while still held, so that nobody can lock the file that is about to vanish.
        with contextlib.suppress(FileNotFoundError):
            os.unlink(self._path)
        os.close(self._descriptor)
        self._descriptor = None


def is_held(path: Path) -> bool:
    """Whether some process holds the lock at this moment; never creates the file."""
    try:
        descriptor = os.open(path, os.O_RDONLY)
    except OSError:
        return False
    try:
        fcntl.flock(descriptor, fcntl.LOCK_SH | fcntl.LOCK_NB)
    except BlockingIOError:
        return True
    except OSError:
        # A file system without locks: nobody can hold one.
        return False
    finally:
        os.close(descriptor)
    return False


def _acquire(path: Path, run_id: str) -> int:
    for _ in range(_ATTEMPTS):
        try:
            descriptor = os.open(path, os.O_RDWR | os.O_CREAT, 0o644)
        except OSError as error:
            raise StoreError(
                f"cannot write '{path}' ({error.strerror}); choose a run folder you may write"
            ) from error
        if _locked(descriptor, path) and _still_there(descriptor, path):
            # For the message to a second writer only; on a full disk it stays empty.
            with contextlib.suppress(OSError):
                os.ftruncate(descriptor, 0)
                os.write(descriptor, f"process {os.getpid()} on {socket.gethostname()}".encode())
            return descriptor
        os.close(descriptor)
        time.sleep(_PAUSE)
    raise LockedRunError(
        f"run '{run_id}' is being written by {_holder(path)}; wait for it or end it first"
    )


def _locked(descriptor: int, path: Path) -> bool:
    try:
        fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except BlockingIOError:
        return False
    except OSError as error:
        os.close(descriptor)
        raise StoreError(
            f"cannot lock '{path}' ({error.strerror}); choose a run folder on a file system with "
            "file locks"
        ) from error
    return True


def _still_there(descriptor: int, path: Path) -> bool:
    # The previous holder may have removed the file between our opening and our locking it.
    try:
        return os.path.samestat(os.fstat(descriptor), os.stat(path))
    except FileNotFoundError:
        return False


def _holder(path: Path) -> str:
    try:
        return path.read_text(encoding="utf-8", errors="replace")[:200] or "another process"
    except OSError:
        return "another process"
