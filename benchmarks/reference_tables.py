"""Samples the reference ensembles and writes lbwork/levels/reference_tables.npz.

    python benchmarks/reference_tables.py [--scale 1.0] [--seed 20]

Every spectrum is a function of (seed, ensemble, number of the sample). The levels go through the
cleaning and the bulk cut that data go through. About ten minutes on one core at scale 1.
"""

from __future__ import annotations

import argparse
import sys
import time
from collections.abc import Iterable
from pathlib import Path

import numpy as np
import numpy.typing as npt

from lbwork.levels.ensembles import LINE_ENSEMBLES, PLANE_ENSEMBLES, sample_levels
from lbwork.levels.records import LevelOptions, LevelSequence, SequenceStatistics
from lbwork.levels.references import R_EDGES, SPACING_GRID, THETA_EDGES
from lbwork.levels.statistics import sequence_statistics

TARGET = Path(__file__).resolve().parents[1] / "lbwork" / "levels" / "reference_tables.npz"
SAMPLES = {"poisson": 600, "A": 300, "AI+": 300, "AII+": 180}
LEVELS = {"poisson": 600, "A": 600, "AI+": 600, "AII+": 500}
LINE_SAMPLES, LINE_LEVELS = 200, 1000
MIXTURES = (2, 3, 4)
PATCHES = 3

Levels = npt.NDArray[np.complex128]


def generator_of(seed: int, name: str, number: int) -> np.random.Generator:
    """Random generator of one sample."""
    return np.random.default_rng([seed, (PLANE_ENSEMBLES + LINE_ENSEMBLES).index(name), number])


def sample(name: str, levels: int, count: int, seed: int) -> list[Levels]:
    """`count` spectra of one ensemble."""
    started = time.perf_counter()
    spectra = [sample_levels(name, levels, generator_of(seed, name, k)) for k in range(count)]
    print(
        f"{name}: {count} x {levels} levels, {time.perf_counter() - started:.0f} s", file=sys.stderr
    )
    return spectra


def superpose(spectra: list[Levels], blocks: int, count: int) -> list[Levels]:
    """`count` unions of `blocks` different spectra."""
    size = len(spectra)
    strides = [1 + 7 * k for k in range(blocks)]
    return [
        np.concatenate([spectra[(number * strides[k] + 3 * k) % size] for k in range(blocks)])
        for number in range(count)
        if len({(number * strides[k] + 3 * k) % size for k in range(blocks)}) == blocks
    ]


def statistics_of(spectra: Iterable[Levels]) -> list[SequenceStatistics]:
    """Statistics of each spectrum with the default options."""
    options = LevelOptions()
    return [sequence_statistics(LevelSequence(levels), options) for levels in spectra]


def averages(statistics: list[SequenceStatistics]) -> tuple[np.ndarray, np.ndarray]:
    """Mean of the descriptors (p,), and their covariance per level (p, p) over spatial patches.

    Large patches of near levels hold most of the correlations, so the covariance of a patch mean
    times its number of levels is the covariance per effectively independent level.
    """
    mean = np.mean(np.concatenate([one.descriptors for one in statistics]), axis=0)
    scaled = [
        (patch.mean(axis=0) - mean) * np.sqrt(len(patch))
        for one in statistics
        for patch in np.array_split(one.descriptors, PATCHES)
    ]
    return mean, np.cov(np.array(scaled).T)


def density_table(ratios: Levels) -> np.ndarray:
    """Density of z per unit area on the (r, |theta|) grid, lightly smoothed, integral 1."""
    counts, _, _ = np.histogram2d(
        np.abs(ratios), np.abs(np.angle(ratios)), bins=(R_EDGES, THETA_EDGES)
    )
    area = np.outer(np.diff(R_EDGES**2) / 2.0, np.diff(THETA_EDGES))
    density = counts / area
    kernel = np.array([0.25, 0.5, 0.25])
    for axis in (0, 1):
        padded = np.pad(density, [(1, 1) if k == axis else (0, 0) for k in (0, 1)], mode="edge")
        density = np.apply_along_axis(np.convolve, axis, padded, kernel, mode="valid")
    return density / (2.0 * np.sum(density * area))


def moments_of(statistics: list[SequenceStatistics]) -> np.ndarray:
    """(5, 2): <r>, <cos>, <r^2>, <r^3>, <cos 2 theta> with the error over spectra."""
    rows = []
    for one in statistics:
        size, angle = np.abs(one.ratios), np.angle(one.ratios)
        powers = [size, np.cos(angle), size**2, size**3, np.cos(2.0 * angle)]
        rows.append([np.mean(quantity) for quantity in powers])
    table = np.array(rows)
    return np.column_stack([table.mean(axis=0), table.std(axis=0, ddof=1) / np.sqrt(len(table))])


def tabulate(
    name: str, statistics: list[SequenceStatistics], in_plane: bool
) -> dict[str, np.ndarray]:
    """All arrays of one reference, keyed "name/what"."""
    mean, covariance = averages(statistics)
    spacings = np.sort(np.concatenate([one.spacings for one in statistics]))
    ratios = np.concatenate([one.ratios for one in statistics])
    table = {
        "mean": mean,
        "covariance": covariance,
        "moments": moments_of(statistics),
        "spacing_cdf": np.searchsorted(spacings, SPACING_GRID) / spacings.size,
        "levels": np.array(ratios.size),
    }
    if in_plane:
        table["density"] = density_table(ratios).astype(np.float32)
    return {f"{name}/{what}": values for what, values in table.items()}


def warped(levels: Levels) -> tuple[Levels, Levels]:
    """Two spectra of analytic functions of the matrix: exp(M) and (1 + M/2)^2.

    They belong to the same class but have strong density gradients.
    """
    return np.exp(levels), (1.0 + levels / 2.0) ** 2


def systematic(bank: dict[str, list[Levels]], means: dict[str, np.ndarray]) -> np.ndarray:
    """Mean outer product (p, p) of the shifts of the descriptors under smooth density gradients.

    Finite spectra are not flat discs: references are not trusted beyond these shifts.
    """
    shifts = []
    for name, spectra in bank.items():
        for variant in zip(*(warped(levels) for levels in spectra), strict=True):
            mean, _ = averages(statistics_of(variant))
            shifts.append(mean - means[name])
    return np.mean([np.outer(shift, shift) for shift in shifts], axis=0)


def line_tables(scale: float, seed: int) -> dict[str, np.ndarray]:
    """Tables of the spectra on a line and of their superpositions."""
    tables: dict[str, np.ndarray] = {}
    count = max(24, round(LINE_SAMPLES * scale))
    for name in LINE_ENSEMBLES:
        spectra = sample(name, LINE_LEVELS, count, seed)
        tables |= tabulate(name, statistics_of(spectra), in_plane=False)
        if name != "1d-poisson":
            for blocks in MIXTURES:
                mixed = superpose(spectra, blocks, count)
                tables |= tabulate(f"{name} x{blocks}", statistics_of(mixed), in_plane=False)
    size = tables["1d-poisson/mean"].size
    return tables | {"line_systematic": np.zeros((size, size))}


def plane_tables(bank: dict[str, list[Levels]]) -> dict[str, np.ndarray]:
    """Tables of the spectra of the plane and of their superpositions."""
    tables: dict[str, np.ndarray] = {}
    for name, spectra in bank.items():
        tables |= tabulate(name, statistics_of(spectra), in_plane=True)
        if name != "poisson":
            for blocks in MIXTURES:
                mixed = superpose(spectra, blocks, len(spectra))
                tables |= tabulate(f"{name} x{blocks}", statistics_of(mixed), in_plane=True)
    means = {name: tables[f"{name}/mean"] for name in bank}
    return tables | {"plane_systematic": systematic(bank, means)}


def main() -> None:
    """Sample, tabulate, write."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--scale", type=float, default=1.0, help="share of the full sample numbers")
    parser.add_argument("--seed", type=int, default=20)
    parser.add_argument("--output", type=Path, default=TARGET)
    chosen = parser.parse_args()
    bank = {
        name: sample(name, LEVELS[name], max(24, round(SAMPLES[name] * chosen.scale)), chosen.seed)
        for name in PLANE_ENSEMBLES
    }
    tables = plane_tables(bank) | line_tables(chosen.scale, chosen.seed)
    np.savez_compressed(chosen.output, seed=np.array(chosen.seed), **tables)
    print(f"{chosen.output.name}: {chosen.output.stat().st_size} bytes", file=sys.stderr)


if __name__ == "__main__":
    main()
