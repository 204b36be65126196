"""The superoperator from plain Kronecker products, written independently of the library."""

import numpy as np


def embedded(matrix, sites, count, dimension):
    """A local operator on some sites of a chain, by one Kronecker product and a transpose."""
    rest = [site for site in range(count) if site not in sites]
    full = np.kron(matrix, np.eye(dimension ** len(rest))).reshape((dimension,) * (2 * count))
    back = np.argsort([*sites, *rest])
    return full.transpose([*back, *(count + back)]).reshape((dimension**count,) * 2)


def superoperator(model):
    """``-i(H x 1 - 1 x H^T) + sum g (l x l* - ...)`` on row-major vec(rho)."""
    count, dimension = model.sites, model.local_dimension
    size = dimension**count
    one = np.eye(size)
    hamiltonian = np.zeros((size, size), dtype=complex)
    for placed in model.placed_hamiltonian():
        hamiltonian += embedded(placed.matrix, placed.sites, count, dimension)
    total = -1j * (np.kron(hamiltonian, one) - np.kron(one, hamiltonian.T))
    for jump in model.placed_jumps():
        operator = embedded(jump.matrix, jump.sites, count, dimension)
        decay = operator.conj().T @ operator
        total += jump.rate * np.kron(operator, operator.conj())
        total -= 0.5 * jump.rate * (np.kron(decay, one) + np.kron(one, decay.T))
    return total
