"""Named on-site operators for any local dimension.

Spin operators belong to spin (d - 1)/2; basis state 0 is up (highest weight), ``S+`` raises.
"""

from __future__ import annotations

import re
from functools import lru_cache

import numpy as np

__all__ = ["known_operator_names", "local_operator", "operator_hint"]

_UNIT = re.compile(r"E(\d)(\d)", re.ASCII)
_PROJECTOR = re.compile(r"P(\d)", re.ASCII)
_SPIN_HALF = ("X", "Y", "Z", "n")


@lru_cache(maxsize=256)
def local_operator(name: str, dimension: int) -> np.ndarray | None:
    """The matrix of a named operator, complex128 (d, d); None when the name is not known.

    ``I``; ``Sx Sy Sz S+ S-`` for spin (d-1)/2; ``X Y Z`` (Pauli) and ``n`` (occupation, |0><0|) for
    d = 2; ``Zd`` = diag(w^a), w = exp(2 pi i/d), and ``Xd`` = sum |a+1><a| (modulo d); matrix units
    ``Eab`` = |a><b| and projectors ``Pa`` = |a><a|.
    """
    matrix = _build(name, dimension)
    if matrix is not None:
        matrix.setflags(write=False)
    return matrix


def _build(name: str, dimension: int) -> np.ndarray | None:
    spin = (dimension - 1) / 2
    levels = spin - np.arange(dimension)
    raising = np.diag(np.sqrt(spin * (spin + 1) - levels[1:] * levels[:-1]).astype(complex), 1)
    spin_half = {
        "X": np.array([[0, 1], [1, 0]], dtype=complex),
        "Y": np.array([[0, -1j], [1j, 0]], dtype=complex),
        "Z": np.diag([1.0 + 0j, -1.0]),
        "n": np.diag([1.0 + 0j, 0.0]),
    }
    if name in spin_half:
        return spin_half[name] if dimension == 2 else None
    simple = {
        "I": np.eye(dimension, dtype=complex),
        "S+": raising,
        "S-": raising.conj().T.copy(),
        "Sx": (raising + raising.conj().T) / 2,
        "Sy": (raising - raising.conj().T) / 2j,
        "Sz": np.diag(levels.astype(complex)),
        "Xd": np.roll(np.eye(dimension, dtype=complex), 1, axis=0),
        "Zd": np.diag(np.exp(2j * np.pi * np.arange(dimension) / dimension)),
    }
    if name in simple:
        return simple[name]
    unit = _UNIT.fullmatch(name)
    projector = _PROJECTOR.fullmatch(name)
    if unit is None and projector is None:
        return None
    row, column = (int(unit[1]), int(unit[2])) if unit else (int(name[1]), int(name[1]))
    if max(row, column) >= dimension:
        return None
    matrix = np.zeros((dimension, dimension), dtype=complex)
    matrix[row, column] = 1
    return matrix


def known_operator_names(dimension: int) -> tuple[str, ...]:
    """Names that :func:`local_operator` knows for this local dimension."""
    names = ["I", "Sx", "Sy", "Sz", "S+", "S-", "Xd", "Zd"]
    if dimension == 2:
        names += _SPIN_HALF
    names += [f"E{a}{b}" for a in range(dimension) for b in range(dimension)]
    return (*names, *(f"P{a}" for a in range(dimension)))


def operator_hint(word: str, dimension: int) -> str:
    """Why an operator that exists elsewhere does not exist for this dimension, else empty."""
    if word in _SPIN_HALF:
        return f"; {word} belongs to local dimension 2, not {dimension}: use Sx, Sy, Sz or P0"
    if _UNIT.fullmatch(word) or _PROJECTOR.fullmatch(word):
        return f"; the states of local dimension {dimension} are numbered 0 to {dimension - 1}"
    return ""
