"""Models and results in and out of run files."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from lbwork.model import Model, model_from_toml, model_to_toml
from lbwork.store import RunFile, RunStore, RunWriter

__all__ = ["keep_result", "model_of_run", "start_run"]


def start_run(
    store: RunStore,
    kind: str,
    model: Model,
    *,
    options: Mapping[str, Any],
    plan: Sequence[Mapping[str, Any]] = (),
    seed: int | None = None,
    fresh: bool = False,
) -> RunWriter:
    """Take up the unfinished run of this very task, or start a new one (always, when ``fresh``).

    The task is the same when kind, model identity, options, sectors and seed are.
    """
    sectors = [dict(sector) for sector in plan]
    if not fresh:
        found = store.find_resumable(
            kind, identity=model.identity, options=options, plan=sectors, seed=seed
        )
        if found is not None:
            return store.resume(found)
    return store.create(
        kind,
        model_name=model.name,
        model_toml=model_to_toml(model),
        canonical_json=model.canonical_json(),
        identity=model.identity,
        options=options,
        plan=sectors,
        seed=seed,
    )


def keep_result(
    store: RunStore,
    kind: str,
    model: Model,
    document: Mapping[str, Any],
    *,
    options: Mapping[str, Any],
    arrays: Mapping[str, np.ndarray] | None = None,
    certified: bool = True,
) -> str:
    """Keep one finished result as a run of its own; returns the run's id."""
    with start_run(store, kind, model, options=options, fresh=True) as writer:
        writer.write_result(kind, dict(document), dict(arrays or {}))
        writer.finish("complete" if certified else "uncertified")
        return writer.run_id


def model_of_run(run: RunFile) -> Model:
    """The model that a run was made for."""
    return model_from_toml(run.model_toml, f"run {run.run_id}")
