"""``lbwork count``: cumulants of a counted current and its generating function."""

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
from lbwork.counting import counting_statistics
from lbwork.errors import UsageError
from lbwork.steady import steady_cost
from lbwork.store import RunStore
from lbwork.study import keep_result

NAME = "count"


def _weights(words: list[str] | None) -> dict[int, float] | None:
    """``1:+1`` -> {1: 1.0}; the weight is 1 where it is left out."""
    if not words:
        return None
    weights: dict[int, float] = {}
    for word in words:
        number, _, weight = word.partition(":")
        try:
            weights[int(number)] = float(weight) if weight else 1.0
        except ValueError:
            raise UsageError(
                f"--jump {word}: write the number of a jump entry and a weight, e.g. 2:-1"
            ) from None
    return weights


def _fields(text: str | None) -> tuple[float, ...]:
    if text is None:
        return ()
    try:
        return tuple(float(part) for part in text.split(","))
    except ValueError:
        raise UsageError(f"--fields {text}: write numbers with commas, e.g. -0.5,0.5") from None


def run(
    model: ModelName,
    sites: Sites = None,
    set_: Settings = None,
    boundary: Boundary = None,
    jump: Annotated[
        list[str] | None,
        typer.Option(help="Jump entry of the model and weight, e.g. 1:+1. May be repeated."),
    ] = None,
    bond: Annotated[
        int | None, typer.Option(help="Count the magnetisation across this bond instead.")
    ] = None,
    fields: Annotated[
        str | None, typer.Option(help="Counting fields for the generating function, e.g. -1,1.")
    ] = None,
    json: JsonFlag = False,
    runs: RunsFolder = Path("runs"),
) -> None:
    """Mean, noise and higher cumulants of a jump count or a bond current in the steady state."""
    weights, values = _weights(jump), _fields(fields)
    chosen = chosen_model(model, one_size(sites), set_, boundary)
    if weights is None and bond is None:
        if chosen.boundary == "periodic":
            raise UsageError("say which jumps to count, e.g. --jump 1:+1; a ring has no ends")
        bond = max(1, chosen.sites // 2)
    cost = steady_cost(chosen)
    cost.require_fit(chosen.sites)
    say(
        f"{chosen}: expected time {human_seconds((4 + 3 * len(values)) * cost.seconds)}, memory "
        f"{human_bytes(cost.memory_bytes)}"
    )
    with progress("counting", 1) as tell:
        found = counting_statistics(
            chosen, jumps=weights, bond=bond, fields=values, tell=lambda words: tell(0, words)
        )
    options = {
        "jumps": None if weights is None else {str(key): value for key, value in weights.items()},
        "bond": bond,
        "fields": list(values),
    }
    run_id = keep_result(RunStore(runs), NAME, chosen, found.to_dict(), options=options)
    if json:
        emit_json({**found.to_dict(), "run": run_id})
        return
    emit_text(str(found))
    say(f"kept as {run_id}")
