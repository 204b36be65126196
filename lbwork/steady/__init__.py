"""Steady states, all of them, with their certificates and local observables."""

from lbwork.steady.ness import steady_state
from lbwork.steady.records import SteadyBranch, SteadyOptions, SteadyState
from lbwork.steady.zero_modes import ZeroModes, zero_modes

__all__ = [
    "SteadyBranch",
    "SteadyOptions",
    "SteadyState",
    "ZeroModes",
    "steady_state",
    "zero_modes",
]
