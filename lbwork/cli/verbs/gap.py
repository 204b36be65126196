"""``lbwork gap``: Liouvillian gap, for one size or a range of sizes with a scaling fit."""

from __future__ import annotations

from pathlib import Path

from lbwork.cli.console import emit_json, emit_text, progress, say
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
from lbwork.spectrum import gap_scaling, spectral_gap
from lbwork.store import RunStore
from lbwork.study import keep_result

NAME = "gap"


def run(
    model: ModelName,
    sites: Sites = None,
    set_: Settings = None,
    boundary: Boundary = None,
    json: JsonFlag = False,
    runs: RunsFolder = Path("runs"),
) -> None:
    """Slowest decay rate, zero modes counted, every sector searched; --sites 4:8 fits a power."""
    sizes = several_sizes(sites)
    chosen = chosen_model(model, sizes[0] if sizes else None, set_, boundary)
    store = RunStore(runs)
    if sizes is None or len(sizes) == 1:
        say(f"{chosen}: searching every sector")
        result = spectral_gap(chosen)
        run_id = keep_result(store, NAME, chosen, result.to_dict(), options={})
        if json:
            emit_json({**result.to_dict(), "run": run_id})
        else:
            emit_text(str(result))
            say(f"kept as {run_id}")
        return
    models = [chosen.replace(sites=size) for size in sizes]
    results = []
    with progress("gap", len(models)) as tell:
        for done, one in enumerate(models):
            tell(done, f"{one.sites} sites")
            results.append(spectral_gap(one))
    scaling = gap_scaling(sizes, [result.gap for result in results])
    document = {
        **scaling.to_dict(),
        "sizes": list(sizes),
        "results": [
            {"sites": size, **result.to_dict()} for size, result in zip(sizes, results, strict=True)
        ],
    }
    run_id = keep_result(store, NAME, chosen, document, options={"sizes": list(sizes)})
    if json:
        emit_json({**document, "run": run_id})
        return
    emit_text(str(scaling))
    say(f"kept as {run_id}")
