"""Density matrices and operators forward in time."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence

import numpy as np

from lbwork import defaults
from lbwork.errors import UsageError
from lbwork.generator import Lindbladian
from lbwork.iterative import ChainEquations, SectorSpace, chain_equations, whole_space
from lbwork.iterative.action import SectorGenerator
from lbwork.model import Model
from lbwork.observables import checked_density, expectation, magnetisation_profile
from lbwork.observables.blocks import block_eigenvalues
from lbwork.provenance import limited_threads
from lbwork.relaxation.krylov import Propagator
from lbwork.relaxation.records import Evolution

__all__ = ["StateSpace", "evolve", "evolve_operator", "state_space"]

Tell = Callable[[int, str], None]
Local = tuple[np.ndarray, tuple[int, ...]]


class StateSpace:
    """Flat vectors for density matrices: the neutral sector where the state lies in it, else all.

    A state without coherences between charges stays so; its sector is smaller and real.
    """

    def __init__(self, generator: Lindbladian, sector: tuple[ChainEquations, SectorSpace] | None):
        self._generator = generator
        self._space = None if sector is None else sector[1]
        self._action = None if sector is None else SectorGenerator(sector[1], sector[0].form)
        self.size = generator.dimension**2 if self._space is None else self._space.size
        self.dtype: type = complex if self._space is None else float

    def vector(self, matrix: np.ndarray) -> np.ndarray:
        """Flat vector of an operator (D, D)."""
        if self._space is not None:
            return self._space.from_matrix(matrix)
        return np.ascontiguousarray(matrix, dtype=complex).reshape(-1)

    def matrix(self, vector: np.ndarray) -> np.ndarray:
        """The operator (D, D) of a flat vector."""
        if self._space is not None:
            return self._space.to_matrix(vector)
        return vector.reshape((self._generator.dimension,) * 2)

    def apply(self, vector: np.ndarray) -> np.ndarray:
        """``L`` on a flat vector."""
        if self._action is not None:
            return self._action.apply(vector)
        return self._generator.apply(self.matrix(vector)).reshape(-1)


def state_space(generator: Lindbladian, density: np.ndarray) -> StateSpace:
    """The smallest of the two spaces that holds a Hermitian operator (D, D)."""
    equations = chain_equations(generator.model)
    space = whole_space(equations.groups)
    if equations.form.rotation is None and len(equations.groups.labels) > 1:
        inside = np.linalg.norm(space.from_matrix(density))
        whole = np.linalg.norm(density)
        if abs(inside - whole) <= 1e-14 * whole and np.allclose(
            space.to_matrix(space.from_matrix(density)), density, rtol=0, atol=1e-15
        ):
            return StateSpace(generator, (equations, space))
    return StateSpace(generator, None)


def _checked_times(times: Sequence[float]) -> np.ndarray:
    values = np.asarray(times, dtype=float)
    if values.ndim != 1 or values.size == 0:
        raise UsageError("give at least one time")
    if not np.all(np.isfinite(values)) or values[0] < 0 or np.any(np.diff(values) <= 0):
        raise UsageError("times must be finite, not negative and in ascending order")
    return values


def evolve(
    model: Model,
    state: np.ndarray,
    times: Sequence[float],
    *,
    operators: Mapping[str, Local] | None = None,
    steady: np.ndarray | None = None,
    tolerance: float = defaults.RELAXATION_TOLERANCE,
    tell: Tell = lambda done, words: None,
) -> Evolution:
    """``rho(t) = exp(t L) rho(0)`` at ascending times.

    ``state``: density matrix (D, D). ``operators``: by name, (matrix, 0-based sites). ``steady``:
    a state to measure the distance from. ``tolerance``: Frobenius error per unit of time over the
    length of the state. Raises UsageError for illegal states and times, CapacityError when the
    Krylov basis does not fit, NotCertifiedError when the tolerance cannot be kept.
    """
    moments = _checked_times(times)
    generator = Lindbladian(model)
    density = checked_density(state, generator.dimension, "the initial state")
    count, dimension = model.sites, model.local_dimension
    with limited_threads(1):
        space = state_space(generator, density)
        carrier = Propagator(space.apply, generator.norm_bound, space.size, space.dtype, tolerance)
        current = space.vector(density)
        now, profile, traces, distances = 0.0, [], [], []
        values: dict[str, list[complex]] = {name: [] for name in operators or {}}
        for done, moment in enumerate(moments):
            tell(done, f"time {now:.4g}, {carrier.applies} applications")
            current = carrier.forward(current, moment - now)
            now = moment
            matrix = space.matrix(current)
            profile.append(magnetisation_profile(matrix, count, dimension))
            traces.append(float(np.trace(matrix).real))
            if steady is not None:
                distances.append(float(np.linalg.norm(matrix - steady)))
            for name, (operator, sites) in (operators or {}).items():
                values[name].append(expectation(matrix, operator, sites, count, dimension))
    skew = float(np.linalg.norm(matrix - matrix.conj().T) / np.linalg.norm(matrix))
    return Evolution(
        model=model,
        picture="states",
        times=moments,
        profile=np.array(profile),
        expectations={name: np.array(row) for name, row in values.items()},
        traces=np.array(traces),
        hermiticity_error=skew,
        smallest=float(block_eigenvalues((matrix + matrix.conj().T) / 2).min()),
        final=np.array(matrix),
        error_bound=float(np.sqrt(generator.dimension)) * carrier.error,
        steps=carrier.steps,
        applies=carrier.applies,
        distances=np.array(distances) if steady is not None else None,
    )


def evolve_operator(
    model: Model,
    operator: np.ndarray,
    times: Sequence[float],
    *,
    states: Mapping[str, np.ndarray] | None = None,
    tolerance: float = defaults.RELAXATION_TOLERANCE,
    tell: Tell = lambda done, words: None,
) -> Evolution:
    """Heisenberg picture, ``A(t) = exp(t L^dag) A``, of an operator (D, D) at ascending times.

    ``states``: density matrices by name, for ``tr(A(t) rho)``. Errors as for :func:`evolve`.
    """
    moments = _checked_times(times)
    generator = Lindbladian(model)
    size = generator.dimension
    matrix = np.asarray(operator, dtype=complex)
    if matrix.shape != (size, size):
        raise UsageError(f"the operator has shape {matrix.shape}; it must be ({size}, {size})")
    start_skew = float(np.linalg.norm(matrix - matrix.conj().T))

    def apply(vector: np.ndarray) -> np.ndarray:
        return generator.apply_adjoint(vector.reshape(size, size)).reshape(-1)

    with limited_threads(1):
        carrier = Propagator(apply, generator.norm_bound, size**2, complex, tolerance)
        current = matrix.reshape(-1).copy()
        now, traces = 0.0, []
        values: dict[str, list[complex]] = {name: [] for name in states or {}}
        for done, moment in enumerate(moments):
            tell(done, f"time {now:.4g}, {carrier.applies} applications")
            current = carrier.forward(current, moment - now)
            now = moment
            matrix = current.reshape(size, size)
            traces.append(float(np.trace(matrix).real) / size)
            for name, state in (states or {}).items():
                values[name].append(complex(np.sum(matrix * state.T)))
    skew = float(np.linalg.norm(matrix - matrix.conj().T)) if start_skew == 0 else float("nan")
    return Evolution(
        model=model,
        picture="operators",
        times=moments,
        profile=None,
        expectations={name: np.array(row) for name, row in values.items()},
        traces=np.array(traces),
        hermiticity_error=skew,
        smallest=None,
        final=np.array(matrix),
        error_bound=carrier.error,
        steps=carrier.steps,
        applies=carrier.applies,
        distances=None,
    )
