"""How often seeded random matrices are named correctly; fails below 95 of 100.

    python benchmarks/verdict_rates.py [--tries 100] [--size 1000] [--small-self-dual]

Each try is one matrix, and its spectrum is judged without knowledge of its class. The self-dual
class has `size` independent levels (a matrix of twice the size), or half of them with
--small-self-dual (a matrix of the given size). Controls: independent levels, real matrices of twice
the size (whose upper half plane is used), and two superposed blocks.
"""

from __future__ import annotations

import argparse
import sys
import time
from collections import Counter
from collections.abc import Callable

import numpy as np
import numpy.typing as npt

from lbwork.levels import LevelSequence, judge_levels, level_statistics
from lbwork.levels.ensembles import (
    complex_symmetric,
    ginibre,
    independent_levels,
    real_ginibre,
    self_dual,
)

Sampler = Callable[[int, np.random.Generator], npt.NDArray[np.complex128]]


def two_blocks(size: int, generator: np.random.Generator) -> npt.NDArray[np.complex128]:
    """Two independent blocks of class A, `size` levels together."""
    return np.concatenate([np.linalg.eigvals(ginibre(size // 2, generator)) for _ in range(2)])


CASES: dict[str, tuple[str, Sampler]] = {
    "Ginibre": ("A", lambda n, g: np.linalg.eigvals(ginibre(n, g))),
    "complex symmetric": ("AI+", lambda n, g: np.linalg.eigvals(complex_symmetric(n, g))),
    "complex self-dual": ("AII+", lambda n, g: np.linalg.eigvals(self_dual(n, g))),
    "real Ginibre": ("A", lambda n, g: np.linalg.eigvals(real_ginibre(n, g))),
    "independent": ("poisson", independent_levels),
    "two blocks of A": ("mixture", two_blocks),
}


def rate(name: str, size: int, tries: int, seed: int) -> Counter[str]:
    """Verdicts of `tries` seeded spectra."""
    index = list(CASES).index(name)
    _, sampler = CASES[name]
    verdicts: Counter[str] = Counter()
    for number in range(tries):
        generator = np.random.default_rng([seed, index, number])
        levels = sampler(size, generator)
        verdicts[judge_levels(level_statistics([LevelSequence(levels)])).verdict] += 1
    return verdicts


def main() -> int:
    """Print one line per ensemble; exit status 1 if one of them is named correctly too rarely."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--tries", type=int, default=100)
    parser.add_argument("--size", type=int, default=1000)
    parser.add_argument("--seed", type=int, default=7)
    parser.add_argument("--only", choices=list(CASES), action="append")
    parser.add_argument("--small-self-dual", action="store_true")
    chosen = parser.parse_args()
    failed = False
    for name in chosen.only or list(CASES):
        expected, _ = CASES[name]
        doubled = name == "real Ginibre" or (
            name == "complex self-dual" and not chosen.small_self_dual
        )
        started = time.perf_counter()
        verdicts = rate(name, chosen.size * (2 if doubled else 1), chosen.tries, chosen.seed)
        share = verdicts[expected] / chosen.tries
        failed |= share < 0.95
        seconds = time.perf_counter() - started
        print(f"{name:<20} {expected:<8} {share:6.1%}  {dict(verdicts)}  {seconds:.0f} s")
        sys.stdout.flush()
    return int(failed)


if __name__ == "__main__":
    sys.exit(main())
