"""Is a generator integrable? Tests that need nothing but its two-site density."""

from lbwork.integrability.charge_records import ConservedCharge, ConservedCharges
from lbwork.integrability.charges import conserved_charges
from lbwork.integrability.density import LocalDensity, hamiltonian_density, local_density
from lbwork.integrability.finite_checks import FiniteCheck, check_charge
from lbwork.integrability.flow import RMatrixFlow, r_matrix_flow
from lbwork.integrability.markov_chain import MarkovSolution
from lbwork.integrability.nearly_conserved import NearlyConserved, nearly_conserved
from lbwork.integrability.r_matrix import RMatrix, load_r_matrix, r_matrix_from_toml
from lbwork.integrability.reshetikhin import ReshetikhinResult, reshetikhin_residual
from lbwork.integrability.subchain import ClassicalSubchain, classical_subchain
from lbwork.integrability.yang_baxter import YangBaxterReport, yang_baxter_residual

__all__ = [
    "ClassicalSubchain",
    "ConservedCharge",
    "ConservedCharges",
    "FiniteCheck",
    "LocalDensity",
    "MarkovSolution",
    "NearlyConserved",
    "RMatrix",
    "RMatrixFlow",
    "ReshetikhinResult",
    "YangBaxterReport",
    "check_charge",
    "classical_subchain",
    "conserved_charges",
    "hamiltonian_density",
    "load_r_matrix",
    "local_density",
    "nearly_conserved",
    "r_matrix_flow",
    "r_matrix_from_toml",
    "reshetikhin_residual",
    "yang_baxter_residual",
]
