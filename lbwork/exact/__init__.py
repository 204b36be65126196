"""Closed-form and polynomial-cost references that share no code with the solvers they check."""

from lbwork.exact.driven_xx import DrivenXX, driven_xx_of, driven_xx_state
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
from lbwork.exact.exclusion_counting import unit_rate_cumulants
from lbwork.exact.exclusion_ring import asymmetric_ring_eigenvalue
from lbwork.exact.exclusion_symmetric import (
    omega_coefficients,
    symmetric_cumulants,
    symmetric_current,
    symmetric_gap,
    symmetric_profile,
    symmetric_ring_gap,
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

__all__ = [
    "DrivenXX",
    "DrivenXXZ",
    "ExclusionPhase",
    "Move",
    "OccupationProcess",
    "ProcessGap",
    "ProcessState",
    "asymmetric_ring_eigenvalue",
    "configurations",
    "driven_xx_of",
    "driven_xx_state",
    "driven_xxz_density",
    "driven_xxz_of",
    "driven_xxz_state",
    "exclusion_current",
    "exclusion_phase",
    "exclusion_process",
    "exclusion_profile",
    "growth_rate",
    "log_partition",
    "markov_generator",
    "occupation_process",
    "occupations",
    "omega_coefficients",
    "process_gap",
    "stationary_process",
    "symmetric_cumulants",
    "symmetric_current",
    "symmetric_gap",
    "symmetric_profile",
    "symmetric_ring_gap",
    "unit_rate_cumulants",
    "unit_rate_profile",
]
