"""Steady state, rapidities, gap and dynamics of chains that are quadratic in fermions.

T. Prosen, New J. Phys. 10, 043026 (2008). With ``Gamma_mn = -i <w_m w_n>`` (m != n; real,
antisymmetric, ``<Z_j> = Gamma_{2j-1,2j}``) the Lindblad equation of an even state becomes

    d Gamma/dt = X Gamma + Gamma X^T + Y,   X = A - 2 Re N,   Y = 4 Im N

(derived here in this form, checked against dense generators). The rapidities are the 2L eigenvalues
of -X. Where the number of particles is conserved up to gain and loss, X and Y are complex L x L
matrices in disguise: a 2 x 2 block ((a, -b), (b, a)) per pair of sites is the number a + ib.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from lbwork import defaults
from lbwork.errors import ModelError, NotCertifiedError
from lbwork.exact.arguments import checked_finite
from lbwork.exact.lyapunov import SchurForm, schur_form, solve_lyapunov
from lbwork.exact.majorana import QuadraticChain

__all__ = [
    "QuadraticState",
    "evolved_covariance",
    "hamiltonian_currents",
    "product_covariance",
    "quadratic_profile",
    "quadratic_state",
    "rapidities",
]

TAYLOR_ORDER = 16


@dataclass(frozen=True, eq=False)
class QuadraticState:
    """Gaussian steady state.

    covariance: Gamma, real antisymmetric (2L, 2L); every even correlation follows from it by Wick's
    theorem. magnetisation (L,): ``<Z_j>``. current: of Z per bond (L-1,), None with
    ``current_reason`` when the Hamiltonian does not conserve Z. rapidities: complex (2L,), real
    parts > 0. residual: ``||X Gamma + Gamma X^T + Y|| / (2 ||X|| ||Gamma|| + ||Y||)``.
    """

    covariance: npt.NDArray[np.float64]
    magnetisation: npt.NDArray[np.float64]
    current: npt.NDArray[np.float64] | None
    current_reason: str
    rapidities: npt.NDArray[np.complex128]
    residual: float


def _blocks(matrix: np.ndarray) -> np.ndarray:
    """The same numbers as (L, 2, L, 2): site, component, site, component."""
    sites = matrix.shape[0] // 2
    return matrix.reshape(sites, 2, sites, 2)


def conserves_particles(matrix: npt.NDArray[np.float64]) -> bool:
    """Whether every 2 x 2 block of a real (2L, 2L) form is a rotation times a number."""
    block = _blocks(matrix)
    limit = defaults.CONSERVATION_TOLERANCE * np.abs(matrix).max(initial=0.0)
    even = np.abs(block[:, 0, :, 0] - block[:, 1, :, 1]).max(initial=0.0)
    odd = np.abs(block[:, 0, :, 1] + block[:, 1, :, 0]).max(initial=0.0)
    return bool(max(even, odd) <= limit)


def folded(matrix: npt.NDArray[np.float64]) -> npt.NDArray[np.complex128]:
    """Complex (L, L) matrix of a real (2L, 2L) one that conserves particles."""
    block = _blocks(matrix)
    return np.asarray(block[:, 0, :, 0] + 1j * block[:, 1, :, 0])


def unfolded(matrix: npt.NDArray[np.complex128]) -> npt.NDArray[np.float64]:
    """Real (2L, 2L) matrix of a complex (L, L) one: the inverse of :func:`folded`."""
    sites = matrix.shape[0]
    block = np.empty((sites, 2, sites, 2))
    block[:, 0, :, 0] = block[:, 1, :, 1] = matrix.real
    block[:, 1, :, 0] = matrix.imag
    block[:, 0, :, 1] = -matrix.imag
    return np.asarray(block.reshape(2 * sites, 2 * sites))


def _equation(chain: QuadraticChain) -> tuple[np.ndarray, np.ndarray]:
    """X and Y, as complex (L, L) matrices where particles are conserved, else real (2L, 2L)."""
    drift, source = chain.drift(), chain.source()
    if conserves_particles(drift) and conserves_particles(source):
        return folded(drift), folded(source)
    return drift, source


def _all_rapidities(form: SchurForm) -> np.ndarray:
    # A folded matrix stands for itself and its complex conjugate.
    if np.iscomplexobj(form.triangle):
        return np.concatenate([-form.levels, -form.levels.conj()])
    return np.asarray(-form.levels)


def rapidities(chain: QuadraticChain) -> npt.NDArray[np.complex128]:
    """Eigenvalues of -X, complex (2L,), closed under conjugation, by ascending real part.

    Real parts are >= 0; one that vanishes is an undamped mode. 2000 sites with conserved particles
    take under half a minute, eight times more without. Prosen (2008).
    """
    matrix = _equation(chain)[0]
    levels = -np.linalg.eigvals(matrix).astype(complex)
    if np.iscomplexobj(matrix):
        levels = np.concatenate([levels, levels.conj()])
    return levels[np.argsort(levels.real, kind="stable")]


def quadratic_profile(covariance: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """``<Z_j>``, float64 (L,)."""
    return np.diagonal(covariance, 1)[::2].copy()


def hamiltonian_currents(
    chain: QuadraticChain, covariance: npt.NDArray[np.float64]
) -> npt.NDArray[np.float64] | None:
    """Current of Z that the Hamiltonian carries across each bond to the right, float64 (L-1,).

    ``d<Z_j>/dt = j_{j-1} - j_j`` + gain and loss. None when H does not conserve Z.
    """
    if not conserves_particles(chain.hamiltonian):
        return None
    even, odd = slice(0, None, 2), slice(1, None, 2)
    gain = (covariance[even] * chain.hamiltonian[odd]).sum(axis=1)
    gain -= (covariance[odd] * chain.hamiltonian[even]).sum(axis=1)
    # What the sites up to j lose has crossed bond j.
    return np.asarray(-np.cumsum(gain)[:-1])


def quadratic_state(chain: QuadraticChain) -> QuadraticState:
    """The steady state of a quadratic chain, which is Gaussian and unique when all modes decay.

    Costs (2L)^3, or L^3 with conserved particles. Raises ModelError when a mode does not decay,
    NotCertifiedError when the residual exceeds 1e-9. Prosen (2008).
    """
    matrix, source = _equation(chain)
    form = schur_form(matrix)
    solution = solve_lyapunov(form, source)
    product = matrix @ solution
    size = 2 * np.linalg.norm(matrix) * np.linalg.norm(solution) + np.linalg.norm(source)
    miss = np.linalg.norm(product - product.conj().T + source)
    residual = float(miss / max(size, np.finfo(float).tiny))
    if not residual <= defaults.STEADY_RESIDUAL_TOLERANCE:
        raise NotCertifiedError(
            f"the covariance of {chain.sites} sites has residual {residual:.1e}; a mode decays too "
            "slowly, use a shorter chain",
            solution,
        )
    covariance = unfolded(solution) if np.iscomplexobj(solution) else solution
    current = hamiltonian_currents(chain, covariance)
    reason = "" if current is not None else "the Hamiltonian does not conserve the magnetisation"
    return QuadraticState(
        covariance, quadratic_profile(covariance), current, reason, _all_rapidities(form), residual
    )


def product_covariance(magnetisation: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    """Gamma of the product state with given ``<Z_j>`` (L,) and no coherence, float64 (2L, 2L).

    Raises ModelError for values outside -1 to 1.
    """
    values = np.asarray(magnetisation, dtype=float)
    if values.ndim != 1 or not np.all(np.abs(values) <= 1):
        raise ModelError("magnetisation is not a list of numbers from -1 to 1; give one per site")
    covariance = np.zeros((2 * values.size,) * 2)
    even = 2 * np.arange(values.size)
    covariance[even, even + 1] = values
    covariance[even + 1, even] = -values
    return covariance


def evolved_covariance(
    chain: QuadraticChain, covariance: npt.NDArray[np.float64], time: float
) -> npt.NDArray[np.float64]:
    """Gamma(t) from Gamma(0) (2L, 2L) of any even state, Gaussian or not, for time >= 0.

    ``Gamma(t) = E Gamma(0) E^T + Q``, ``E = exp(t X)``, ``Q`` the integral of
    ``exp(sX) Y exp(sX^T)`` over s in [0, t]; Taylor series for a short time, then doublings.
    Undamped modes are allowed. Raises ModelError. Costs about log2(t ||X||) times 4 products.
    """
    time = checked_finite("time", time)
    size = 2 * chain.sites
    start = np.asarray(covariance, dtype=float)
    if time < 0 or start.shape != (size, size) or not np.all(np.isfinite(start)):
        raise ModelError(
            f"time = {time:g} is negative or the covariance is not ({size}, {size}) and finite; "
            "give time >= 0 and such an array"
        )
    drift, source = chain.drift(), chain.source()
    norm = float(np.abs(drift).sum(axis=1).max())
    doublings = max(0, int(np.ceil(np.log2(max(2 * norm * time, 1.0)))))
    step = time / 2**doublings
    growth, term = np.eye(size), np.eye(size)
    integral, part = step * source, step * source
    for order in range(1, TAYLOR_ORDER + 1):
        term = term @ drift * (step / order)
        growth += term
        part = drift @ part
        # Each order is (X p + p X^T) h/(n+1), antisymmetric like Y.
        part = (part - part.T) * (step / (order + 1))
        integral = integral + part
    for _ in range(doublings):
        integral = integral + growth @ integral @ growth.T
        growth = growth @ growth
    return np.asarray(growth @ start @ growth.T + integral)
