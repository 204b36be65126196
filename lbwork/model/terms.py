"""Terms of a model as they are written: an operator, where it acts, and its coefficient or rate."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from lbwork.errors import ModelError
from lbwork.model.expressions import LocalOperator, evaluate, nearest
from lbwork.model.operators import known_operator_names, local_operator

__all__ = ["Jump", "Number", "OperatorSource", "RandomOperator", "Term", "resolve_operator"]

Number = float | complex | str
"""A number or an expression in the parameters (and ``j``, ``L`` where a place is known)."""

MAX_MATRIX = 1024
PLACES = ("all", "sites", "bonds", "triples", "first", "last")


@dataclass(frozen=True)
class RandomOperator:
    """A seeded random matrix on ``range`` sites: ``hermitian`` (GUE) or ``ginibre``.

    Entries are independent Gaussians, scaled so that the squared Frobenius norm equals the matrix
    dimension. The same seed gives the same matrix. ``seed`` is a whole number >= 0 or an expression
    in the parameters.
    """

    kind: str
    range: int
    seed: Number


OperatorSource = str | tuple[tuple[Number, ...], ...] | RandomOperator


def _freeze_number(value: Any, place: str) -> Number:
    if isinstance(value, str):
        return value
    if isinstance(value, bool | np.bool_):
        raise ModelError(f"{place}: {value!r} is not a number; write 0 or 1")
    if isinstance(value, int | float | np.integer | np.floating):
        try:
            return float(value)
        except OverflowError:
            raise ModelError(f"{place}: the number is too large; rescale the units") from None
    if isinstance(value, complex | np.complexfloating):
        number = complex(value)
        return number.real if number.imag == 0 else number
    raise ModelError(f"{place}: {_kind(value)} is not a number or an expression")


def _kind(value: Any) -> str:
    text = repr(value)
    return text if len(text) <= 40 else f"a {type(value).__name__}"


def _freeze_operator(value: Any, place: str) -> OperatorSource:
    if isinstance(value, str | RandomOperator):
        return value
    if isinstance(value, np.ndarray):
        value = value.tolist()
    if not isinstance(value, list | tuple) or not value:
        raise ModelError(f"{place}: {_kind(value)} is not an operator; write an expression or rows")
    if len(value) > MAX_MATRIX:
        raise ModelError(f"{place}: a matrix of {len(value)} rows is larger than {MAX_MATRIX}")
    rows = []
    for index, row in enumerate(value, start=1):
        if not isinstance(row, list | tuple) or len(row) != len(value):
            raise ModelError(
                f"{place}: row {index} of the matrix does not have {len(value)} entries; "
                "give a square matrix as a list of rows"
            )
        rows.append(tuple(_freeze_number(entry, f"{place}, row {index}") for entry in row))
    return tuple(rows)


def _freeze_places(value: Any, place: str) -> str | tuple[int, ...]:
    if isinstance(value, str):
        if value not in PLACES:
            raise ModelError(
                f"{place}: on = '{value}' is not a place{nearest(value, PLACES)}; "
                f"use one of {', '.join(PLACES)} or a list of site numbers"
            )
        return value
    if isinstance(value, int) and not isinstance(value, bool):
        value = [value]
    if not isinstance(value, list | tuple) or not value:
        raise ModelError(f"{place}: on = {_kind(value)} is not a place or a list of site numbers")
    for entry in value:
        if isinstance(entry, bool) or not isinstance(entry, int | np.integer):
            raise ModelError(f"{place}: site number {_kind(entry)} is not a whole number")
    numbers = tuple(int(entry) for entry in value)
    if len(set(numbers)) != len(numbers):
        raise ModelError(f"{place}: a site number is given twice in on = {list(numbers)}")
    return numbers


def _freeze_coefficient(value: Any, place: str) -> Number | tuple[Number, ...]:
    if isinstance(value, np.ndarray):
        value = value.tolist()
    if isinstance(value, list | tuple):
        if not value:
            raise ModelError(f"{place}: the list of values is empty")
        return tuple(
            _freeze_number(entry, f"{place}, entry {index}")
            for index, entry in enumerate(value, start=1)
        )
    return _freeze_number(value, place)


@dataclass(frozen=True)
class Term:
    """A Hamiltonian term ``coefficient * operator`` at the places ``on``.

    ``operator``: expression, square matrix (array or nested sequence, entries may be expressions)
    or :class:`RandomOperator`. ``on``: ``all`` places where it fits; ``sites``, ``bonds`` or
    ``triples`` (the same, checked against the operator's range); ``first``; ``last``; or 1-based
    numbers of the operator's first site. ``coefficient``: number, expression (may use ``j`` and
    ``L``) or one value per place.
    """

    operator: OperatorSource
    on: str | tuple[int, ...] = "all"
    coefficient: Number | tuple[Number, ...] = 1.0
    _place: str = field(default="hamiltonian term", repr=False, compare=False)

    def __post_init__(self) -> None:
        _freeze(self)


@dataclass(frozen=True)
class Jump:
    """A jump operator ``coefficient * operator`` at the places ``on`` with ``rate`` >= 0.

    The rate stands outside the operator: ``rate (l rho l^dag - 1/2 {l^dag l, rho})``.
    """

    operator: OperatorSource
    on: str | tuple[int, ...] = "all"
    rate: Number | tuple[Number, ...] = 1.0
    coefficient: Number | tuple[Number, ...] = 1.0
    _place: str = field(default="jump", repr=False, compare=False)

    def __post_init__(self) -> None:
        _freeze(self)
        object.__setattr__(self, "rate", _freeze_coefficient(self.rate, f"{self._place}: rate"))


def _freeze(item: Term | Jump) -> None:
    place = item._place
    object.__setattr__(item, "operator", _freeze_operator(item.operator, place))
    object.__setattr__(item, "on", _freeze_places(item.on, place))
    object.__setattr__(
        item, "coefficient", _freeze_coefficient(item.coefficient, f"{place}: coefficient")
    )


def scalar(value: Number, names: Mapping[str, complex], place: str) -> complex:
    """A number, or the value of an expression; raises ModelError when it is not a finite number."""
    if isinstance(value, str):
        result = evaluate(value, names, place=place)
        if isinstance(result, LocalOperator):
            raise ModelError(f"{place}: '{value}' is an operator where a number is needed")
        return result
    if not np.isfinite(value):
        raise ModelError(f"{place}: {value} is not a finite number")
    return complex(value)


def resolve_operator(
    source: OperatorSource, dimension: int, names: Mapping[str, complex], place: str
) -> LocalOperator:
    """The matrix of an operator source on its 1..3 sites; raises ModelError naming ``place``."""
    if isinstance(source, RandomOperator):
        return _random_operator(source, dimension, names, place)
    if isinstance(source, str):
        value = evaluate(
            source,
            names,
            place=place,
            operators=lambda name: local_operator(name, dimension),
            known_operators=known_operator_names(dimension),
        )
        if not isinstance(value, LocalOperator):
            raise ModelError(f"{place}: '{source}' is a number, not an operator; write e.g. '2 I'")
        return value
    matrix = np.array(
        [
            [
                scalar(entry, names, f"{place}, matrix row {row} column {column}")
                for column, entry in enumerate(entries, start=1)
            ]
            for row, entries in enumerate(source, start=1)
        ]
    )
    for count in (1, 2, 3):
        if matrix.shape[0] == dimension**count:
            return LocalOperator(count, matrix)
    sizes = ", ".join(str(dimension**count) for count in (1, 2, 3))
    raise ModelError(
        f"{place}: a matrix of size {matrix.shape[0]} does not act on 1, 2 or 3 sites of local "
        f"dimension {dimension}; its size must be one of {sizes}"
    )


def _random_operator(
    source: RandomOperator, dimension: int, names: Mapping[str, complex], place: str
) -> LocalOperator:
    if source.kind not in ("hermitian", "ginibre"):
        raise ModelError(
            f"{place}: random kind '{source.kind}' is not known"
            f"{nearest(source.kind, ('hermitian', 'ginibre'))}; use hermitian or ginibre"
        )
    if source.range not in (1, 2, 3):
        raise ModelError(f"{place}: random range {source.range} must be 1, 2 or 3 sites")
    size = dimension**source.range
    if size > MAX_MATRIX:
        raise ModelError(f"{place}: a random matrix of size {size} is larger than {MAX_MATRIX}")
    seed = scalar(source.seed, names, f"{place}: random seed")
    if seed.imag or seed.real != round(seed.real) or not 0 <= seed.real < 2**63:
        raise ModelError(f"{place}: random seed {source.seed} is not one of 0, 1, 2, ...")
    generator = np.random.Generator(np.random.PCG64(round(seed.real)))
    matrix = generator.normal(size=(size, size)) + 1j * generator.normal(size=(size, size))
    if source.kind == "hermitian":
        matrix = matrix + matrix.conj().T
    return LocalOperator(source.range, matrix * np.sqrt(size) / np.linalg.norm(matrix))
