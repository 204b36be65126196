"""Time evolution of states and operators, with error bounds, and the asymptotic decay rate."""

from lbwork.relaxation.decay import asymptotic_rate
from lbwork.relaxation.evolution import evolve, evolve_operator
from lbwork.relaxation.records import DecayRate, Evolution

__all__ = ["DecayRate", "Evolution", "asymptotic_rate", "evolve", "evolve_operator"]
