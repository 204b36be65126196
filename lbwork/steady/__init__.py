"""Steady states, all of them, with their certificates and local observables."""

from lbwork.steady.cost import SteadyCost, steady_cost
from lbwork.steady.matrix_free import iterative_states
from lbwork.steady.ness import steady_state
from lbwork.steady.records import SteadyBranch, SteadyOptions, SteadyState
from lbwork.steady.zero_modes import ZeroModes, zero_modes

__all__ = [
    "SteadyBranch",
    "SteadyCost",
    "SteadyOptions",
    "SteadyState",
    "ZeroModes",
    "iterative_states",
    "steady_cost",
    "steady_state",
    "zero_modes",
]
