"""Is a generator integrable? Tests that need nothing but its two-site density."""

from lbwork.integrability.charge_records import ConservedCharge, ConservedCharges
from lbwork.integrability.charges import conserved_charges
from lbwork.integrability.density import LocalDensity, hamiltonian_density, local_density
from lbwork.integrability.finite_checks import FiniteCheck, check_charge
from lbwork.integrability.nearly_conserved import NearlyConserved, nearly_conserved
from lbwork.integrability.reshetikhin import ReshetikhinResult, reshetikhin_residual

__all__ = [
    "ConservedCharge",
    "ConservedCharges",
    "FiniteCheck",
    "LocalDensity",
    "NearlyConserved",
    "ReshetikhinResult",
    "check_charge",
    "conserved_charges",
    "hamiltonian_density",
    "local_density",
    "nearly_conserved",
    "reshetikhin_residual",
]
