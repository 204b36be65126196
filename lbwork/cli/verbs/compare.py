"""``lbwork compare``: two kept runs side by side."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from lbwork.cli.console import emit_json, emit_table, emit_text
from lbwork.cli.options import JsonFlag, RunsFolder
from lbwork.store import RunStore
from lbwork.study import compare_runs

NAME = "compare"


def _shown(value: object) -> str:
    return f"{value:.12g}" if isinstance(value, float) else str(value)


First = Annotated[str, typer.Argument(help="Run id, or the beginning of it.", metavar="FIRST")]
Second = Annotated[str, typer.Argument(help="Run to compare with.", metavar="SECOND")]


def run(
    first: First, second: Second, json: JsonFlag = False, runs: RunsFolder = Path("runs")
) -> None:
    """Same model, same numbers? Quantities side by side, spectra compared as sets."""
    store = RunStore(runs)
    found = compare_runs(store.open(first), store.open(second))
    if json:
        emit_json(found.to_dict())
        return
    emit_text(
        f"{found.first}\n{found.second}\nsame model: {'yes' if found.same_model else 'no'}, same "
        f"options: {'yes' if found.same_options else 'no'}"
    )
    rows = [
        [
            item.quantity,
            _shown(item.first),
            _shown(item.second),
            "" if item.difference is None else f"{item.difference:.1e}",
        ]
        for item in found.quantities
        if item.first != item.second
    ]
    same = len(found.quantities) - len(rows)
    if rows:
        emit_table(
            [("quantity", "left"), ("first", "left"), ("second", "left"), ("difference", "right")],
            rows,
        )
    emit_text(f"{same} quantities are equal, {len(rows)} differ")
    if found.levels:
        worst = max(found.levels.values())
        emit_text(f"{len(found.levels)} common sectors; levels differ by at most {worst:.1e}")
    for name, only in (("first", found.only_first), ("second", found.only_second)):
        if only:
            emit_text(f"{len(only)} entries only in the {name}: {', '.join(only[:5])}")
