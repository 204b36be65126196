"""``lbwork runs``: the kept runs."""

from __future__ import annotations

from pathlib import Path

from lbwork.cli.console import emit_json, emit_table, emit_text, human_seconds
from lbwork.cli.options import JsonFlag, RunsFolder
from lbwork.store import RunStore

NAME = "runs"


def run(json: JsonFlag = False, runs: RunsFolder = Path("runs")) -> None:
    """All kept runs, oldest first; damaged files are listed with the reason."""
    summaries = RunStore(runs).list() if runs.is_dir() else ()
    if json:
        emit_json({"runs": [summary.to_dict() for summary in summaries]})
        return
    if not summaries:
        emit_text(f"no runs in '{runs}'")
        return
    rows = [
        [
            one.run_id,
            one.status + (f": {one.reason}" if one.reason else ""),
            f"{one.sectors_done}/{one.sectors_planned}" if one.sectors_planned else "-",
            human_seconds(one.wall_time),
            one.created,
        ]
        for one in summaries
    ]
    emit_table(
        [
            ("run", "left"),
            ("status", "left"),
            ("sectors", "right"),
            ("time", "right"),
            ("started (UTC)", "left"),
        ],
        rows,
    )
