"""lbwork: the numerics of Lindblad generators on chains, every number with its certificate.

Conventions (no switches)
-------------------------
========================  ==========================================================================
generator                 ``L(rho) = -i[H, rho] + sum_k g_k (l_k rho l_k^dag - 1/2 {l_k^dag l_k,
                          rho})``, hbar = 1, the rate ``g_k >= 0`` stands outside ``l_k``
vectorisation             row-major: ``vec(A rho B) = (A kron B^T) vec(rho)``
doubled chain             one site of dimension d becomes one of dimension ``d**2`` with digit
                          ``d a + b`` for ``|a><b|``; two-site order ``(a1 b1 a2 b2)``
spin-1/2                  basis state 0 = up = occupied, ``Z = diag(1, -1)``; X, Y, Z are Pauli
                          matrices, Sx, Sy, Sz half of them, S+ raises
sites and bonds           numbered 1..L for people, element j - 1 of an array; bond j joins j and
                          j + 1, on a ring bond L joins L and 1
Liouvillian gap           min of ``-Re(lambda)`` over the eigenvalues that are not zero modes
current                   positive from left to right: ``d<m_j>/dt = j_(j-1) - j_j`` + sources
charge labels             weak U(1): difference of the ket's and the bra's total S^z; strong U(1):
                          both separately
========================  ==========================================================================

Everything a user needs is importable from here; the names are loaded when first used.
"""

from __future__ import annotations

import importlib
import os
from typing import Any

from lbwork.version import __version__

# Compiled loops and BLAS take turns: threads that spin while they wait would take the cores away.
os.environ.setdefault("OMP_WAIT_POLICY", "PASSIVE")

_HOMES = {
    "CatalogueEntry": "lbwork.model",
    "Jump": "lbwork.model",
    "Model": "lbwork.model",
    "RandomOperator": "lbwork.model",
    "Term": "lbwork.model",
    "catalogue": "lbwork.model",
    "load_model": "lbwork.model",
    "Lindbladian": "lbwork.generator",
    "two_site_density": "lbwork.generator",
    "find_symmetries": "lbwork.symmetry",
    "plan_sectors": "lbwork.symmetry",
    "full_spectrum": "lbwork.spectrum",
    "sector_spectrum": "lbwork.spectrum",
    "spectral_gap": "lbwork.spectrum",
    "steady_state": "lbwork.steady",
    "counting_statistics": "lbwork.counting",
    "classical_subchain": "lbwork.integrability",
    "conserved_charges": "lbwork.integrability",
    "reshetikhin_residual": "lbwork.integrability",
    "yang_baxter_residual": "lbwork.integrability",
    "observables_of": "lbwork.observables",
    "asymptotic_rate": "lbwork.relaxation",
    "evolve": "lbwork.relaxation",
    "evolve_operator": "lbwork.relaxation",
    "LevelSequence": "lbwork.levels",
    "judge_levels": "lbwork.levels",
    "level_statistics": "lbwork.levels",
    "RunStore": "lbwork.store",
    "audit": "lbwork.study",
    "figures_of": "lbwork.report",
    "save_figure": "lbwork.report",
}

__all__ = ["__version__", *sorted(_HOMES)]


def __getattr__(name: str) -> Any:
    if name in _HOMES:
        return getattr(importlib.import_module(_HOMES[name]), name)
    raise AttributeError(f"module 'lbwork' has no attribute '{name}'")


def __dir__() -> list[str]:
    return sorted(__all__)
