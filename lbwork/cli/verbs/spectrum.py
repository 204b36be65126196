"""``lbwork spectrum``: eigenvalues sector by sector, kept as a run."""

from __future__ import annotations

from pathlib import Path

from lbwork.cli.console import emit_json, emit_text, human_bytes, human_seconds, progress, say
from lbwork.cli.options import (
    Boundary,
    Fresh,
    JsonFlag,
    ModelName,
    RunsFolder,
    Settings,
    Sites,
    chosen_model,
    one_size,
)
from lbwork.spectrum import Spectrum, SpectrumOptions, cost_estimate
from lbwork.spectrum.cost import require_memory
from lbwork.store import RunStore
from lbwork.study import kept_spectrum, start_run
from lbwork.symmetry import SectorPlan, plan_sectors

NAME = "spectrum"


def announce(plan: SectorPlan) -> None:
    """Say what a full spectrum will cost, on stderr; refuse what cannot fit."""
    costs = cost_estimate(plan)
    largest = max(costs, key=lambda cost: cost.memory_bytes)
    say(
        f"{plan.model}: {len(costs)} sectors, largest {plan.largest}; about "
        f"{human_seconds(sum(cost.seconds for cost in costs))} and "
        f"{human_bytes(largest.memory_bytes)}"
    )
    for cost in costs:
        require_memory(cost.dimension, cost.real_matrix, cost.label)


def run(
    model: ModelName,
    sites: Sites = None,
    set_: Settings = None,
    boundary: Boundary = None,
    fresh: Fresh = False,
    json: JsonFlag = False,
    runs: RunsFolder = Path("runs"),
) -> None:
    """Eigenvalues of the generator, sector by sector; an interrupted run is taken up again."""
    chosen = chosen_model(model, one_size(sites), set_, boundary)
    plan = plan_sectors(chosen)
    announce(plan)
    options = SpectrumOptions()
    sectors = [sector.to_dict() for sector in plan.sectors]
    with start_run(
        RunStore(runs),
        NAME,
        chosen,
        options=options.to_dict(),
        plan=sectors,
        seed=options.seed,
        fresh=fresh,
    ) as writer:
        kept = len(writer.finished_sectors())
        if kept:
            say(f"taking up {writer.run_id}: {kept} of {len(sectors)} sectors are kept")
        with progress("spectrum", len(sectors)) as tell:
            spectrum = kept_spectrum(
                plan,
                writer,
                options=options,
                progress=lambda done, _, sector: tell(done, sector.label),
            )
        writer.finish()
        run_id = writer.run_id
    _print(spectrum, run_id, json)


def _print(spectrum: Spectrum, run_id: str, json: bool) -> None:
    if json:
        emit_json({**spectrum.to_dict(), "run": run_id})
        return
    emit_text(str(spectrum))
    emit_text(f"kept as {run_id}")
