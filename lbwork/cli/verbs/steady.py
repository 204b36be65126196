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
from lbwork.observables import observables_of, operator_from_words, state_from_words
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
    observables: Annotated[
        bool, typer.Option(help="Profiles along x, y, z, energy currents, second Renyi entropy.")
    ] = False,
    entanglement: Annotated[
        bool, typer.Option(help="Entropies, operator entanglement and negativity of every cut too.")
    ] = False,
    operator: Annotated[
        list[str] | None,
        typer.Option(help="Expectation value, e.g. 'X Y@2' (first site). May be repeated."),
    ] = None,
    against: Annotated[
        list[str] | None,
        typer.Option(
            help="Compare with a state: mixed, neel, gibbs:0.5, '0 1 0', rho.npy. May be repeated."
        ),
    ] = None,
    json: JsonFlag = False,
    runs: RunsFolder = Path("runs"),
) -> None:
    """Steady state: magnetisation profile, spin current, zero modes, certificate."""
    options = SteadyOptions(method=method, splitting=splitting)
    chosen = chosen_model(model, one_size(sites), set_, boundary)
    # Words are read before the work, so that a slip costs nothing.
    operators = {words: operator_from_words(chosen, words) for words in operator or ()}
    cost = steady_cost(chosen)
    cost.require_fit(chosen.sites)
    references = {words: state_from_words(chosen, words) for words in against or ()}
    say(
        f"{chosen}: expected time {human_seconds(cost.seconds)}, "
        f"memory {human_bytes(cost.memory_bytes)}"
    )
    with progress("steady state", 1) as tell:
        result = steady_state(chosen, options=options, tell=lambda words: tell(0, words))
    document = result.to_dict()
    more = None
    if observables or entanglement or operators or references:
        more = observables_of(
            chosen,
            result.density,
            entanglement=entanglement,
            operators=operators,
            references=references,
        )
        document["observables"] = more.to_dict()
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
    if more is not None:
        emit_text(str(more))
    say(f"kept as {run_id}")
