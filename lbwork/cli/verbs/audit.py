"""``lbwork audit``: all of it in one dossier, kept as one run."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from lbwork.cli.console import emit_json, emit_text, progress, say
from lbwork.cli.options import (
    Boundary,
    Fresh,
    JsonFlag,
    RunsFolder,
    Settings,
    Sites,
    chosen_model,
    one_size,
)
from lbwork.cli.verbs.spectrum import announce
from lbwork.report import figures_of_run, save_figure
from lbwork.store import RunStore
from lbwork.study import Audit, audit
from lbwork.symmetry import plan_sectors

NAME = "audit"
DEFAULT_MODEL = "xxz-nnn-driven"


def _figures(store: RunStore, run_id: str) -> list[Path]:
    """Draw every figure of the run into the run folder, as PDF."""
    paths = []
    for name, figure in figures_of_run(store.open(run_id)).items():
        paths.append(save_figure(figure, store.folder / f"{run_id}-{name}.pdf"))
    return paths


def _text(result: Audit) -> str:
    verdict = result.verdict
    parts = [
        f"audit of {result.model}",
        f"\nsymmetries\n{result.plan.symmetries}",
        f"\nlevels\n{result.statistics}",
        f"\n{verdict}",
    ]
    if result.gap is not None:
        parts.append(f"\n{result.gap}")
    if result.steady is not None:
        parts.append(f"\n{result.steady}")
    parts.append(f"\nconclusion\n{result.conclusion()}")
    return "\n".join(parts)


def run(
    model: Annotated[
        str,
        typer.Argument(help="Catalogue name or model file.", metavar="MODEL"),
    ] = DEFAULT_MODEL,
    sites: Sites = None,
    set_: Settings = None,
    boundary: Boundary = None,
    fresh: Fresh = False,
    json: JsonFlag = False,
    runs: RunsFolder = Path("runs"),
) -> int:
    """Symmetries, spectrum, level statistics and verdict, gap and steady state, kept as one run."""
    chosen = chosen_model(model, one_size(sites), set_, boundary)
    plan = plan_sectors(chosen)
    announce(plan)
    store = RunStore(runs)
    with progress("audit", len(plan.sectors) + 3) as tell:
        result = audit(
            plan, store=store, fresh=fresh, progress=lambda done, _, what: tell(done, what)
        )
    paths = _figures(store, str(result.run_id))
    if json:
        emit_json({**result.to_dict(), "figures": [str(path) for path in paths]})
    else:
        emit_text(_text(result))
        emit_text(f"\nkept as {result.run_id}")
        for path in paths:
            emit_text(f"figure {path}")
    if not result.certified:
        say("lbwork: not every part is certified; see the conclusion")
        return 1
    return 0
