"""What is read off a density matrix (D, D), steady or not: profiles, currents, correlations."""

from lbwork.observables.currents import Currents, continuity_error, spin_currents
from lbwork.observables.local import (
    local_magnetisation,
    magnetisation_profile,
    reduced_density,
    spectrum_quantities,
    weight_quantities,
    zz_correlations,
)

__all__ = [
    "Currents",
    "continuity_error",
    "local_magnetisation",
    "magnetisation_profile",
    "reduced_density",
    "spectrum_quantities",
    "spin_currents",
    "weight_quantities",
    "zz_correlations",
]
