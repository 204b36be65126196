"""``lbwork gap``: Liouvillian gap, for one size or a range of sizes with a scaling fit."""

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
    several_sizes,
)
from lbwork.errors import UsageError
from lbwork.spectrum import GapOptions, gap_cost, spectral_gap
from lbwork.store import RunStore
from lbwork.study import gap_range, keep_result

NAME = "gap"
SECTORS = {"auto": None, "neutral": True, "all": False}


def run(
    model: ModelName,
    sites: Sites = None,
    set_: Settings = None,
    boundary: Boundary = None,
    sectors: Annotated[
        str,
        typer.Option(
            help="neutral (ket and bra of equal charge), all, or auto: all for short chains."
        ),
    ] = "auto",
    method: Annotated[
        str, typer.Option(help="exhaustive, nearest (to zero; long chains), or auto by size.")
    ] = "auto",
    seed: Annotated[int, typer.Option(min=0, help="Of the start vectors.")] = 0,
    json: JsonFlag = False,
    runs: RunsFolder = Path("runs"),
) -> None:
    """Slowest decay rate with its certificate, zero modes counted; --sites 4:8 fits a power."""
    if sectors not in SECTORS:
        raise UsageError(f"--sectors {sectors}: write one of {', '.join(SECTORS)}")
    options = GapOptions(method=method, populations_only=SECTORS[sectors], seed=seed)
    kept = {"sectors": sectors, "method": method, "seed": seed}
    sizes = several_sizes(sites)
    chosen = chosen_model(model, sizes[0] if sizes else None, set_, boundary)
    store = RunStore(runs)
    if sizes is None or len(sizes) == 1:
        cost = gap_cost(chosen, options)
        cost.require_fit(chosen.sites)
        say(
            f"{chosen}: {cost.method} search, expected time {human_seconds(cost.seconds)}, "
            f"memory {human_bytes(cost.memory_bytes)}"
        )
        with progress("gap", 1) as tell:
            result = spectral_gap(chosen, options=options, tell=lambda words: tell(0, words))
        arrays = {} if result.mode is None or result.mode.size > 2**22 else {"mode": result.mode}
        run_id = keep_result(store, NAME, chosen, result.to_dict(), options=kept, arrays=arrays)
        if json:
            emit_json({**result.to_dict(), "run": run_id})
        else:
            emit_text(str(result))
            say(f"kept as {run_id}")
        return
    longest = chosen.replace(sites=max(sizes))
    gap_cost(longest, options).require_fit(longest.sites)
    with progress("gap", len(sizes)) as tell:
        found = gap_range(chosen, sizes, options=options, progress=tell)
    document = found.to_dict()
    run_id = keep_result(store, NAME, chosen, document, options={**kept, "sizes": list(sizes)})
    if json:
        emit_json({**document, "run": run_id})
        return
    emit_text(str(found))
    say(f"kept as {run_id}; `lbwork figure {run_id}` draws it on logarithmic axes")
