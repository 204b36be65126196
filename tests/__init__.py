"""Tests of lbwork."""
