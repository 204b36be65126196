"""Documents as plain HTML tables, for notebooks and for the report page."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from html import escape
from typing import Any, Final

import numpy as np

__all__ = ["html_table"]

_SHOWN: Final = 12


def html_table(document: Mapping[str, Any], caption: str = "") -> str:
    """One row per field; mappings and lists of mappings become tables inside.

    Every text is escaped. Floats are shown with six digits, of a long list its first twelve entries
    and their number.
    """
    head = f"<caption>{escape(caption)}</caption>" if caption else ""
    rows = "".join(
        f"<tr><th>{escape(str(key))}</th><td>{_cell(value)}</td></tr>"
        for key, value in document.items()
    )
    return f"<table>{head}{rows}</table>"


def _cell(value: Any) -> str:
    if isinstance(value, np.ndarray):
        value = value.tolist()
    if isinstance(value, Mapping):
        return html_table(value)
    if isinstance(value, str) or not isinstance(value, Sequence):
        return escape(_text(value))
    if value and all(isinstance(one, Mapping) for one in value):
        return _records(value)
    shown = ", ".join(_cell(one) for one in value[:_SHOWN])
    return shown + (f", ... ({len(value)} in all)" if len(value) > _SHOWN else "")


def _records(records: Sequence[Mapping[str, Any]]) -> str:
    keys = list(dict.fromkeys(key for record in records for key in record))
    head = "".join(f"<th>{escape(str(key))}</th>" for key in keys)
    rows = "".join(
        "<tr>" + "".join(f"<td>{_cell(record.get(key))}</td>" for key in keys) + "</tr>"
        for record in records[:_SHOWN]
    )
    more = (
        f'<tr><td colspan="{len(keys)}">... {len(records)} in all</td></tr>'
        if len(records) > _SHOWN
        else ""
    )
    return f"<table><tr>{head}</tr>{rows}{more}</table>"


def _text(value: Any) -> str:
    if value is None:
        return "\N{EN DASH}"
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        return f"{value:.6g}"
    if isinstance(value, complex):
        return f"{value.real:.6g}{value.imag:+.6g}i"
    return str(value)
