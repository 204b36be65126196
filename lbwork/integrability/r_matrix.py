"""R-matrices ``R(u, v)`` on two sites, given by a Python function or by a file of expressions.

Index convention: ``R`` is (n**2, n**2) on two neighbouring sites, first site most significant, and
``R(u, u)`` is proportional to the permutation. The density it belongs to is
``q = P dR(u, v)/du`` at ``v = u``, up to factor, identity and telescoping parts.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from lbwork.errors import ExpressionError, NotCertifiedError, UsageError
from lbwork.model.expressions import LocalOperator, evaluate
from lbwork.model.files import parse_toml, read_toml
from lbwork.model.words import nearest, shown

__all__ = ["RMatrix", "ThreeSites", "load_r_matrix", "permutation", "r_matrix_from_toml"]

_KEYS = ("name", "description", "dimension", "parameters", "definitions", "entries")
_POINTS = 16
_RADIUS = 0.05


def permutation(dimension: int) -> np.ndarray:
    """``P |a b> = |b a>``: float64 (n**2, n**2)."""
    one = np.eye(dimension**2).reshape((dimension,) * 4)
    return one.transpose(1, 0, 2, 3).reshape(dimension**2, dimension**2)


@dataclass(frozen=True)
class ThreeSites:
    """Two-site operators (n**2, n**2) on three sites of n = ``dimension`` states."""

    dimension: int

    def first(self, matrix: np.ndarray) -> np.ndarray:
        """On sites 1 and 2: (n**3, n**3)."""
        return np.kron(matrix, np.eye(self.dimension))

    def last(self, matrix: np.ndarray) -> np.ndarray:
        """On sites 2 and 3: (n**3, n**3)."""
        return np.kron(np.eye(self.dimension), matrix)

    def outer(self, matrix: np.ndarray) -> np.ndarray:
        """On sites 1 and 3: (n**3, n**3)."""
        n = self.dimension
        tensor = np.kron(matrix, np.eye(n)).reshape((n,) * 6)
        return tensor.transpose(0, 2, 1, 3, 5, 4).reshape(n**3, n**3)


@dataclass(frozen=True, eq=False)
class RMatrix:
    """``function(u, v)`` returns R as complex (n**2, n**2) for complex u, v; n = ``dimension``."""

    function: Callable[[complex, complex], np.ndarray]
    dimension: int
    name: str = "R"

    def __call__(self, u: complex, v: complex) -> np.ndarray:
        """R at a point; UsageError for a wrong shape or values that are not finite."""
        value = np.asarray(self.function(complex(u), complex(v)), dtype=complex)
        size = self.dimension**2
        if value.shape != (size, size):
            raise UsageError(
                f"R-matrix '{self.name}' has shape {value.shape} at u = {u:.3g}, v = {v:.3g}; "
                f"{self.dimension} states per site need ({size}, {size})"
            )
        if not np.all(np.isfinite(value)):
            raise UsageError(
                f"R-matrix '{self.name}' is not finite at u = {u:.3g}, v = {v:.3g}; move the "
                "points away from its poles"
            )
        return value

    def derivative(self, u: complex, v: complex, argument: int) -> np.ndarray:
        """dR/du (``argument`` 0) or dR/dv (1) from a circle around the point.

        The trapezoidal rule on a circle is exact to rounding for functions that are analytic well
        beyond it. Two radii must agree and Fourier components that analytic functions lack must
        vanish; NotCertifiedError if they do not.
        """
        center, estimates, spread = self(u, v), [], 0.0
        phases = np.exp(2j * np.pi * np.arange(_POINTS) / _POINTS)
        for radius in (_RADIUS, _RADIUS / 2):
            steps = [
                (radius * phase, 0) if argument == 0 else (0, radius * phase) for phase in phases
            ]
            values = np.array([self(u + first, v + second) for first, second in steps])
            components = np.fft.fft(values, axis=0) / _POINTS
            estimates.append(components[1] / radius)
            spread = max(spread, float(np.abs(components[0] - center).max()))
            spread = max(spread, float(np.abs(components[-3:]).max()))
        spread = max(spread, _RADIUS * float(np.abs(estimates[0] - estimates[1]).max()))
        if spread > 1e-10 * max(float(np.abs(center).max()), 1e-300):
            raise NotCertifiedError(
                f"R-matrix '{self.name}' is not analytic around u = {u:.3g}, v = {v:.3g} (circles "
                f"around it differ by {spread:.1e}); move the points or remove moduli and cuts",
                estimates,
            )
        return np.asarray(estimates[0])


def load_r_matrix(path: str | Path, **changes: complex) -> RMatrix:
    """R-matrix from a TOML file; ``changes`` replace parameter values.

    Keys: ``name``, ``dimension`` n (of one site of the density: d**2 for a generator, order
    (a1 b1 a2 b2)), ``[parameters]`` (numbers or expressions), ``[definitions]`` (expressions in u,
    v, the parameters and earlier definitions) and ``[entries]`` (``"row, column" = expression``,
    rows and columns from 1; what is not given is 0). Expressions follow the grammar of model files.
    Raises ModelError, ExpressionError.
    """
    return _from_document(read_toml(Path(path)), shown(str(path)), changes)


def r_matrix_from_toml(text: str, **changes: complex) -> RMatrix:
    """R-matrix from the text of a file, see :func:`load_r_matrix`."""
    return _from_document(parse_toml(text, "R-matrix"), "R-matrix", changes)


def _scalar(text: Any, names: Mapping[str, complex], place: str) -> complex:
    if isinstance(text, bool) or not isinstance(text, int | float | str):
        raise ExpressionError(f"{place}: {shown(text)} is neither a number nor an expression")
    if not isinstance(text, str):
        return complex(text)
    value = evaluate(text, names, place=place)
    if isinstance(value, LocalOperator):
        raise ExpressionError(f"{place}: {shown(text)} is an operator; give a number")
    return value


def _table(document: Mapping[str, Any], key: str, place: str) -> dict[str, Any]:
    table = document.get(key, {})
    if not isinstance(table, dict):
        raise ExpressionError(f"{place}: {key} = {shown(table)} is not a table; write [{key}]")
    return table


def _place_of(key: str, size: int, place: str) -> tuple[int, int]:
    parts = key.split(",")
    try:
        row, column = (int(part) for part in parts)
    except ValueError:
        raise ExpressionError(
            f'{place}: entry {shown(key)} is no place; write it like "1, 4"'
        ) from None
    if not (1 <= row <= size and 1 <= column <= size):
        raise ExpressionError(f"{place}: entry {shown(key)} is outside of 1..{size}; correct it")
    return row - 1, column - 1


def _from_document(
    document: Mapping[str, Any], place: str, changes: Mapping[str, complex]
) -> RMatrix:
    for key in document:
        if key not in _KEYS:
            raise ExpressionError(
                f"{place}: unknown key {shown(key)}{nearest(str(key), _KEYS)}; known keys are "
                f"{', '.join(_KEYS)}"
            )
    dimension = document.get("dimension")
    if isinstance(dimension, bool) or not isinstance(dimension, int) or not 2 <= dimension <= 16:
        raise ExpressionError(
            f"{place}: dimension = {shown(dimension)} is no number of states per site; give 2..16"
        )
    parameters: dict[str, complex] = {}
    for name, value in _table(document, "parameters", place).items():
        value = changes.get(name, value)
        if isinstance(value, complex):
            parameters[name] = value
        else:
            parameters[name] = _scalar(value, parameters, f"{place}: parameter {shown(name)}")
    for name in changes:
        if name not in parameters:
            raise ExpressionError(
                f"{place}: no parameter {shown(name)}{nearest(name, parameters)}; it has "
                f"{', '.join(parameters) or 'none'}"
            )
    definitions = _table(document, "definitions", place)
    for name in [*parameters, *definitions]:
        if name in ("u", "v"):
            raise ExpressionError(f"{place}: {name} is a spectral parameter; choose another name")
    size = dimension**2
    entries = [
        (_place_of(key, size, place), value)
        for key, value in _table(document, "entries", place).items()
    ]
    if not entries:
        raise ExpressionError(f"{place}: there are no entries; give a table [entries]")

    def function(u: complex, v: complex) -> np.ndarray:
        names = {**parameters, "u": u, "v": v}
        for name, text in definitions.items():
            names[name] = _scalar(text, names, f"{place}: definition {shown(name)}")
        matrix = np.zeros((size, size), dtype=complex)
        for (row, column), text in entries:
            label = f"{place}: entry {row + 1}, {column + 1}"
            matrix[row, column] = _scalar(text, names, label)
        return matrix

    return RMatrix(function, dimension, str(document.get("name", "R")))
