"""How messages show what a person wrote: on one line, short, with the nearest known word."""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from typing import Any

import numpy as np

__all__ = ["nearest", "shown"]

SHOWN_LENGTH = 60
SHOWN_DIGITS = 60


def nearest(word: str, known: Iterable[str]) -> str:
    """`` (did you mean 'x'?)`` for the known word closest to ``word``, else an empty string."""
    close = difflib.get_close_matches(word[:SHOWN_LENGTH], sorted(known), n=1, cutoff=0.5)
    return f" (did you mean '{close[0]}'?)" if close else ""


def shown(value: Any) -> str:
    """A value as a message shows it: text in quotes, numbers plainly, long things by their kind."""
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, int) and not isinstance(value, bool):
        # Python itself refuses to write out integers of more than 4300 digits.
        digits = value.bit_length() * 30103 // 100000
        return str(value) if digits < SHOWN_DIGITS else f"a number of about {digits} digits"
    if isinstance(value, complex) and value.imag == 0:
        value = value.real
    if isinstance(value, float):
        return f"{value:.6g}"
    if isinstance(value, complex):
        return f"{value:.6g}"
    if isinstance(value, str):
        return repr(value if len(value) <= SHOWN_LENGTH else value[: SHOWN_LENGTH - 3] + "...")
    if isinstance(value, list | tuple | dict | set) and len(value) > 8:
        return f"a {type(value).__name__} of {len(value)} entries"
    try:
        text = " ".join(repr(value).split())
    except (ValueError, RecursionError):
        return f"a {type(value).__name__}"
    return text if len(text) <= SHOWN_LENGTH else f"a {type(value).__name__}"
