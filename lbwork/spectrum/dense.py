"""Dense eigenvalues with condition numbers through LAPACK's Schur form.

A real block goes through the real routine: about a third of the time and exact conjugate pairs.
The BLAS thread number is fixed while it runs, so that the same block gives the same bits whatever
else the machine does.
"""

from __future__ import annotations

import numpy as np
from scipy.linalg import lapack

from lbwork.errors import NotCertifiedError
from lbwork.provenance import limited_threads
from lbwork.spectrum.triangular import complex_schur_form, triangular_condition_numbers

__all__ = ["dense_levels"]


def _unsorted(*_: object) -> int:
    return 0


def dense_levels(matrix: np.ndarray, threads: int) -> tuple[np.ndarray, np.ndarray]:
    """Eigenvalues (n,) complex128 and their condition numbers (n,) float64.

    ``matrix`` (n, n) float64 or complex128 is overwritten when it is Fortran-ordered. The condition
    number is ``kappa_i = ||x_i|| ||y_i|| / |y_i^dag x_i|`` with right and left eigenvectors.
    Raises NotCertifiedError when the QR iteration does not converge.
    """
    if matrix.shape[0] == 1:
        return matrix.astype(complex).ravel(), np.ones(1)
    with limited_threads(threads):
        return _levels(matrix)


def _levels(matrix: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    real = not np.iscomplexobj(matrix)
    schur = lapack.dgees if real else lapack.zgees
    work = schur(_unsorted, matrix, compute_v=0, lwork=-1)[-2]
    form, *values = schur(_unsorted, matrix, compute_v=0, lwork=int(work[0].real), overwrite_a=1)
    info = values[-1]
    if info != 0:
        raise NotCertifiedError(
            f"QR iteration on a block of size {matrix.shape[0]} stopped at level {info}; "
            "scale the model to couplings of order 1"
        )
    if not real:
        levels = np.array(values[1], dtype=complex)
        return levels, triangular_condition_numbers(form, levels)
    levels = values[1] + 1j * values[2]
    # Below a standardised 2 x 2 block only; anything else there is LAPACK's scratch space.
    form = np.triu(form) + np.diag(np.where(levels.imag[:-1] > 0, np.diagonal(form, -1), 0), -1)
    return levels, triangular_condition_numbers(complex_schur_form(form), levels)
