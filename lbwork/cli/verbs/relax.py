"""``lbwork relax``: time evolution from a given state, and the asymptotic decay rate."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import numpy as np
import typer

from lbwork.cli.console import emit_json, emit_text, human_bytes, progress, say
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
from lbwork.errors import UsageError
from lbwork.observables import operator_from_words, state_from_words
from lbwork.relaxation import asymptotic_rate, evolve
from lbwork.steady import steady_cost
from lbwork.store import RunStore
from lbwork.study import keep_result

NAME = "relax"


def _times(text: str) -> list[float]:
    """``0:10:0.5`` or ``0,1,2.5``."""
    try:
        if ":" in text:
            first, last, step = (float(part) for part in text.split(":"))
            if not step > 0 or last < first or (last - first) / step > 1e5:
                raise ValueError
            return [first + step * index for index in range(int((last - first) / step + 1.5))]
        return [float(part) for part in text.split(",")]
    except ValueError:
        raise UsageError(
            f"--times {text}: write first:last:step, e.g. 0:10:0.5, or times with commas"
        ) from None


def run(
    model: ModelName,
    sites: Sites = None,
    set_: Settings = None,
    boundary: Boundary = None,
    start: Annotated[
        str, typer.Option(help="up, down, neel, domain-wall, mixed, gibbs:0.5, '0 1 0', rho.npy.")
    ] = "neel",
    times: Annotated[str, typer.Option(help="first:last:step, or times with commas.")] = "0:5:0.5",
    operator: Annotated[
        list[str] | None,
        typer.Option(help="Expectation value, e.g. 'X Y@2' (first site). May be repeated."),
    ] = None,
    rate: Annotated[
        bool, typer.Option("--rate", help="Wait for the asymptotic decay rate as well.")
    ] = False,
    json: JsonFlag = False,
    runs: RunsFolder = Path("runs"),
) -> None:
    """Density matrix forward in time: profile, expectation values, error bound."""
    chosen = chosen_model(model, one_size(sites), set_, boundary)
    moments = _times(times)
    operators = {words: operator_from_words(chosen, words) for words in operator or ()}
    cost = steady_cost(chosen)
    cost.require_fit(chosen.sites)
    state = state_from_words(chosen, start)
    say(f"{chosen}: from {start}, up to {human_bytes(cost.memory_bytes + 30 * state.nbytes)}")
    with progress("evolution", len(moments)) as tell:
        found = evolve(chosen, state, moments, operators=operators, tell=tell)
    document = found.to_dict()
    decay = None
    if rate:
        with progress("decay rate", 1) as tell:
            decay = asymptotic_rate(chosen, state, tell=lambda words: tell(0, words))
        document["decay"] = decay.to_dict()
    options = {"start": start, "times": moments, "operators": list(operators), "rate": rate}
    final = {"final": np.asarray(found.final)} if found.final.size <= 2**22 else {}
    run_id = keep_result(RunStore(runs), NAME, chosen, document, options=options, arrays=final)
    if json:
        emit_json({**document, "run": run_id})
        return
    emit_text(str(found))
    if decay is not None:
        emit_text(f"  {decay}")
    say(f"kept as {run_id}")
