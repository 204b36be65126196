"""``lbwork levels``: spacing statistics and the verdict, from a model or from a kept run."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from lbwork.cli.console import emit_json, emit_text, progress, say
from lbwork.cli.options import (
    Boundary,
    JsonFlag,
    RunsFolder,
    Settings,
    Sites,
    chosen_model,
    one_size,
)
from lbwork.cli.verbs.spectrum import announce
from lbwork.errors import StoreError, UsageError
from lbwork.levels import LevelOptions, judge_levels, level_statistics
from lbwork.spectrum import Spectrum, SpectrumOptions, full_spectrum
from lbwork.store import RunFile, RunStore
from lbwork.study import keep_result, level_sequences, spectrum_of_run
from lbwork.symmetry import plan_sectors

NAME = "levels"


def _kept_run(word: str, store: RunStore) -> RunFile | None:
    """The run that ``word`` names, or None when it is no run."""
    if not word.startswith(("spectrum-", "audit-")):
        return None
    try:
        return store.open(word)
    except StoreError:
        if not store.folder.is_dir():
            return None
        raise


def _spectrum(
    word: str, store: RunStore, sites: str | None, settings: list[str] | None, boundary: str | None
) -> Spectrum:
    kept = _kept_run(word, store)
    if kept is not None:
        if sites is not None or settings or boundary is not None:
            raise UsageError(
                f"'{word}' is a kept run; --sites, --set and --boundary change models only"
            )
        return spectrum_of_run(kept)
    plan = plan_sectors(chosen_model(word, one_size(sites), settings, boundary))
    announce(plan)
    with progress("spectrum", len(plan.sectors)) as tell:
        return full_spectrum(
            plan,
            options=SpectrumOptions(),
            progress=lambda done, _, sector: tell(done, sector.label),
        )


def run(
    model: Annotated[
        str,
        typer.Argument(help="Catalogue name, model file, or id of a kept run.", metavar="MODEL"),
    ],
    sites: Sites = None,
    set_: Settings = None,
    boundary: Boundary = None,
    json: JsonFlag = False,
    runs: RunsFolder = Path("runs"),
) -> None:
    """Spacing statistics and the verdict: integrable or chaotic, and of which class."""
    store = RunStore(runs)
    spectrum = _spectrum(model, store, sites, set_, boundary)
    options = LevelOptions()
    statistics = level_statistics(level_sequences(spectrum), options)
    verdict = judge_levels(statistics)
    document = {
        **verdict.to_dict(),
        **statistics.to_dict(),
        "unresolved": [item.to_dict() for item in spectrum.plan.symmetries.unresolved],
    }
    arrays = {"ratios": statistics.ratios, "gap_ratios": statistics.gap_ratios}
    run_id = keep_result(
        store,
        NAME,
        spectrum.model,
        document,
        options={"seed": options.seed, "spectrum": SpectrumOptions().to_dict()},
        arrays={name: array for name, array in arrays.items() if array.size},
    )
    if json:
        emit_json({**document, "run": run_id})
        return
    emit_text(str(statistics))
    emit_text(f"\n{verdict}")
    for item in spectrum.plan.symmetries.unresolved:
        emit_text(f"unresolved {item.name}: {item.advice}")
    say(f"kept as {run_id}")
