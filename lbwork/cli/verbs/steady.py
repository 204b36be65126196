"""``lbwork steady``: the steady state, its profile, currents and certificate."""

from __future__ import annotations

from pathlib import Path

from lbwork.cli.console import emit_json, emit_text, say
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
from lbwork.steady import steady_state
from lbwork.store import RunStore
from lbwork.study import keep_result

NAME = "steady"


def run(
    model: ModelName,
    sites: Sites = None,
    set_: Settings = None,
    boundary: Boundary = None,
    json: JsonFlag = False,
    runs: RunsFolder = Path("runs"),
) -> None:
    """Steady state: magnetisation profile, spin current, zero modes, certificate."""
    chosen = chosen_model(model, one_size(sites), set_, boundary)
    result = steady_state(chosen)
    document = result.to_dict()
    run_id = keep_result(
        RunStore(runs), NAME, chosen, document, options={}, arrays={"density": result.density}
    )
    if json:
        emit_json({**document, "run": run_id})
        return
    emit_text(str(result))
    say(f"kept as {run_id}")
