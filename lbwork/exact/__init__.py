"""Closed-form and polynomial-cost references that share no code with the solvers they check."""

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

__all__ = [
    "ExclusionPhase",
    "asymmetric_ring_eigenvalue",
    "exclusion_current",
    "exclusion_phase",
    "exclusion_profile",
    "log_partition",
    "omega_coefficients",
    "symmetric_cumulants",
    "symmetric_current",
    "symmetric_gap",
    "symmetric_profile",
    "symmetric_ring_gap",
    "unit_rate_cumulants",
    "unit_rate_profile",
]
