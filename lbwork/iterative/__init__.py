"""Matrix-free work with the generator, sector by sector: linear equations with splittings."""

from lbwork.iterative.choice import choose_resources, choose_splitting
from lbwork.iterative.probe import Probe, probe_kernel
from lbwork.iterative.solver import SPLITTINGS, ChainEquations, SectorSolver, chain_equations
from lbwork.iterative.space import SectorSpace, differences, whole_space

__all__ = [
    "SPLITTINGS",
    "ChainEquations",
    "Probe",
    "SectorSolver",
    "SectorSpace",
    "chain_equations",
    "choose_resources",
    "choose_splitting",
    "differences",
    "probe_kernel",
    "whole_space",
]
