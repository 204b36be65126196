"""Writes the example run in a process of its own, to be killed: ``python -m ... MODE FOLDER``.

``slowly FOLDER SEED`` writes with small pauses and says on stdout what is finished.
``steps FOLDER`` kills itself, in one forked child after the other, before the first, second, ...
call that changes the disk, each in a folder of its own, until a child gets through.
"""

from __future__ import annotations

import os
import random
import signal
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

from lbwork.store import RunStore
from tests.store.examples import sector_arrays, sector_metadata, start, write_results

CHANGING_CALLS = ("replace", "fsync", "unlink", "mkdir", "rmdir")


def write_run(folder: Path, say: Callable[[str], Any], pause: Callable[[], None]) -> None:
    """Write the whole example run, saying each finished sector."""
    with start(RunStore(folder)) as run:
        say("created")
        for index in run.missing_sectors():
            pause()
            run.write_sector(index, sector_metadata(index), sector_arrays(index))
            say(str(index))
        write_results(run)
        pause()
    say("finished")


def slowly(folder: Path, seed: int) -> None:
    """Write with pauses of up to 20 ms."""
    source = random.Random(seed)
    write_run(
        folder,
        lambda word: print(word, flush=True),
        lambda: time.sleep(source.uniform(0.0, 0.02)),
    )


def steps(folder: Path) -> None:
    """Kill one child per disk-changing call; each leaves ``said`` beside its run folder."""
    count = 0
    while True:
        count += 1
        place = folder / f"{count:03d}"
        place.mkdir()
        child = os.fork()
        if child == 0:
            write_until(place, count)
            os._exit(0)
        _, status = os.waitpid(child, 0)
        if not os.WIFSIGNALED(status):
            return


def write_until(place: Path, count: int) -> None:
    """Write the run in ``place/runs``; die by SIGKILL before changing call number ``count``."""
    calls = 0

    def dying(call: Callable[..., Any]) -> Callable[..., Any]:
        def counted(*arguments: Any, **options: Any) -> Any:
            nonlocal calls
            calls += 1
            if calls == count:
                os.kill(os.getpid(), signal.SIGKILL)
            return call(*arguments, **options)

        return counted

    for name in CHANGING_CALLS:
        setattr(os, name, dying(getattr(os, name)))
    with open(place / "said", "w", encoding="utf-8", buffering=1) as said:
        write_run(place / "runs", lambda word: said.write(word + "\n"), lambda: None)


if __name__ == "__main__":
    mode, target = sys.argv[1], Path(sys.argv[2])
    if mode == "slowly":
        slowly(target, int(sys.argv[3]))
    else:
        steps(target)
