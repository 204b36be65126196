"""Is a generator integrable? Tests that need nothing but its two-site density."""

from lbwork.integrability.density import LocalDensity, hamiltonian_density, local_density
from lbwork.integrability.reshetikhin import ReshetikhinResult, reshetikhin_residual

__all__ = [
    "LocalDensity",
    "ReshetikhinResult",
    "hamiltonian_density",
    "local_density",
    "reshetikhin_residual",
]
