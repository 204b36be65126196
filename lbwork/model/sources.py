"""From what a person wrote to numbers: scalars and local matrices of a term."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from lbwork.errors import ModelError
from lbwork.model.expressions import LocalOperator, evaluate
from lbwork.model.terms import MAX_MATRIX, MAX_SEED, Number, OperatorSource, RandomOperator
from lbwork.model.words import shown

__all__ = ["resolve_operator", "scalar"]


def scalar(value: Number, names: Mapping[str, complex], place: str) -> complex:
    """A number, or the value of an expression; raises ModelError when it is not a finite number."""
    if isinstance(value, str):
        result = evaluate(value, names, place=place)
        if isinstance(result, LocalOperator):
            raise ModelError(f"{place}: {shown(value)} is an operator; a number is needed here")
        return result
    if not np.isfinite(value):
        raise ModelError(f"{place}: {shown(value)} is not a finite number; give a finite one")
    return complex(value)


def resolve_operator(
    source: OperatorSource, dimension: int, names: Mapping[str, complex], place: str
) -> LocalOperator:
    """The matrix of an operator source on its 1..3 sites; raises ModelError naming ``place``."""
    if isinstance(source, RandomOperator):
        return _random_operator(source, dimension, names, place)
    if isinstance(source, str):
        value = evaluate(source, names, place=place, dimension=dimension)
        if not isinstance(value, LocalOperator):
            raise ModelError(
                f"{place}: {shown(source)} is a number, not an operator; write e.g. '2 I'"
            )
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
    size = dimension**source.range
    if size > MAX_MATRIX:
        raise ModelError(
            f"{place}: a random matrix of size {size} is larger than {MAX_MATRIX}; use fewer sites"
        )
    seed = scalar(source.seed, names, f"{place}: random seed")
    if seed.imag or seed.real != round(seed.real) or not 0 <= seed.real < MAX_SEED:
        raise ModelError(
            f"{place}: random seed {shown(source.seed)} is {shown(seed)}; give one of 0, 1, 2, ..."
        )
    # A whole number keeps all its digits; an expression has those of a double.
    whole = source.seed if isinstance(source.seed, int) else round(seed.real)
    generator = np.random.Generator(np.random.PCG64(whole))
    matrix = generator.normal(size=(size, size)) + 1j * generator.normal(size=(size, size))
    if source.kind == "hermitian":
        matrix = matrix + matrix.conj().T
    return LocalOperator(source.range, matrix * np.sqrt(size) / np.linalg.norm(matrix))
