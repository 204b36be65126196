"""``lbwork steady``: the steady state, its profile, currents and certificate."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from lbwork.cli.console import emit_json, emit_text, human_bytes, human_seconds, progress, say
from lbwork.cli.options import (
    Boundary,
    JsonFlag,
    ModelName,
    RunsFolder,
    Settings,
    Sites,
    chosen_model,
    one_size,
)
from lbwork.steady import SteadyOptions, steady_cost, steady_state
from lbwork.store import RunStore
from lbwork.study import keep_result

NAME = "steady"
KEPT_ENTRIES = 2**22
"""Density matrices up to this many entries are kept with the run."""


def run(
    model: ModelName,
    sites: Sites = None,
    set_: Settings = None,
    boundary: Boundary = None,
    method: Annotated[
        str, typer.Option(help="matrix-free, factorised, filtered, or auto by size.")
    ] = "auto",
    splitting: Annotated[
        str, typer.Option(help="Of the matrix-free preconditioner: energy, no-jump or auto.")
    ] = "auto",
    json: JsonFlag = False,
    runs: RunsFolder = Path("runs"),
) -> None:
    """Steady state: magnetisation profile, spin current, zero modes, certificate."""
    options = SteadyOptions(method=method, splitting=splitting)
    chosen = chosen_model(model, one_size(sites), set_, boundary)
    cost = steady_cost(chosen)
    cost.require_fit(chosen.sites)
    say(f"{chosen}: about {human_seconds(cost.seconds)} and {human_bytes(cost.memory_bytes)}")
    with progress("steady state", 1) as tell:
        result = steady_state(chosen, options=options, tell=lambda words: tell(0, words))
    document = result.to_dict()
    small = result.density.size <= KEPT_ENTRIES
    run_id = keep_result(
        RunStore(runs),
        NAME,
        chosen,
        document,
        options={"method": method, "splitting": splitting},
        arrays={"density": result.density} if small else {},
    )
    if json:
        emit_json({**document, "run": run_id})
        return
    emit_text(str(result))
    say(f"kept as {run_id}")
