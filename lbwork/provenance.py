"""Where a number comes from: versions, machine, thread settings and memory, in one call."""

from __future__ import annotations

import os
import platform
import resource
import sys
from contextlib import AbstractContextManager
from functools import lru_cache
from importlib import metadata
from typing import Any

import threadpoolctl

from lbwork import defaults

__all__ = [
    "available_memory",
    "limited_threads",
    "peak_memory",
    "provenance",
    "usable_memory",
]

_PACKAGES = ("lbwork", "numpy", "scipy", "quspin", "numba", "h5py", "matplotlib")


def _version(package: str) -> str:
    try:
        return metadata.version(package)
    except metadata.PackageNotFoundError:
        return "not installed"


def provenance() -> dict[str, Any]:
    """Versions, interpreter, operating system, processors and BLAS thread pools.

    Returns a document of strings, integers and lists that can be written to JSON; it is stored
    with every run and printed by ``lbwork about``.
    """
    pools = [
        {
            "library": str(pool.get("internal_api")),
            "version": str(pool.get("version")),
            "threads": int(pool.get("num_threads", 0)),
        }
        for pool in threadpoolctl.threadpool_info()
    ]
    return {
        "versions": {package: _version(package) for package in _PACKAGES},
        "python": sys.version.split()[0],
        "system": f"{platform.system()} {platform.machine()}",
        "processors": os.cpu_count() or 1,
        "thread_pools": pools,
        "memory_available": available_memory(),
    }


@lru_cache(maxsize=1)
def _thread_pools() -> threadpoolctl.ThreadpoolController:
    return threadpoolctl.ThreadpoolController()


def limited_threads(count: int) -> AbstractContextManager[object]:
    """Context in which the linear-algebra libraries use at most ``count`` threads.

    The libraries are looked up once per process, since that costs as much as a small eigenvalue
    problem; they must have been imported before the first call.
    """
    return _thread_pools().limit(limits=count)


def available_memory() -> int:
    """Bytes of physical memory that can be used now without swapping.

    Reads the kernel's own estimate where there is one, else the free physical pages.
    """
    try:
        with open("/proc/meminfo", encoding="ascii") as lines:
            for line in lines:
                if line.startswith("MemAvailable:"):
                    return int(line.split()[1]) * 1024
    except OSError:
        return int(os.sysconf("SC_AVPHYS_PAGES")) * int(os.sysconf("SC_PAGE_SIZE"))
    return int(os.sysconf("SC_AVPHYS_PAGES")) * int(os.sysconf("SC_PAGE_SIZE"))


def usable_memory() -> int:
    """Bytes a task may plan to use: :data:`lbwork.defaults.MEMORY_SHARE` of what is available."""
    return int(defaults.MEMORY_SHARE * available_memory())


def peak_memory() -> int:
    """Largest resident size of this process so far, in bytes."""
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
    return peak if sys.platform == "darwin" else peak * 1024
