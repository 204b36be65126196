"""Steady state and gap against SciPy's sparse LU and shift-invert Arnoldi, in one run.

    python benchmarks/steady_and_gap.py [--sites 4:11] [--scipy-sites 4:8] [--model xxz-driven]

Each measurement is a process of its own, so that peak memory is its own; times leave out the start
of the interpreter. SciPy works on the sector of equal ket and bra charge, assembled from Kronecker
products, with ``splu`` and inverse iteration for the steady state and
``eigs(sigma=1e-6)`` for the gap: what a user would otherwise write. The answers are compared.
Draws time and memory against length.
"""

from __future__ import annotations

import argparse
import json
import subprocess
import sys
import time
from pathlib import Path

import numpy as np

from lbwork import Lindbladian, load_model, spectral_gap, steady_state
from lbwork.provenance import peak_memory
from lbwork.spectrum import GapOptions, gap_cost
from lbwork.steady import SteadyOptions, steady_cost

DELTA = 1.0
BIAS = 0.2


def sector_matrix(model):
    """The generator on |a><b| with equal numbers of up spins, csc, and the kept vector indices."""
    generator = Lindbladian(model)
    size = generator.dimension
    ups = np.array([bin(state).count("1") for state in range(size)])
    kept = np.flatnonzero((ups[:, None] == ups[None, :]).ravel())
    return generator.matrix()[kept][:, kept].tocsc(), kept, size


def scipy_steady(model):
    """First magnetisation of the steady state from a sparse LU factorisation."""
    import scipy.sparse as sparse
    from scipy.sparse.linalg import splu

    matrix, kept, size = sector_matrix(model)
    started = time.perf_counter()
    # Off the zero mode by a rounding error; a dense trace row would fill the factors.
    shifted = matrix - 1e-10 * sparse.identity(kept.size, format="csc")
    factors = splu(shifted.tocsc())
    vector = np.random.default_rng(1).normal(size=kept.size).astype(complex)
    for _ in range(3):
        vector = factors.solve(vector)
        vector /= np.linalg.norm(vector)
    trace = (kept // size) == (kept % size)
    vector /= vector[trace].sum()
    seconds = time.perf_counter() - started
    populations = vector[trace].real
    states = kept[trace] // size
    first = 1 - 2 * (states >= size // 2)
    return seconds, float(populations @ first)


def scipy_gap(model):
    """Gap from shift-invert Arnoldi."""
    from scipy.sparse.linalg import eigs

    matrix, _, _ = sector_matrix(model)
    started = time.perf_counter()
    levels = eigs(matrix, k=4, sigma=1e-6, return_eigenvectors=False)
    seconds = time.perf_counter() - started
    moving = levels[np.abs(levels) > 1e-8]
    return seconds, float(-moving.real.max())


def lbwork_steady(model):
    """The certified state, found matrix-free."""
    started = time.perf_counter()
    state = steady_state(model, options=SteadyOptions(method="matrix-free"))
    return time.perf_counter() - started, float(state.magnetisation[0])


def lbwork_gap(model):
    """The certified gap from two starts."""
    started = time.perf_counter()
    result = spectral_gap(model, options=GapOptions(method="nearest"))
    return time.perf_counter() - started, result.gap


TASKS = {
    "steady": lbwork_steady,
    "splu": scipy_steady,
    "gap": lbwork_gap,
    "eigs": scipy_gap,
}


def one(task: str, name: str, sites: int) -> None:
    """Measure one task in this process; the first of two runs compiles and loads."""
    model = load_model(name, sites=sites, delta=DELTA, mu=BIAS)
    cost = None
    if task in ("steady", "gap"):
        TASKS[task](load_model(name, sites=5, delta=DELTA, mu=BIAS))
        options = GapOptions(method="nearest")
        estimate = steady_cost(model) if task == "steady" else gap_cost(model, options)
        cost = {"seconds": estimate.seconds, "memory": estimate.memory_bytes}
    seconds, value = TASKS[task](model)
    print(json.dumps({"seconds": seconds, "value": value, "memory": peak_memory(), "cost": cost}))


def measured(task: str, name: str, sites: int) -> dict | None:
    """The same in a process of its own; None when it fails, for example for lack of memory."""
    command = [sys.executable, __file__, "--task", task, "--model", name, "--sites", str(sites)]
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    if done.returncode:
        sys.stderr.write(done.stderr[-300:] + "\n")
        return None
    return json.loads(done.stdout.splitlines()[-1])


def sizes_of(text: str) -> list[int]:
    """``4:8`` as [4, 5, 6, 7, 8]."""
    parts = [int(part) for part in text.split(":")]
    return list(range(parts[0], parts[-1] + 1))


def draw(results: dict, target: Path) -> None:
    """Time and memory against length, one line for each task."""
    from matplotlib.figure import Figure

    figure = Figure(figsize=(7.0, 3.0), layout="constrained")
    styles = {
        "steady": ("#0072b2", "o-"),
        "splu": ("#0072b2", "s:"),
        "gap": ("#d55e00", "o-"),
        "eigs": ("#d55e00", "s:"),
    }
    labels = {
        "steady": "steady state, lbwork",
        "splu": "steady state, SciPy splu",
        "gap": "gap, lbwork",
        "eigs": "gap, SciPy eigs",
    }
    for axes, key, unit in zip(
        figure.subplots(1, 2), ("seconds", "memory"), ("time (s)", "peak memory (GB)"), strict=True
    ):
        for task, rows in results.items():
            points = [(sites, row[key]) for sites, row in rows.items() if row is not None]
            if not points:
                continue
            lengths, values = np.array(points).T
            colour, style = styles[task]
            scale = 1e9 if key == "memory" else 1.0
            axes.semilogy(lengths, values / scale, style, color=colour, label=labels[task], ms=4)
        axes.set_xlabel("length $L$")
        axes.set_ylabel(unit)
    figure.axes[0].legend(frameon=False, fontsize=8)
    figure.savefig(target)


def main() -> None:
    """A table, and the figure ``figures/steady-and-gap.svg``."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--sites", default="4:11")
    parser.add_argument("--scipy-sites", default="4:8")
    parser.add_argument("--model", default="xxz-driven")
    parser.add_argument("--task", choices=sorted(TASKS))
    options = parser.parse_args()
    if options.task:
        one(options.task, options.model, int(options.sites))
        return
    results: dict[str, dict[int, dict | None]] = {task: {} for task in TASKS}
    for task in TASKS:
        for sites in sizes_of(options.sites if task in ("steady", "gap") else options.scipy_sites):
            row = results[task][sites] = measured(task, options.model, sites)
            if row is None:
                print(f"{task:<7} {sites:3d}  failed")
                continue
            cost = row["cost"]
            said = (
                ""
                if cost is None
                else (f"  said {cost['seconds']:8.2f} s {cost['memory'] / 1e9:6.2f} GB")
            )
            print(
                f"{task:<7} {sites:3d} {row['seconds']:9.2f} s {row['memory'] / 1e9:6.2f} GB "
                f"{row['value']:.12g}{said}",
                flush=True,
            )
    for ours, theirs in (("steady", "splu"), ("gap", "eigs")):
        for sites, row in results[theirs].items():
            mine = results[ours].get(sites)
            if row is None or mine is None:
                continue
            if abs(row["value"] - mine["value"]) > 1e-8:
                raise SystemExit(f"{ours} and {theirs} disagree at {sites} sites")
            print(
                f"{sites} sites: {theirs} takes {row['seconds'] / mine['seconds']:.1f} times "
                f"the time of {ours}"
            )
    draw(results, Path(__file__).parent / "figures" / "steady-and-gap.svg")


if __name__ == "__main__":
    main()
