"""Small chains of the exact references, and generators built with plain Kronecker products."""

from __future__ import annotations

import numpy as np

from lbwork.model import Jump, Model, Term

__all__ = ["driven_chain", "kronecker_generator", "open_exclusion", "weakly_driven"]


def embed(matrix: np.ndarray, sites: tuple[int, ...], count: int, dimension: int) -> np.ndarray:
    """An operator on ``sites`` (any order) as a dense matrix on the chain."""
    width = len(sites)
    rest = [site for site in range(count) if site not in sites]
    whole = np.kron(matrix, np.eye(dimension ** len(rest))).reshape([dimension] * (2 * count))
    order = [*sites, *rest]
    back = np.argsort(order)
    axes = [*back, *(count + back)]
    assert width + len(rest) == count
    return whole.transpose(axes).reshape(dimension**count, -1)


def kronecker_generator(model: Model) -> np.ndarray:
    """Dense superoperator in row-major order, from ``vec(A rho B) = (A kron B^T) vec(rho)``."""
    size = model.local_dimension**model.sites
    one = np.eye(size)
    hamiltonian = np.zeros((size, size), dtype=complex)
    for term in model.placed_hamiltonian():
        hamiltonian += embed(term.matrix, term.sites, model.sites, model.local_dimension)
    result = -1j * (np.kron(hamiltonian, one) - np.kron(one, hamiltonian.T))
    for jump in model.placed_jumps():
        operator = embed(jump.matrix, jump.sites, model.sites, model.local_dimension)
        product = operator.conj().T @ operator
        result += jump.rate * np.kron(operator, operator.conj())
        result -= jump.rate / 2 * (np.kron(product, one) + np.kron(one, product.T))
    return result


def driven_chain(sites, delta=0.0, drive=1.0, bias=0.5, dephasing=0.0, field=0.0):
    """``H = sum XX + YY + delta ZZ``; S+ enters at rate G(1+mu)/2 on the left, leaves on the right.

    The left end is driven up (M. Znidaric, J. Stat. Mech. L05002 (2010), arXiv:1005.1271).
    """
    return Model(
        name="driven chain",
        sites=sites,
        parameters={"delta": delta, "h": field, "g": dephasing, "G": drive, "mu": bias},
        hamiltonian=(Term("X X + Y Y + delta Z Z"), Term("Z", coefficient="h")),
        jumps=(
            Jump("S+", on="first", rate="G*(1+mu)/2"),
            Jump("S-", on="first", rate="G*(1-mu)/2"),
            Jump("S+", on="last", rate="G*(1-mu)/2"),
            Jump("S-", on="last", rate="G*(1+mu)/2"),
            Jump("Z", rate="g"),
        ),
    )


def weakly_driven(sites, delta, bias):
    """Rates 1 + mu and 1 - mu at both ends."""
    return driven_chain(sites, delta=delta, drive=2.0, bias=bias)


def open_exclusion(sites, entry, exit_rate):
    """Open totally asymmetric exclusion, bulk rate 1: hop ``S+_{j+1} S-_j`` to the right."""
    return Model(
        name="open exclusion",
        sites=sites,
        jumps=(
            Jump("S- S+"),
            Jump("S+", on="first", rate=entry),
            Jump("S-", on="last", rate=exit_rate),
        ),
    )
