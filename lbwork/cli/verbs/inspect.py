"""``lbwork inspect``: what a model is, its symmetries and sectors, and what tasks will cost."""

from __future__ import annotations

from typing import Annotated

import typer

from lbwork.cli.console import emit_json, emit_table, emit_text, human_bytes, human_seconds
from lbwork.cli.options import (
    Boundary,
    JsonFlag,
    ModelName,
    Settings,
    Sites,
    chosen_model,
    one_size,
)
from lbwork.study import Inspection, inspect_model

NAME = "inspect"
SHOWN_SECTORS = 20


def run(
    model: ModelName,
    sites: Sites = None,
    set_: Settings = None,
    boundary: Boundary = None,
    every: Annotated[bool, typer.Option("--all", help="List every sector.")] = False,
    json: JsonFlag = False,
) -> None:
    """Validity, symmetries found, sectors with sizes, time and memory of each task."""
    found = inspect_model(chosen_model(model, one_size(sites), set_, boundary))
    if json:
        emit_json(found.to_dict())
        return
    emit_text(f"{found.model}\nidentity {found.model.identity}")
    check = found.certificate
    emit_text(
        f"generator: trace error {check.trace_error:.1e}, Hermiticity error "
        f"{check.hermiticity_error:.1e}, smallest dissipator eigenvalue "
        f"{check.dissipator_min_eigenvalue:.1e}"
    )
    emit_text(f"\nsymmetries\n{found.plan.symmetries}")
    _sectors(found, None if every else SHOWN_SECTORS)
    rows = [
        [
            task.task,
            human_seconds(task.seconds),
            human_bytes(task.memory_bytes),
            "yes" if task.fits else "no",
        ]
        for task in found.tasks
    ]
    emit_table([("task", "left"), ("time", "right"), ("memory", "right"), ("fits", "left")], rows)


def _sectors(found: Inspection, limit: int | None) -> None:
    ranked = sorted(
        zip(found.plan.sectors, found.sector_costs, strict=True),
        key=lambda item: -item[0].dimension,
    )
    rows = [
        [
            str(sector.dimension),
            str(sector.multiplicity),
            "real" if sector.self_conjugate else "complex",
            human_seconds(cost.seconds),
            human_bytes(cost.memory_bytes),
            sector.label,
        ]
        for sector, cost in ranked[:limit]
    ]
    emit_table(
        [
            ("size", "right"),
            ("copies", "right"),
            ("matrix", "left"),
            ("time", "right"),
            ("memory", "right"),
            ("sector", "left"),
        ],
        rows,
        title=f"{len(ranked)} sectors; sizes times copies add up to {found.plan.total_dimension}",
    )
    if limit is not None and len(ranked) > limit:
        emit_text(f"{len(ranked) - limit} smaller sectors not shown; --all lists them")
