"""Matrix-free work with the generator, sector by sector: linear equations with splittings."""

from lbwork.iterative.choice import choose_splitting
from lbwork.iterative.closed import ClosedChain, closed_chain
from lbwork.iterative.cost import IterationCost, iteration_cost
from lbwork.iterative.davidson import NearestLevels, nearest_levels
from lbwork.iterative.dense import component_matrix, dense_matrix, make_hermitian
from lbwork.iterative.probe import Probe, probe_kernel
from lbwork.iterative.solver import (
    SPLITTINGS,
    ChainEquations,
    SectorSolver,
    chain_equations,
    part_generators,
)
from lbwork.iterative.space import SectorSpace, differences, whole_space

__all__ = [
    "SPLITTINGS",
    "ChainEquations",
    "ClosedChain",
    "IterationCost",
    "NearestLevels",
    "Probe",
    "SectorSolver",
    "SectorSpace",
    "chain_equations",
    "choose_splitting",
    "closed_chain",
    "component_matrix",
    "dense_matrix",
    "differences",
    "iteration_cost",
    "make_hermitian",
    "nearest_levels",
    "part_generators",
    "probe_kernel",
    "whole_space",
]
