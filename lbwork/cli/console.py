"""Where output goes: data to stdout, talk and progress to stderr, one JSON document on request."""

from __future__ import annotations

import contextlib
import json
import sys
import time
from collections.abc import Callable, Iterator, Sequence
from typing import Any

from rich import box
from rich.console import Console
from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeElapsedColumn
from rich.table import Table

__all__ = [
    "emit_json",
    "emit_table",
    "emit_text",
    "human_bytes",
    "human_seconds",
    "progress",
    "say",
]


def _stdout() -> Console:
    return Console(file=sys.stdout, highlight=False, soft_wrap=True)


def emit_text(text: str) -> None:
    """Print a block of data to stdout, as it is."""
    _stdout().print(text, markup=False)


def emit_json(document: Any) -> None:
    """Print one JSON document to stdout; floats with full double precision."""
    sys.stdout.write(json.dumps(document, indent=1, allow_nan=False, ensure_ascii=False) + "\n")


def emit_table(
    columns: Sequence[tuple[str, str]], rows: Sequence[Sequence[str]], title: str | None = None
) -> None:
    """Print a plain table; ``columns`` are (heading, ``left`` or ``right``)."""
    table = Table(box=box.SIMPLE_HEAD, title=title, title_justify="left", pad_edge=False)
    for heading, side in columns:
        table.add_column(heading, justify="right" if side == "right" else "left", overflow="fold")
    for row in rows:
        table.add_row(*row)
    console = Console(file=sys.stdout, highlight=False, markup=False)
    if not console.is_terminal:
        console = Console(file=sys.stdout, highlight=False, markup=False, width=120)
    console.print(table)


def say(message: str) -> None:
    """One line of talk on stderr."""
    sys.stderr.write(message + "\n")
    sys.stderr.flush()


def human_bytes(count: float) -> str:
    """A number of bytes in words, e.g. ``1.4 GiB``."""
    for unit in ("B", "KiB", "MiB", "GiB"):
        if count < 1024:
            return f"{count:.0f} {unit}" if unit == "B" else f"{count:.1f} {unit}"
        count /= 1024
    return f"{count:.1f} TiB"


def human_seconds(seconds: float) -> str:
    """A duration in words, e.g. ``3 min 20 s``."""
    if seconds == float("inf"):
        return "too long"
    if seconds < 1:
        return "under 1 s"
    if seconds < 90:
        return f"{seconds:.0f} s"
    if seconds < 5400:
        return f"{seconds / 60:.0f} min"
    return f"{seconds / 3600:.1f} h"


@contextlib.contextmanager
def progress(title: str, total: float) -> Iterator[Callable[[float, str], None]]:
    """A progress bar on stderr: call it with (amount done, what is being done).

    On a terminal a live bar; elsewhere a line after two seconds and every five, so that logs stay
    readable.
    """
    if sys.stderr.isatty():
        bar = Progress(
            TextColumn("{task.description}"),
            BarColumn(),
            MofNCompleteColumn(),
            TimeElapsedColumn(),
            console=Console(file=sys.stderr),
            transient=True,
        )
        with bar:
            task = bar.add_task(title, total=total)
            yield lambda done, what: bar.update(task, completed=done, description=what or title)
        return
    started = last = time.monotonic()

    def line(done: float, what: str) -> None:
        nonlocal last
        now = time.monotonic()
        if now - last >= (2 if last == started else 5):
            last = now
            say(f"{title}: {done:.0f} of {total:.0f} after {human_seconds(now - started)}; {what}")

    yield line
