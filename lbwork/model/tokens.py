"""Words of an expression: numbers, names and symbols, nothing else."""

from __future__ import annotations

import re

from lbwork.errors import ExpressionError
from lbwork.model.words import shown

__all__ = ["Token", "tokens"]

MAX_LENGTH = 2000

Token = tuple[str, str]
"""Kind (``number``, ``name`` or ``symbol``) and text."""

# The exponent of a number is a small e only: 0.5E01 would hide the operator E01.
_TOKEN = re.compile(
    r"(?P<number>(?:\d+\.\d*|\.\d+|\d+)(?:e[+-]?\d+)?j?(?!\.?\w))"
    r"|(?P<name>S[+-]|[A-Za-z_][A-Za-z_0-9]*)"
    r"|(?P<symbol>\*\*|[-+*/^().,])",
    re.ASCII,
)
_GLUED = re.compile(r"\.?\d[\w.]*", re.ASCII)


def tokens(text: str, place: str) -> list[Token]:
    """The words of an expression in order; raises ExpressionError, which opens with ``place``."""
    if len(text) > MAX_LENGTH:
        raise ExpressionError(
            f"{place}: expression of {len(text)} characters is longer than {MAX_LENGTH}; split it "
            "into several terms"
        )
    found: list[Token] = []
    position = 0
    while position < len(text):
        if text[position] in " \t\r\n":
            position += 1
            continue
        match = _TOKEN.match(text, position)
        if match is None:
            raise ExpressionError(f"{place}: in {shown(text)}: {_reason(text, position)}")
        found.append((str(match.lastgroup), match.group()))
        position = match.end()
    if not found:
        raise ExpressionError(f"{place}: the expression is empty; write e.g. 0.5 or X X")
    return found


def _reason(text: str, position: int) -> str:
    glued = _GLUED.match(text, position)
    if glued:
        return (
            f"number and name run together at {shown(glued.group())}; put a space between them "
            "(exponents take a small e: 1e5)"
        )
    return (
        f"character {text[position]!r} is not allowed; use numbers, names, + - * / ^ . and "
        "parentheses"
    )
