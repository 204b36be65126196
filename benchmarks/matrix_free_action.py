"""Matrix-free application of the generator against SciPy's CSR product, in one run.

    python benchmarks/matrix_free_action.py [--sites 10] [--repeats 15]

Prints the ratio of the median times and the extra memory of one application, in density matrices.
"""

from __future__ import annotations

import argparse
import statistics
import time
from collections.abc import Callable

import numba
import numpy as np

from lbwork import Lindbladian, load_model

MODELS = ("xx-dephasing", "xxz-driven", "hopping-symmetric-coherent", "xxx-loss")


def median_time(task: Callable[[], object], repeats: int) -> float:
    """Median duration in seconds after one warm-up call."""
    task()
    durations = []
    for _ in range(repeats):
        started = time.perf_counter()
        task()
        durations.append(time.perf_counter() - started)
    return statistics.median(durations)


def main() -> None:
    """One line per model."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--sites", type=int, default=10)
    parser.add_argument("--repeats", type=int, default=15)
    options = parser.parse_args()
    print(f"{options.sites} sites, {numba.get_num_threads()} threads")
    print(f"{'model':<28} {'csr (ms)':>9} {'action (ms)':>12} {'ratio':>6} {'extra vectors':>14}")
    for name in MODELS:
        generator = Lindbladian(load_model(name, sites=options.sites))
        size = generator.dimension
        random = np.random.default_rng(1)
        rho = random.normal(size=(size, size)) + 1j * random.normal(size=(size, size))
        out = np.empty_like(rho)
        matrix = generator.matrix()
        flat = rho.ravel()
        product = median_time(lambda m=matrix, v=flat: m @ v, options.repeats)
        action = median_time(lambda g=generator, r=rho, o=out: g.apply(r, o), options.repeats)
        difference = np.abs(out.ravel() - matrix @ flat).max()
        if difference > 1e-10 * np.abs(out).max():
            raise SystemExit(f"{name}: the two disagree by {difference:.1e}")
        tables = generator._forward
        held = tables.weights.nbytes + sum(
            array.nbytes
            for group in (tables.real, tables.imaginary, tables.jumps, tables.entries)
            for array in group
        )
        tiles = 3 * 4 * size * 16 * numba.get_num_threads()
        extra = (held + tiles + out.nbytes) / rho.nbytes
        print(
            f"{name:<28} {1e3 * product:9.1f} {1e3 * action:12.1f} {product / action:6.1f} "
            f"{extra:14.2f}"
        )


if __name__ == "__main__":
    main()
