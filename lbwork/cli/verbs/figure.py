"""``lbwork figure``: the figures of a kept run, ready for a paper."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from lbwork.cli.console import emit_json, emit_text
from lbwork.cli.options import JsonFlag, RunName, RunsFolder
from lbwork.errors import UsageError
from lbwork.report import FORMATS, figures_of_run, save_figure
from lbwork.store import RunStore

NAME = "figure"


def run(
    run: RunName,
    kind: Annotated[
        str | None, typer.Option("--only", help="One figure by name, e.g. spectrum or profile.")
    ] = None,
    out: Annotated[
        Path | None, typer.Option("--out", help="Folder for the files; default: the run folder.")
    ] = None,
    suffix: Annotated[str, typer.Option("--format", help="pdf, svg or png.")] = "pdf",
    double: Annotated[bool, typer.Option("--double", help="Two columns wide.")] = False,
    json: JsonFlag = False,
    runs: RunsFolder = Path("runs"),
) -> None:
    """Draw spectrum, level ratios, profile, gap: vector graphics at column width."""
    if f".{suffix}" not in FORMATS:
        raise UsageError(
            f"--format {suffix}: choose {', '.join(one.lstrip('.') for one in FORMATS)}"
        )
    store = RunStore(runs)
    kept = store.open(run)
    figures = figures_of_run(kept, width="double" if double else "single")
    if kind is not None:
        if kind not in figures:
            raise UsageError(f"--only {kind}: run has {', '.join(figures)}")
        figures = {kind: figures[kind]}
    folder = store.folder if out is None else out
    paths = [
        save_figure(figure, folder / f"{kept.run_id}-{name}.{suffix}")
        for name, figure in figures.items()
    ]
    if json:
        emit_json({"figures": [str(path) for path in paths]})
        return
    for path in paths:
        emit_text(str(path))
