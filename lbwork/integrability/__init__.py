"""Is a generator integrable? Tests that need nothing but its two-site density."""

from lbwork.integrability.charge_records import ConservedCharge, ConservedCharges
from lbwork.integrability.charges import conserved_charges
from lbwork.integrability.density import LocalDensity, hamiltonian_density, local_density
from lbwork.integrability.finite_checks import FiniteCheck, check_charge
from lbwork.integrability.markov_chain import MarkovSolution
from lbwork.integrability.nearly_conserved import NearlyConserved, nearly_conserved
from lbwork.integrability.reshetikhin import ReshetikhinResult, reshetikhin_residual
from lbwork.integrability.subchain import ClassicalSubchain, classical_subchain

__all__ = [
    "ClassicalSubchain",
    "ConservedCharge",
    "ConservedCharges",
    "FiniteCheck",
    "LocalDensity",
    "MarkovSolution",
    "NearlyConserved",
    "ReshetikhinResult",
    "check_charge",
    "classical_subchain",
    "conserved_charges",
    "hamiltonian_density",
    "local_density",
    "nearly_conserved",
    "reshetikhin_residual",
]
