"""The XXZ chain at maximal boundary drive: its steady state as a matrix product.

``H = sum_j (X_j X_{j+1} + Y_j Y_{j+1} + Delta Z_j Z_{j+1})`` with jumps ``S+`` on the first and
``S-`` on the last site, both at rate G. T. Prosen, Phys. Rev. Lett. 107, 137201 (2011); D.
Karevski, V. Popkov, G. Schütz, Phys. Rev. Lett. 110, 047201 (2013). The state is
``Omega Omega^dag`` over its trace, with

    Omega_ab = <0| prod_j M_{a_j b_j} |0>,   C_k = T_k(Delta),  U_k = sin(k eta)/sin(eta),
    M_00 = M_11 = diag(s C_k - U_k),         Delta = cos(eta),  s = 4i/G,
    (M_01)_{k,k+1} = -U_{k+1},   (M_10)_{k+1,k} = 2 s C_k - (1 - (1 - Delta^2) s^2) U_k,

for every real Delta: the entries are polynomials in Delta (this form derived from the q-deformed
Lax operator, from memory; at Delta = 1 it is the published one, and it was checked against dense
steady states). The trace needs equal levels of ket and bra only, and no level above L/2 is reached,
so that a chain of L sites costs L^2. All terms are positive and kept as logarithms, since they
overflow for |Delta| > 1.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
from scipy.special import eval_chebyt, eval_chebyu

from lbwork.errors import ModelError
from lbwork.exact.arguments import checked_count, checked_finite, checked_rate
from lbwork.exact.pauli import plain_chain, uniform
from lbwork.model import Model

__all__ = ["DrivenXXZ", "driven_xxz_density", "driven_xxz_of", "driven_xxz_state"]

MAX_SITES = 4000
MAX_DENSE_SITES = 8


@dataclass(frozen=True, eq=False)
class DrivenXXZ:
    """Steady state of the maximally driven XXZ chain.

    magnetisation (L,): ``<Z_j>``. current: of Z, to the right, the same on every bond; its relative
    error is rounding, however small it is. log_current: logarithm of its size, never underflows.
    log_norms (L+1,): ``log Z_n`` of chains of n = 0..L sites, ``current = 32/G Z_{L-1}/Z_L``.
    """

    sites: int
    delta: float
    drive: float
    magnetisation: npt.NDArray[np.float64]
    current: float
    log_current: float
    log_norms: npt.NDArray[np.float64]


def _squares(delta: float, levels: int) -> tuple[np.ndarray, np.ndarray]:
    """``log T_k(Delta)^2`` and ``log U_k^2`` (U_0 = 0, U_1 = 1) for k = 0..levels-1."""
    k = np.arange(levels)
    if abs(delta) <= 1:
        sines = np.where(k > 0, eval_chebyu(np.maximum(k - 1, 0), delta), 0.0)
        return _log(eval_chebyt(k, delta) ** 2), _log(sines**2)
    angle = np.arccosh(abs(delta))
    cosines = k * angle + np.log1p(np.exp(-2 * k * angle)) - np.log(2)
    sines = (k - 1) * angle + _log(-np.expm1(-2 * k * angle)) - np.log(-np.expm1(-2 * angle))
    return 2 * cosines, 2 * sines


def _log(values: np.ndarray) -> np.ndarray:
    with np.errstate(divide="ignore"):
        return np.asarray(np.log(values))


@dataclass(frozen=True)
class _Transfer:
    """Logarithms of the tridiagonal transfer matrix: diagonal, (k, k+1) and (k+1, k)."""

    level: np.ndarray
    up: np.ndarray
    down: np.ndarray

    def ahead(self, vector: np.ndarray) -> np.ndarray:
        """Row vector times the matrix."""
        return _stepped(vector, self.level, self.up, self.down)

    def back(self, vector: np.ndarray) -> np.ndarray:
        """Matrix times the column vector."""
        return _stepped(vector, self.level, self.down, self.up)


def _stepped(
    vector: np.ndarray, level: np.ndarray, rising: np.ndarray, falling: np.ndarray
) -> np.ndarray:
    result = vector + level
    result[1:] = np.logaddexp(result[1:], vector[:-1] + rising)
    result[:-1] = np.logaddexp(result[:-1], vector[1:] + falling)
    return result


def _transfer(sites: int, delta: float, drive: float) -> _Transfer:
    levels = sites // 2 + 1
    cosines, sines = _squares(delta, levels + 1)
    strength = 2 * np.log(4 / drive)
    level = np.log(2) + np.logaddexp(strength + cosines, sines)[:levels]
    # 1 - (1 - Delta^2) s^2 with s^2 = -16/G^2.
    factor = _log(np.array([1 + (1 - delta**2) * 16 / drive**2]) ** 2)[0]
    down = np.logaddexp(np.log(4) + strength + cosines, factor + sines)[: levels - 1]
    return _Transfer(level, sines[1:levels], down)


def driven_xxz_state(sites: int, delta: float, drive: float) -> DrivenXXZ:
    """Profile, current and norms at coupling 1 for any real ``delta`` and drive G > 0.

    :func:`driven_xxz_of` takes the numbers from a model. Needs 2..4000 sites; costs L^2. Raises
    ModelError, CapacityError. Prosen (2011), Karevski, Popkov, Schütz (2013).
    """
    sites = checked_count("sites", sites, 2, MAX_SITES)
    delta, drive = checked_finite("delta", delta), checked_rate("drive", drive)
    transfer = _transfer(sites, delta, drive)
    start = np.full(sites // 2 + 1, -np.inf)
    start[0] = 0.0
    ahead, back = [start], [start]
    for _ in range(sites):
        ahead.append(transfer.ahead(ahead[-1]))
        back.append(transfer.back(back[-1]))
    norms = np.array([vector[0] for vector in ahead])
    profile = np.empty(sites)
    for place in range(sites):
        left, right = ahead[place], back[sites - 1 - place]
        rising = np.exp(left[:-1] + transfer.up + right[1:] - norms[-1])
        falling = np.exp(left[1:] + transfer.down + right[:-1] - norms[-1])
        profile[place] = rising.sum() - falling.sum()
    # Site 1 is fed at rate G (1 - <Z_1>), and 1 - <Z_1> = 2 |s|^2 Z_{L-1}/Z_L.
    log_current = float(np.log(32 / drive) + norms[-2] - norms[-1])
    return DrivenXXZ(sites, delta, drive, profile, float(np.exp(log_current)), log_current, norms)


def driven_xxz_of(model: Model) -> DrivenXXZ:
    """The same for a model: profile and current in its own units and direction.

    Needs an open spin-1/2 chain with uniform couplings ``a (X X + Y Y) + b Z Z`` (a not 0, any
    uniform field, which does nothing), ``S+`` at one end and ``S-`` at the other with equal rates.
    Here ``Delta = b/|a|``, since turning every second spin takes a to -a, and ``G = rate/|a|``.
    Raises ModelError with the reason, CapacityError.
    """
    chain = plain_chain(model, "the maximally driven XXZ chain")
    couplings = np.concatenate([chain.xx, chain.yy])
    if not all(map(uniform, (couplings, chain.zz, chain.field))) or not couplings.any():
        raise ModelError(
            f"model '{model.name}' is not a uniform chain a (XX + YY) + b ZZ with a != 0; the "
            "matrix product needs equal couplings on two or more sites"
        )
    ends = [chain.raising[0], chain.lowering[-1]], [chain.lowering[0], chain.raising[-1]]
    total = chain.raising.sum() + chain.lowering.sum() + chain.dephasing.sum()
    for (first, last), sign in zip(ends, (1, -1), strict=True):
        if first > 0 and uniform(np.array([first, last, total / 2])):
            size = abs(float(chain.xx[0]))
            state = driven_xxz_state(model.sites, float(chain.zz[0]) / size, first / size)
            return replace(
                state,
                magnetisation=sign * state.magnetisation,
                current=sign * size * state.current,
                log_current=state.log_current + float(np.log(size)),
            )
    raise ModelError(
        f"model '{model.name}' is not driven by S+ at one end and S- at the other alone, with "
        "equal rates; the matrix product holds for maximal drive only"
    )


def driven_xxz_density(sites: int, delta: float, drive: float) -> npt.NDArray[np.complex128]:
    """The steady state itself, complex128 (2^L, 2^L), for 2..8 sites and any real ``delta``.

    Raises ModelError, CapacityError. Same sources as :func:`driven_xxz_state`.
    """
    sites = checked_count("sites", sites, 2, MAX_DENSE_SITES)
    delta, drive = checked_finite("delta", delta), checked_rate("drive", drive)
    levels = sites // 2 + 1
    k = np.arange(levels)
    s = 4j / drive
    cosines = eval_chebyt(k, delta)
    sines = np.where(k > 0, eval_chebyu(np.maximum(k - 1, 0), delta), 0.0)
    tensor = np.zeros((2, 2, levels, levels), dtype=complex)
    tensor[0, 0] = tensor[1, 1] = np.diag(s * cosines - sines)
    tensor[0, 1] = np.diag(-eval_chebyu(k[:-1], delta), 1)
    lowering = 2 * s * cosines - (1 - (1 - delta**2) * s**2) * sines
    tensor[1, 0] = np.diag(lowering[:-1], -1)
    root = np.zeros((1, 1, levels), dtype=complex)
    root[0, 0, 0] = 1
    for _ in range(sites):
        # Ket and bra indices grow by one digit each; the last axis is the level.
        root = np.einsum("xyk,abkl->xaybl", root, tensor, optimize=True)
        size = root.shape[0] * 2
        root = root.reshape(size, size, levels)
    matrix = root[:, :, 0]
    density = matrix @ matrix.conj().T
    return np.asarray(density / np.trace(density).real)
