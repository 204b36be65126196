"""``exp(t L) v`` in a Krylov space, with a bound of the error that is made.

In one step of length s the error is ``int_0^s exp((s - u) L) r(u) du`` with the residual
``r(u) = |v| h_(m+1,m) [exp(u H)]_(m,1) v_(m+1)`` (Y. Saad, SIAM J. Numer. Anal. 29, 209 (1992);
from memory). ``exp(t L)`` does not enlarge the trace norm of an operator, its adjoint not the
operator norm, so the Frobenius lengths of the residuals, integrated and summed over all steps,
bound the operator norm of the error of an observable, and times ``sqrt(D)`` the trace norm of the
error of a state.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import scipy.linalg

from lbwork import defaults
from lbwork.errors import CapacityError, NotCertifiedError
from lbwork.iterative.products import combine, project
from lbwork.provenance import usable_memory

__all__ = ["Propagator"]

_POINTS = 16


@dataclass(eq=False)
class Propagator:
    """Carries a vector forward in time.

    ``apply``: the generator on flat vectors; ``norm``: an upper bound of its size, which sets the
    first step; ``tolerance``: wanted bound of the error per unit of time over the length of the
    first vector, in the Frobenius norm. ``error`` adds up what was reached; ``steps`` and
    ``applies`` count the work. Raises CapacityError when the Krylov basis does not fit in memory.
    """

    apply: Callable[[np.ndarray], np.ndarray]
    norm: float
    size: int
    dtype: type
    tolerance: float
    error: float = 0.0
    steps: int = 0
    applies: int = 0

    def __post_init__(self) -> None:
        vector = self.size * np.dtype(self.dtype).itemsize
        fits = int(usable_memory() // (2 * vector)) - 2
        if fits < 4:
            raise CapacityError(
                f"Krylov vectors of {vector / 2**30:.1f} GiB do not fit; use fewer sites"
            )
        self._order = min(defaults.RELAXATION_ORDER, fits, self.size)
        self._step = 0.5 * self._order / max(self.norm, 1e-300)

    def forward(self, vector: np.ndarray, time: float) -> np.ndarray:
        """``exp(time L) vector``; raises NotCertifiedError when the tolerance cannot be kept."""
        current: np.ndarray = np.array(vector, dtype=self.dtype)
        scale = max(float(np.linalg.norm(current)), 1e-300)
        left = float(time)
        while left > 0:
            length = float(np.linalg.norm(current))
            if length == 0:
                return current
            basis, small, order = self._arnoldi(current, length)
            step = min(self._step, left)
            for _ in range(60):
                exponential, error = self._small(small, order, step, length)
                if error <= self.tolerance * scale * step or error <= 1e-16 * length:
                    break
                step /= 2
            else:
                raise NotCertifiedError(
                    f"no step reaches an error of {self.tolerance:.1e} per unit of time; ask for "
                    "less accuracy"
                )
            current = np.zeros_like(current)
            combine(length * exponential, basis[:order], current, 1)
            self.error += error
            self.steps += 1
            left -= step
            if step == self._step or step < 0.6 * self._step:
                self._step = step
            if error < 1e-3 * self.tolerance * scale * step:
                self._step *= 1.5
        return current

    def _arnoldi(self, vector: np.ndarray, length: float) -> tuple[np.ndarray, np.ndarray, int]:
        """Orthonormal rows, the Hessenberg matrix (m + 1, m) and the order m that was reached."""
        order = self._order
        basis: np.ndarray = np.empty((order + 1, self.size), dtype=self.dtype)
        small: np.ndarray = np.zeros((order + 1, order), dtype=self.dtype)
        basis[0] = vector / length
        for column in range(order):
            image = self.apply(basis[column])
            self.applies += 1
            before = float(np.linalg.norm(image))
            for _ in range(2):
                share = project(basis[: column + 1], image)
                combine(share, basis[: column + 1], image, -1)
                small[: column + 1, column] += share
            rest = float(np.linalg.norm(image))
            small[column + 1, column] = rest
            if rest <= 1e-14 * max(before, self.norm * 1e-2, 1e-300):
                # An invariant subspace: the exponential is exact in it.
                small[column + 1, column] = 0
                return basis, small, column + 1
            basis[column + 1] = image / rest
        return basis, small, order

    def _small(
        self, small: np.ndarray, order: int, step: float, length: float
    ) -> tuple[np.ndarray, float]:
        """First column of the exponential (m,) and the integrated residual of the step."""
        inner = small[:order, :order]
        part = scipy.linalg.expm(inner * (step / _POINTS))
        column = np.zeros(order, dtype=part.dtype)
        column[0] = 1
        lasts = [abs(column[-1])]
        for _ in range(_POINTS):
            column = part @ column
            lasts.append(abs(column[-1]))
        # The residual grows towards the end of the step, so the upper sum bounds the integral.
        upper = np.maximum(lasts[1:], lasts[:-1]).sum() * step / _POINTS
        return column, float(length * abs(small[order, order - 1]) * upper)
