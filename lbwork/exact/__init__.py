"""Closed-form and polynomial-cost references that share no code with the solvers they check."""

from lbwork.exact.dephasing import (
    NoisyState,
    RelaxationGap,
    noisy_state,
    relaxation_gap,
    relaxation_levels,
)
from lbwork.exact.driven_xx import (
    DrivenXX,
    driven_xx_of,
    driven_xx_state,
)
from lbwork.exact.driven_xxz import (
    DrivenXXZ,
    driven_xxz_density,
    driven_xxz_of,
    driven_xxz_state,
)
from lbwork.exact.exclusion import (
    ExclusionPhase,
    exclusion_current,
    exclusion_phase,
    exclusion_profile,
    log_partition,
    unit_rate_profile,
)
from lbwork.exact.exclusion_counting import (
    unit_rate_cumulants,
)
from lbwork.exact.exclusion_ring import (
    asymmetric_ring_eigenvalue,
)
from lbwork.exact.exclusion_symmetric import (
    omega_coefficients,
    symmetric_cumulants,
    symmetric_current,
    symmetric_gap,
    symmetric_profile,
    symmetric_ring_gap,
)
from lbwork.exact.majorana import (
    QuadraticChain,
    boundary_driven_chain,
    quadratic_chain,
)
from lbwork.exact.noise import (
    NoisyChain,
    dephased,
    noisy_chain,
)
from lbwork.exact.occupation import (
    Move,
    OccupationProcess,
    configurations,
    exclusion_process,
    markov_generator,
    occupation_process,
    occupations,
)
from lbwork.exact.occupation_spectra import (
    ProcessGap,
    ProcessState,
    growth_rate,
    process_gap,
    stationary_process,
)
from lbwork.exact.quadratic import (
    QuadraticState,
    evolved_covariance,
    hamiltonian_currents,
    product_covariance,
    quadratic_profile,
    quadratic_state,
    rapidities,
)
from lbwork.exact.quadratic_spectrum import (
    QuadraticGap,
    QuadraticLevels,
    quadratic_gap,
    quadratic_levels,
)

__all__ = [
    "DrivenXX",
    "DrivenXXZ",
    "ExclusionPhase",
    "Move",
    "NoisyChain",
    "NoisyState",
    "OccupationProcess",
    "ProcessGap",
    "ProcessState",
    "QuadraticChain",
    "QuadraticGap",
    "QuadraticLevels",
    "QuadraticState",
    "RelaxationGap",
    "asymmetric_ring_eigenvalue",
    "boundary_driven_chain",
    "configurations",
    "dephased",
    "driven_xx_of",
    "driven_xx_state",
    "driven_xxz_density",
    "driven_xxz_of",
    "driven_xxz_state",
    "evolved_covariance",
    "exclusion_current",
    "exclusion_phase",
    "exclusion_process",
    "exclusion_profile",
    "growth_rate",
    "hamiltonian_currents",
    "log_partition",
    "markov_generator",
    "noisy_chain",
    "noisy_state",
    "occupation_process",
    "occupations",
    "omega_coefficients",
    "process_gap",
    "product_covariance",
    "quadratic_chain",
    "quadratic_gap",
    "quadratic_levels",
    "quadratic_profile",
    "quadratic_state",
    "rapidities",
    "relaxation_gap",
    "relaxation_levels",
    "stationary_process",
    "symmetric_cumulants",
    "symmetric_current",
    "symmetric_gap",
    "symmetric_profile",
    "symmetric_ring_gap",
    "unit_rate_cumulants",
    "unit_rate_profile",
]
