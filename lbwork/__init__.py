"""lbwork: the numerics of Lindblad generators on chains, every number with its certificate."""

__version__ = "0.1.0"
