"""Seeded random models of every kind the generator must handle."""

import numpy as np

from lbwork.model import Jump, Model, RandomOperator, Term


def random_model(seed, *, sites, dimension=2, boundary="open", ranges=(1, 2)):
    """Random complex Hamiltonian and jumps on all places, of the given ranges."""
    generator = np.random.default_rng(seed)
    fitting = [width for width in ranges if width <= sites]
    return Model(
        name="random",
        sites=sites,
        local_dimension=dimension,
        boundary=boundary if sites > 1 else "open",
        hamiltonian=tuple(
            Term(RandomOperator("hermitian", width, seed + width)) for width in fitting
        ),
        jumps=tuple(
            Jump(
                RandomOperator("ginibre", width, seed + 50 + width), rate=float(generator.random())
            )
            for width in fitting
        ),
    )


CASES = {
    "one site": random_model(1, sites=1),
    "two sites": random_model(2, sites=2),
    "two-site ring": random_model(3, sites=2, boundary="periodic"),
    "open": random_model(4, sites=4),
    "ring": random_model(5, sites=4, boundary="periodic"),
    "three-site terms": random_model(6, sites=4, ranges=(2, 3)),
    "three-site terms on a ring": random_model(7, sites=4, boundary="periodic", ranges=(3,)),
    "spin one": random_model(8, sites=2, dimension=3),
    "spin one ring": random_model(9, sites=3, dimension=3, boundary="periodic", ranges=(1, 2)),
    "four levels": random_model(10, sites=2, dimension=4, ranges=(1,)),
    "no jump": Model("a", 3, hamiltonian=(Term("X X + Y Y"),)),
    "no hamiltonian": Model("a", 3, jumps=(Jump("S-"), Jump("Z", rate=0.3))),
    "complex diagonal jump": Model("a", 3, jumps=(Jump([[1, 0], [0, "1j"]]), Jump("S+ S-"))),
}
