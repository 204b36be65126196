"""The command line: one module per verb, thin adapters over plain functions."""

from lbwork.cli.application import main

__all__ = ["main"]
