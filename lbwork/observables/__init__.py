"""What is read off a density matrix (D, D), steady or not."""

from lbwork.observables.currents import Currents, continuity_error, spin_currents
from lbwork.observables.energy import EnergyCurrents, energy_continuity_error, energy_currents
from lbwork.observables.entanglement import (
    CutEntropies,
    left_entropies,
    logarithmic_negativity,
    operator_entanglement,
    renyi_two,
)
from lbwork.observables.local import (
    connected_correlations,
    expectation,
    local_magnetisation,
    magnetisation_profile,
    reduced_density,
    spectrum_quantities,
    spin_operators,
    spin_profile,
    weight_quantities,
    zz_correlations,
)
from lbwork.observables.record import Observables, observables_of
from lbwork.observables.reference_states import (
    Closeness,
    checked_density,
    closeness,
    gibbs_state,
    product_state,
)
from lbwork.observables.words import operator_from_words, state_from_words

__all__ = [
    "Closeness",
    "Currents",
    "CutEntropies",
    "EnergyCurrents",
    "Observables",
    "checked_density",
    "closeness",
    "connected_correlations",
    "continuity_error",
    "energy_continuity_error",
    "energy_currents",
    "expectation",
    "gibbs_state",
    "left_entropies",
    "local_magnetisation",
    "logarithmic_negativity",
    "magnetisation_profile",
    "observables_of",
    "operator_entanglement",
    "operator_from_words",
    "product_state",
    "reduced_density",
    "renyi_two",
    "spectrum_quantities",
    "spin_currents",
    "spin_operators",
    "spin_profile",
    "state_from_words",
    "weight_quantities",
    "zz_correlations",
]
