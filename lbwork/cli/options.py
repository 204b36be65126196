"""Options that several verbs share, and how their words become a model."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any

import typer

from lbwork.errors import UsageError
from lbwork.model import Model, load_model

__all__ = [
    "Boundary",
    "Fresh",
    "JsonFlag",
    "ModelName",
    "RunName",
    "RunsFolder",
    "Settings",
    "Sites",
    "chosen_model",
    "one_size",
    "several_sizes",
]

ModelName = Annotated[str, typer.Argument(help="Catalogue name or model file.", metavar="MODEL")]
Sites = Annotated[
    str | None, typer.Option("--sites", "-L", help="Number of sites (4:8 or 4:10:2 for a range).")
]
Settings = Annotated[
    list[str] | None,
    typer.Option("--set", "-s", help="Change a parameter: name=value. May be repeated."),
]
Boundary = Annotated[
    str | None, typer.Option("--boundary", help="open or periodic, instead of the model's own.")
]
JsonFlag = Annotated[bool, typer.Option("--json", help="Print one JSON document on stdout.")]
Fresh = Annotated[
    bool, typer.Option("--fresh", help="Start anew even if an unfinished run could be taken up.")
]
RunName = Annotated[str, typer.Argument(help="Run id, or the beginning of it.", metavar="RUN")]
RunsFolder = Annotated[Path, typer.Option("--runs", help="Folder of the kept runs.")]


def _number(name: str, text: str) -> float | complex:
    for kind in (float, complex):
        try:
            return kind(text)
        except ValueError:
            continue
    raise UsageError(f"--set {name}={text}: '{text}' is not a number; write e.g. --set {name}=0.5")


def _whole(text: str, option: str) -> int:
    try:
        return int(text)
    except ValueError:
        raise UsageError(f"{option} {text}: '{text}' is not a whole number; write e.g. 6") from None


def several_sizes(text: str | None) -> tuple[int, ...] | None:
    """``6`` -> (6,), ``4:8`` -> (4, 5, 6, 7, 8), ``4:10:2`` -> (4, 6, 8, 10); None stays None."""
    if text is None:
        return None
    parts = text.split(":")
    if len(parts) > 3 or "" in parts:
        raise UsageError(f"--sites {text}: write 6, 4:8 or 4:10:2")
    numbers = [_whole(part, "--sites") for part in parts]
    if len(numbers) == 1:
        return (numbers[0],)
    step = numbers[2] if len(numbers) == 3 else 1
    if step < 1 or numbers[1] < numbers[0]:
        raise UsageError(
            f"--sites {text}: the range must grow; write first:last or first:last:step"
        )
    return tuple(range(numbers[0], numbers[1] + 1, step))


def one_size(text: str | None) -> int | None:
    """A single number of sites; a range is refused."""
    sizes = several_sizes(text)
    if sizes is None:
        return None
    if len(sizes) != 1:
        raise UsageError(f"--sites {text}: this verb takes one size; only gap takes a range")
    return sizes[0]


def chosen_model(
    name: str, sites: int | None, settings: list[str] | None, boundary: str | None = None
) -> Model:
    """Load a model and apply the changes asked for on the command line."""
    changes: dict[str, Any] = {}
    for setting in settings or []:
        key, separator, value = setting.partition("=")
        key = key.strip()
        if not separator or not key or not value.strip():
            raise UsageError(f"--set {setting}: write name=value, e.g. --set delta=0.5")
        if key in changes:
            raise UsageError(f"--set {key} is given twice; give each parameter once")
        if key in ("sites", "boundary", "name"):
            raise UsageError(f"--set {key}: use --{key} for this, --set is for parameters")
        changes[key] = _number(key, value.strip())
    if sites is not None:
        changes["sites"] = sites
    if boundary is not None:
        if boundary not in ("open", "periodic"):
            raise UsageError(f"--boundary {boundary}: choose open or periodic")
        changes["boundary"] = boundary
    return load_model(name, **changes)
