"""Figures to files: vector or pixels, equal bytes for equal figures, never half a file."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any, Final

from matplotlib.figure import Figure

from lbwork.errors import StoreError, UsageError
from lbwork.report.style import journal_style

__all__ = ["FORMATS", "save_figure"]

FORMATS: Final = (".pdf", ".svg", ".png")
"""Suffixes a figure can be saved under."""

# Time stamps would make equal figures differ byte by byte.
_METADATA: Final[dict[str, dict[str, Any]]] = {
    ".pdf": {"CreationDate": None, "ModDate": None},
    ".svg": {"Date": None},
    ".png": {},
}


def save_figure(figure: Figure, path: str | os.PathLike[str]) -> Path:
    """Write `figure` to `path` (.pdf, .svg or .png) and return the path.

    The file appears under its name only when it is complete; an older one is replaced. Raises
    UsageError for another suffix or a missing folder, StoreError when the disk refuses.
    """
    target = Path(path)
    suffix = target.suffix.lower()
    if suffix not in _METADATA:
        allowed = ", ".join(FORMATS)
        raise UsageError(f"figure '{target.name}' has suffix '{suffix}'; use one of {allowed}")
    if not target.parent.is_dir():
        raise UsageError(f"folder '{target.parent}' of the figure does not exist; create it first")
    unfinished = target.with_name(f".{target.name}.{os.getpid()}.partial")
    try:
        with journal_style():
            figure.savefig(unfinished, format=suffix[1:], metadata=_METADATA[suffix])
        os.replace(unfinished, target)
    except OSError as error:
        raise StoreError(f"cannot write figure '{target}': {error.strerror or error}") from error
    finally:
        unfinished.unlink(missing_ok=True)
    return target
