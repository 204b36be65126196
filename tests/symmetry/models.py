"""Small models with known symmetries, shared by the tests of this folder."""

import numpy as np

from lbwork.model import Jump, Model, Term

DRIVE = (
    Jump("S+", on="first", rate=1.2),
    Jump("S-", on="first", rate=0.8),
    Jump("S+", on="last", rate=0.6),
    Jump("S-", on="last", rate=1.1),
)


def chain(operator, jumps=(), *, sites=4, boundary="periodic", dimension=2, extra=()):
    """A chain with one bond operator, further Hamiltonian terms and jumps."""
    nothing = isinstance(operator, str) and not operator
    hamiltonian = () if nothing else (Term(operator),)
    return Model(
        name="test chain",
        sites=sites,
        local_dimension=dimension,
        boundary=boundary,
        hamiltonian=(*hamiltonian, *extra),
        jumps=tuple(jumps),
    )


def random_unitary(seed, dimension=2):
    """Haar-like random unitary from a QR decomposition."""
    generator = np.random.default_rng(seed)
    matrix = generator.normal(size=(dimension,) * 2) + 1j * generator.normal(size=(dimension,) * 2)
    return np.linalg.qr(matrix)[0]
