"""Terms of a model as they are written: an operator, where it acts, and its coefficient or rate."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from lbwork.errors import ModelError
from lbwork.model.words import nearest, shown

__all__ = ["Jump", "Number", "OperatorSource", "RandomOperator", "Term"]

Number = float | complex | str
"""A number or an expression in the parameters (and ``j``, ``L`` where a place is known)."""

MAX_MATRIX = 1024
MAX_SEED = 2**63
RANDOM_KINDS = ("hermitian", "ginibre")
PLACES = ("all", "sites", "bonds", "triples", "first", "last")


@dataclass(frozen=True)
class RandomOperator:
    """A seeded random matrix on ``range`` sites: ``hermitian`` (GUE) or ``ginibre``.

    Entries are independent Gaussians, scaled so that the squared Frobenius norm equals the matrix
    dimension. The same seed gives the same matrix. ``seed`` is a whole number >= 0 or an expression
    in the parameters. Raises ModelError.
    """

    kind: str
    range: int
    seed: int | str
    _place: str = field(default="random operator", repr=False, compare=False)

    def __post_init__(self) -> None:
        place = self._place
        if not isinstance(self.kind, str) or self.kind not in RANDOM_KINDS:
            hint = nearest(self.kind, RANDOM_KINDS) if isinstance(self.kind, str) else ""
            raise ModelError(
                f"{place}: random kind {shown(self.kind)} is not known{hint}; use hermitian or "
                "ginibre"
            )
        if not _is_whole(self.range) or self.range not in (1, 2, 3):
            raise ModelError(
                f"{place}: random range {shown(self.range)} is not a whole number of sites up to "
                "3; give 1, 2 or 3"
            )
        object.__setattr__(self, "range", int(self.range))
        if isinstance(self.seed, str):
            return
        if not _is_whole(self.seed) or not 0 <= self.seed < MAX_SEED:
            raise ModelError(
                f"{place}: random seed {shown(self.seed)} is not one of 0, 1, 2, ...; give such a "
                "number below 2**63 or an expression"
            )
        object.__setattr__(self, "seed", int(self.seed))


OperatorSource = str | tuple[tuple[Number, ...], ...] | RandomOperator


def _is_whole(value: Any) -> bool:
    return isinstance(value, int | np.integer) and not isinstance(value, bool)


def _freeze_number(value: Any, place: str) -> Number:
    if isinstance(value, str):
        return value
    if isinstance(value, bool | np.bool_):
        raise ModelError(f"{place}: {shown(value)} is not a number; write 0 or 1")
    if isinstance(value, int | float | np.integer | np.floating):
        try:
            return float(value)
        except OverflowError:
            raise ModelError(
                f"{place}: {shown(value)} is too large a number; rescale the units"
            ) from None
    if isinstance(value, complex | np.complexfloating):
        number = complex(value)
        return number.real if number.imag == 0 else number
    raise ModelError(
        f'{place}: {shown(value)} is neither a number nor an expression; write e.g. 0.5 or "2*g"'
    )


def _freeze_operator(value: Any, place: str) -> OperatorSource:
    if isinstance(value, str | RandomOperator):
        return value
    if isinstance(value, np.ndarray):
        value = value.tolist()
    if not isinstance(value, list | tuple) or not value:
        raise ModelError(
            f"{place}: {shown(value)} is not an operator; write an expression or the rows of a "
            "matrix"
        )
    if len(value) > MAX_MATRIX:
        raise ModelError(
            f"{place}: a matrix of {len(value)} rows is larger than {MAX_MATRIX}; use fewer sites"
        )
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
                f"{place}: on = {shown(value)} is not a place{nearest(value, PLACES)}; "
                f"use one of {', '.join(PLACES)} or a list of site numbers"
            )
        return value
    if isinstance(value, np.ndarray):
        value = value.tolist()
    if _is_whole(value):
        value = [value]
    if not isinstance(value, list | tuple | range) or not value:
        raise ModelError(
            f"{place}: on = {shown(value)} is not a place; use one of {', '.join(PLACES)} or a "
            "list of site numbers"
        )
    for entry in value:
        if not _is_whole(entry):
            raise ModelError(
                f"{place}: site number {shown(entry)} is not a whole number; sites are 1, 2, ... "
                "without quotes"
            )
    numbers = tuple(int(entry) for entry in value)
    if len(set(numbers)) != len(numbers):
        raise ModelError(
            f"{place}: a site number is given twice in on = {shown(list(numbers))}; list each once"
        )
    return numbers


def _freeze_coefficient(value: Any, place: str) -> Number | tuple[Number, ...]:
    if isinstance(value, np.ndarray):
        value = value.tolist()
    if isinstance(value, list | tuple):
        if not value:
            raise ModelError(f"{place}: the list of values is empty; give one value per place")
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
    numbers of the operator's first site. ``coefficient``: number, expression (may use ``j``, the
    number of the operator's first site, and ``L``) or one value per place. Raises ModelError.
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

    The rate stands outside the operator: ``rate (l rho l^dag - 1/2 {l^dag l, rho})``; the other
    fields are those of :class:`Term`. Raises ModelError.
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
