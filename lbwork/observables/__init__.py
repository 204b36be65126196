"""What is read off a density matrix (D, D), steady or not."""

from lbwork.observables.closeness import Closeness, closeness, fidelity, trace_distance
from lbwork.observables.cost import EntanglementCost, entanglement_cost
from lbwork.observables.currents import Currents, continuity_error, spin_currents
from lbwork.observables.energy import EnergyCurrents, energy_continuity_error, energy_currents
from lbwork.observables.entanglement import (
    logarithmic_negativity,
    operator_entanglement,
    schmidt_weights,
)
from lbwork.observables.entropies import (
    CutEntropies,
    left_entropies,
    purity,
    renyi_two,
    von_neumann_entropy,
)
from lbwork.observables.local import (
    connected_correlations,
    expectation,
    local_magnetisation,
    magnetisation_profile,
    reduced_density,
    spectrum_quantities,
    spin_correlations,
    spin_operators,
    spin_profile,
    weight_quantities,
    zz_correlations,
)
from lbwork.observables.record import Observables, observables_of
from lbwork.observables.reference_states import (
    checked_density,
    gibbs_state,
    maximally_mixed,
    product_state,
    spin_coherent,
)
from lbwork.observables.words import operator_from_words, state_from_words

__all__ = [
    "Closeness",
    "Currents",
    "CutEntropies",
    "EnergyCurrents",
    "EntanglementCost",
    "Observables",
    "checked_density",
    "closeness",
    "connected_correlations",
    "continuity_error",
    "energy_continuity_error",
    "energy_currents",
    "entanglement_cost",
    "expectation",
    "fidelity",
    "gibbs_state",
    "left_entropies",
    "local_magnetisation",
    "logarithmic_negativity",
    "magnetisation_profile",
    "maximally_mixed",
    "observables_of",
    "operator_entanglement",
    "operator_from_words",
    "product_state",
    "purity",
    "reduced_density",
    "renyi_two",
    "schmidt_weights",
    "spectrum_quantities",
    "spin_coherent",
    "spin_correlations",
    "spin_currents",
    "spin_operators",
    "spin_profile",
    "state_from_words",
    "trace_distance",
    "von_neumann_entropy",
    "weight_quantities",
    "zz_correlations",
]
