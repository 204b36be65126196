"""Matrix-free application of the generator against SciPy's CSR product, in one run.

    python benchmarks/matrix_free_action.py [--sites 10] [--repeats 15] [--threads 2]

Prints the ratio of the median times, with the two taken in turn so that other load on the machine
meets both, and the memory of one application besides its input, in density matrices.
"""

from __future__ import annotations

import argparse
import statistics
import time
from collections.abc import Callable, Sequence

import numba
import numpy as np

from lbwork import Lindbladian, load_model

MODELS = ("xx-dephasing", "xxz-driven", "hopping-symmetric-coherent", "xxx-loss")


def median_times(tasks: Sequence[Callable[[], object]], repeats: int) -> list[float]:
    """Median duration of each task in seconds, taken in turn after one warm-up call each."""
    durations: list[list[float]] = [[] for _ in tasks]
    for turn in range(repeats + 1):
        for task, record in zip(tasks, durations, strict=True):
            started = time.perf_counter()
            task()
            if turn > 0:
                record.append(time.perf_counter() - started)
    return [statistics.median(record) for record in durations]


def main() -> None:
    """One line per model."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--sites", type=int, default=10)
    parser.add_argument("--repeats", type=int, default=15)
    parser.add_argument("--threads", type=int, default=numba.get_num_threads())
    options = parser.parse_args()
    numba.set_num_threads(options.threads)
    print(f"{options.sites} sites, {numba.get_num_threads()} threads")
    print(
        f"{'model':<28} {'csr (ms)':>9} {'action (ms)':>12} {'ratio':>6} {'extra vectors':>14}"
        "  parameters"
    )
    for name in MODELS:
        generator = Lindbladian(load_model(name, sites=options.sites))
        size = generator.dimension
        random = np.random.default_rng(1)
        rho = random.normal(size=(size, size)) + 1j * random.normal(size=(size, size))
        out = np.empty_like(rho)
        matrix = generator.matrix()
        flat = rho.ravel()
        tasks = (
            lambda m=matrix, v=flat: m @ v,
            lambda g=generator, r=rho, o=out: g.apply(r, o),
        )
        product, action = median_times(tasks, options.repeats)
        difference = np.abs(out.ravel() - matrix @ flat).max()
        if difference > 1e-10 * np.abs(out).max():
            raise SystemExit(f"{name}: the two disagree by {difference:.1e}")
        rows = 16 * size * numba.get_num_threads()
        extra = (generator.action_bytes + rows + out.nbytes) / rho.nbytes
        parameters = " ".join(f"{key}={value}" for key, value in generator.model.parameters.items())
        print(
            f"{name:<28} {1e3 * product:9.1f} {1e3 * action:12.1f} {product / action:6.1f} "
            f"{extra:14.2f}  {parameters}"
        )


if __name__ == "__main__":
    main()
