"""The two-site density of a translation-invariant generator."""

from __future__ import annotations

import numpy as np

from lbwork.errors import ModelError
from lbwork.generator.terms import superoperator_terms
from lbwork.model import Model

__all__ = ["two_site_density"]


def two_site_density(model: Model) -> np.ndarray:
    """Superoperator ``q`` with ``L = sum_j q_{j,j+1}``: complex (d**4, d**4), order (a1 b1 a2 b2).

    One-site terms are shared equally between the two bonds of their site. The model must be a
    translation-invariant ring of range at most 2; ModelError says what it has instead.
    """
    if model.boundary != "periodic":
        raise ModelError(
            f"model '{model.name}' is an open chain; a two-site density needs a ring "
            "(boundary = periodic)"
        )
    base = model.local_dimension**2
    bonds = [np.zeros((base**2, base**2), dtype=complex) for _ in range(model.sites)]
    fields = [np.zeros((base, base), dtype=complex) for _ in range(model.sites)]
    for term in superoperator_terms(model):
        if len(term.sites) > 2:
            raise ModelError(
                f"model '{model.name}' has a term on {len(term.sites)} sites; group pairs of sites "
                "into one before asking for a two-site density"
            )
        if len(term.sites) == 1:
            fields[term.sites[0]] += term.matrix
        else:
            bonds[term.sites[0]] += term.matrix
    scale = max(max(np.abs(matrix).max() for matrix in (*bonds, *fields)), 1e-300)
    for site in range(1, model.sites):
        for kind, matrices in (("bond", bonds), ("site", fields)):
            if np.abs(matrices[site] - matrices[0]).max() > 1e-12 * scale:
                raise ModelError(
                    f"model '{model.name}' is not translation invariant: {kind} {site + 1} differs "
                    f"from {kind} 1"
                )
    one = np.eye(base)
    return np.asarray(bonds[0] + 0.5 * (np.kron(fields[0], one) + np.kron(one, fields[0])))
