"""The closed two-point function of free fermions with dephasing-like noise.

For a chain of :mod:`lbwork.exact.noise` the state is not Gaussian, but its covariance
``Gamma_mn = -i <w_m w_n>`` obeys a linear equation of its own,

    d Gamma/dt = X Gamma + Gamma X^T + sum_k B_k Gamma B_k^T + Y,   X = A - 2 Re N + sum_k B_k^2 / 2

(M. Žnidarič, J. Stat. Mech. L05002 (2010); V. Eisler, J. Stat. Mech. P06007 (2011), from memory;
this form derived here and checked against dense generators). With conserved particles all matrices
fold to complex L x L ones. The entries of Gamma are the unknowns of a sparse system on an L x L
grid, which a direct solver with little fill takes to several hundred sites.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import scipy.linalg
import scipy.sparse as sparse
import scipy.sparse.linalg

from lbwork import defaults
from lbwork.errors import CapacityError, ModelError, NotCertifiedError
from lbwork.exact.noise import NoisyChain
from lbwork.exact.quadratic import quadratic_profile
from lbwork.exact.two_point import (
    TwoPointSystem,
    factorised,
    folded_noise,
    largest_row,
    two_point_system,
)

__all__ = ["NoisyState", "RelaxationGap", "noisy_state", "relaxation_gap", "relaxation_levels"]

MAX_DENSE_UNKNOWNS = 2000
DENSE_GAP_UNKNOWNS = 700
LEVELS = 4
MAX_ZERO_MODES = 60
SEED = 7


@dataclass(frozen=True, eq=False)
class NoisyState:
    """The two-point function of the steady state, which is not Gaussian in general.

    covariance: Gamma, real antisymmetric (2L, 2L). magnetisation (L,): ``<Z_j>``. current: of Z per
    bond (L-1,), coherent and incoherent, None with ``current_reason`` when Z is not conserved
    inside the chain. residual: of the linear equation, over the size of its terms.
    """

    covariance: npt.NDArray[np.float64]
    magnetisation: npt.NDArray[np.float64]
    current: npt.NDArray[np.float64] | None
    current_reason: str
    residual: float


@dataclass(frozen=True)
class RelaxationGap:
    """Slowest decay in the sector of two-point functions that is not a zero mode.

    zero_modes: of the homogeneous equation; at least one when the number of particles is conserved.
    certain: False when a level farther from zero with a smaller real part has not been excluded.
    residual: of the eigenvector, over the norm.
    """

    gap: float
    eigenvalue: complex
    zero_modes: int
    certain: bool
    residual: float


def noisy_state(noisy: NoisyChain) -> NoisyState:
    """Profile, current and all two-point functions of the steady state.

    Up to 770 sites with conserved particles, 380 without. Raises ModelError when the two-point
    function is not unique (no gain or loss, or a part of the chain out of their reach),
    CapacityError, NotCertifiedError when the residual exceeds 1e-9.
    """
    system = two_point_system(noisy)
    gap = _slowest(system)
    if gap.zero_modes:
        raise ModelError(
            f"{gap.zero_modes} two-point functions are conserved: the steady state is not unique; "
            "add gain or loss that reaches them"
        )
    factors = factorised(system.matrix)
    entries = -factors.solve(system.source)
    # One step of refinement makes up for the weak pivoting.
    entries -= factors.solve(system.matrix @ entries + system.source)
    miss = np.linalg.norm(system.matrix @ entries + system.source)
    size = largest_row(system.matrix) * np.linalg.norm(entries) + np.linalg.norm(system.source)
    residual = float(miss / max(size, np.finfo(float).tiny))
    if not residual <= defaults.STEADY_RESIDUAL_TOLERANCE:
        raise NotCertifiedError(
            f"the two-point function of {noisy.chain.sites} sites has residual {residual:.1e}; use "
            "a shorter chain",
            entries,
        )
    covariance = system.covariance(entries)
    current, reason = _current(noisy, covariance)
    return NoisyState(covariance, quadratic_profile(covariance), current, reason, residual)


def _current(noisy: NoisyChain, covariance: np.ndarray) -> tuple[np.ndarray | None, str]:
    """What all sites up to j lose inside the chain has crossed bond j."""
    inner = sparse.csr_matrix(noisy.chain.hamiltonian)
    if any(form.nnz and folded_noise(form) is None for form in (inner, *noisy.noise)):
        return None, "the Hamiltonian or a jump inside the chain changes the magnetisation"
    change = np.zeros_like(covariance)
    for form in noisy.noise:
        inner = inner + form @ form / 2
        rows, columns = np.unique(form.nonzero()[0]), np.unique(form.nonzero()[1])
        small = form[rows][:, columns].toarray()
        change[np.ix_(rows, rows)] += small @ covariance[np.ix_(columns, columns)] @ small.T
    product = inner @ covariance
    change += product - product.T
    return -np.cumsum(quadratic_profile(change))[:-1], ""


def relaxation_levels(noisy: NoisyChain) -> npt.NDArray[np.complex128]:
    """Eigenvalues of the homogeneous equation: levels of the generator, complex, by real part.

    With conserved particles the L^2 levels of ``c_i^dag c_j``, up to 44 sites; otherwise the
    L(2L-1) levels of all ``w_m w_n``, m < n, up to 31 sites. Raises CapacityError.
    """
    system = two_point_system(noisy)
    unknowns = system.matrix.shape[0]
    if unknowns > MAX_DENSE_UNKNOWNS:
        raise CapacityError(
            f"{unknowns} two-point functions are more than {MAX_DENSE_UNKNOWNS}; use a shorter "
            "chain, or the gap alone"
        )
    values = scipy.linalg.eigvals(system.matrix.toarray())
    return np.asarray(values[np.argsort(-values.real, kind="stable")])


def _levels_near_zero(matrix: sparse.csc_matrix, count: int) -> tuple[np.ndarray, np.ndarray]:
    """Levels nearest to a small positive number and their residuals over the norm."""
    size, norm = matrix.shape[0], largest_row(matrix)
    if size <= defaults.FILTER_SMALLEST_DIMENSION:
        values, vectors = scipy.linalg.eig(matrix.toarray())
    else:
        # No level has a positive real part: the shifted matrix is regular, and a real level that is
        # farthest to the right is the nearest one.
        shift = norm / (10 * size)
        factors = factorised(sparse.csc_matrix(matrix - shift * sparse.identity(size)))
        inverse = scipy.sparse.linalg.LinearOperator((size, size), factors.solve, dtype=float)
        start = np.random.default_rng(SEED).standard_normal(size)
        found, vectors = scipy.sparse.linalg.eigs(inverse, min(count, size - 2), v0=start)
        values = shift + 1 / found
    misses = np.linalg.norm(matrix @ vectors - vectors * values, axis=0)
    return values, misses / (norm * np.linalg.norm(vectors, axis=0))


def _slowest(system: TwoPointSystem) -> RelaxationGap:
    matrix = system.matrix
    size, count = matrix.shape[0], LEVELS
    limit = defaults.ZERO_MODE_TOLERANCE * largest_row(matrix)
    while True:
        values, residuals = _levels_near_zero(matrix, count)
        still = np.abs(values) <= limit
        if not still.all():
            break
        if values.size >= size - 2 or count > MAX_ZERO_MODES:
            raise ModelError(
                f"at least {values.size} two-point functions are conserved; damp them by more jumps"
            )
        count *= 4
    order = np.flatnonzero(~still)
    best = order[np.argmax(values[order].real)]
    zero_modes, value = int(still.sum()), complex(values[best])
    # exp(t X) G exp(t X^dag) and B G B^dag are positive maps of folded covariances, hence a level
    # with the largest real part is real (M. Krein, M. Rutman, Usp. Mat. Nauk 3, 3 (1948)).
    certain = values.size == size or (system.conserving and zero_modes == 0)
    return RelaxationGap(
        -value.real,
        complex(value.real, abs(value.imag)),
        zero_modes,
        certain,
        float(residuals[best]),
    )


def relaxation_gap(noisy: NoisyChain) -> RelaxationGap:
    """Slowest decay of two-point functions: a level of the generator, not always its slowest.

    All levels where :func:`relaxation_levels` gives them quickly (up to 700 unknowns); else those
    near zero, up to 770 sites with conserved particles. With conserved particles and gain or loss
    the slowest level is real and found for certain. For dephasing alone, or without conservation, a
    level far from zero that decays more slowly is not excluded: then ``certain`` is False. Raises
    ModelError when nothing decays, CapacityError, NotCertifiedError for a residual above 1e-9.
    """
    system = two_point_system(noisy)
    gap = _slowest(system)
    size = system.matrix.shape[0]
    if not gap.certain and size <= DENSE_GAP_UNKNOWNS:
        levels = relaxation_levels(noisy)
        limit = defaults.ZERO_MODE_TOLERANCE * largest_row(system.matrix)
        decaying = levels[np.abs(levels) > limit]
        value = complex(decaying[0])
        gap = RelaxationGap(
            -value.real,
            complex(value.real, abs(value.imag)),
            size - decaying.size,
            True,
            gap.residual,
        )
    if not gap.residual <= defaults.GAP_RESIDUAL_TOLERANCE:
        raise NotCertifiedError(
            f"the slowest two-point function of {noisy.chain.sites} sites has residual "
            f"{gap.residual:.1e}; use a shorter chain",
            gap,
        )
    return gap
