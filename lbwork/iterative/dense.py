"""Sector vectors and small sectors as dense arrays, with little memory besides the array."""

from __future__ import annotations

import numpy as np

from lbwork.iterative.solver import ChainEquations, SectorSolver
from lbwork.iterative.space import SectorSpace

__all__ = ["component_matrix", "dense_matrix", "make_hermitian"]

_ROWS = 256


def dense_matrix(solver: SectorSolver) -> np.ndarray:
    """The generator of a small sector as a dense matrix (n, n), column by column."""
    size = solver.space.size
    unit: np.ndarray = np.eye(size, dtype=solver.space.dtype)
    return np.array([solver.apply(unit[index]) for index in range(size)]).T


def make_hermitian(matrix: np.ndarray) -> float:
    """``(M + M^dag)/2`` in place; returns ``||M - M^dag||_F`` from before."""
    size = matrix.shape[0]
    error = 0.0
    for top in range(0, size, _ROWS):
        rows = slice(top, min(top + _ROWS, size))
        for left in range(top, size, _ROWS):
            columns = slice(left, min(left + _ROWS, size))
            upper, lower = matrix[rows, columns], matrix[columns, rows].conj().T.copy()
            share = float(np.linalg.norm(upper - lower)) ** 2
            error += share if left == top else 2 * share
            mean = (upper + lower) / 2
            matrix[rows, columns] = mean
            matrix[columns, rows] = mean.conj().T
    return float(np.sqrt(error))


def component_matrix(
    equations: ChainEquations, space: SectorSpace, vector: np.ndarray
) -> np.ndarray:
    """A sector vector as an operator (D, D) in the basis that the model is written in."""
    matrix = space.to_matrix(vector)
    rotation = equations.form.rotation
    if rotation is None:
        return matrix
    sites, dimension = equations.form.sites, equations.form.dimension
    tensor = matrix.reshape((dimension,) * (2 * sites))
    for site in range(sites):
        local = rotation[site % len(rotation)]
        tensor = np.moveaxis(np.tensordot(local, tensor, axes=(1, site)), 0, site)
        tensor = np.moveaxis(
            np.tensordot(local.conj(), tensor, axes=(1, sites + site)), 0, sites + site
        )
    return np.ascontiguousarray(tensor.reshape(matrix.shape))
