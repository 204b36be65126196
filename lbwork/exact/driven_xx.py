"""The XX chain with dephasing, driven at its ends: the steady state in closed form.

``H = J sum_j (X_j X_{j+1} + Y_j Y_{j+1}) + h sum_j Z_j``; jumps ``S+`` and ``S-`` on the first site
at rates ``G_1 (1 +- m_1)/2`` and on the last site at rates ``G_L (1 +- m_L)/2``, so that each end
pulls ``<Z>`` to m, and ``Z_j`` at rate g_j. The two-point function is closed (M. Žnidarič, J. Stat.
Mech. L05002 (2010), arXiv:1005.1271). With J = 1 its only non-zero entries are the profile and the
equal current on all bonds, j = 2 I:

    I = (m_1 - m_L) / (2/G_1 + 2/G_L + (G_1 + G_L)/8 + sum_bonds (g_j + g_{j+1})/2),
    <Z_1> = m_1 - 2 I/G_1,
    <Z_j> - <Z_{j+1}> = I ((g_j + g_{j+1})/2 + [j = 1] G_1/8 + [j = L-1] G_L/8).

The published case has equal dephasing and opposite drives at equal rates; the form with different
ones was derived here and checked against dense steady states. Rates are in units of J otherwise.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from lbwork.errors import ModelError
from lbwork.exact.arguments import checked_count, checked_finite, checked_rate
from lbwork.exact.pauli import plain_chain, uniform
from lbwork.model import Model

__all__ = ["DrivenXX", "driven_xx_of", "driven_xx_state"]


@dataclass(frozen=True, eq=False)
class DrivenXX:
    """Steady state of the driven XX chain.

    magnetisation (L,): ``<Z_j>``. current: of Z, to the right, the same on every bond. They
    determine all two-point functions ``<c_i^dag c_j>`` of the Jordan-Wigner fermions.
    """

    magnetisation: npt.NDArray[np.float64]
    current: float


def driven_xx_state(
    sites: int,
    drives: tuple[float, float],
    targets: tuple[float, float],
    dephasing: float | npt.NDArray[np.float64] = 0.0,
    coupling: float = 1.0,
) -> DrivenXX:
    """Profile and current in closed form, for any length.

    drives: ``(G_1, G_L)`` > 0. targets: ``(m_1, m_L)`` in [-1, 1], usually ``(mu, -mu)``.
    dephasing: g >= 0, one number or one per site (L,). coupling: J, not 0. Needs two or more sites;
    raises ModelError. Žnidarič (2010).
    """
    sites = checked_count("sites", sites, 2)
    scale = abs(checked_finite("coupling", coupling))
    if scale == 0:
        raise ModelError("coupling = 0 joins no sites; give another number")
    first, last = (checked_rate("drive", value) / scale for value in drives)
    left, right = (checked_finite("target", value) for value in targets)
    if max(abs(left), abs(right)) > 1:
        raise ModelError(f"target = {left:g}, {right:g} is outside -1 to 1; give a magnetisation")
    rates = np.asarray(dephasing, dtype=float) / scale
    if rates.shape not in ((), (sites,)) or not np.all(np.isfinite(rates)) or np.any(rates < 0):
        raise ModelError(f"dephasing is not one rate >= 0 or {sites} of them; give such numbers")
    rates = np.broadcast_to(rates, (sites,))
    drops = (rates[1:] + rates[:-1]) / 2
    drops[0] += first / 8
    drops[-1] += last / 8
    flow = (left - right) / (2 / first + 2 / last + drops.sum())
    start = left - 2 * flow / first
    profile = start - flow * np.concatenate([[0.0], np.cumsum(drops)])
    return DrivenXX(np.asarray(profile), 2 * flow * scale)


def driven_xx_of(model: Model) -> DrivenXX:
    """The same for a model.

    Needs an open spin-1/2 chain of two or more sites with uniform ``J (X X + Y Y)`` and field,
    jumps ``S+`` and ``S-`` on the first and on the last site (at least one at each) and any ``Z``
    jumps. Raises ModelError with the reason otherwise.
    """
    need = "the driven XX chain"
    chain = plain_chain(model, need)
    couplings = np.concatenate([chain.xx, chain.yy])
    if not uniform(couplings) or not couplings.any() or not uniform(chain.field) or chain.zz.any():
        raise ModelError(
            f"model '{model.name}' is not uniform J (XX + YY) with a uniform field; {need} in "
            "closed form needs that"
        )
    if chain.raising[1:-1].any() or chain.lowering[1:-1].any():
        raise ModelError(f"model '{model.name}' gains or loses inside; {need} does so at its ends")
    drives = chain.raising[[0, -1]] + chain.lowering[[0, -1]]
    if not drives.all():
        raise ModelError(
            f"model '{model.name}' has an end without S+ or S-; {need} has two driven ends"
        )
    targets = (chain.raising[[0, -1]] - chain.lowering[[0, -1]]) / drives
    return driven_xx_state(
        model.sites,
        (float(drives[0]), float(drives[1])),
        (float(targets[0]), float(targets[1])),
        chain.dephasing,
        float(chain.xx[0]),
    )
