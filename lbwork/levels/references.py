"""The reference ensembles as tables: made by benchmarks/reference_tables.py, seeded."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from importlib import resources

import numpy as np
import numpy.typing as npt

from lbwork.errors import UsageError

__all__ = [
    "MOMENT_NAMES",
    "R_EDGES",
    "SPACING_GRID",
    "THETA_EDGES",
    "Reference",
    "reference",
    "reference_density",
    "reference_names",
    "systematic",
]

R_EDGES: npt.NDArray[np.float64] = np.linspace(0.0, 1.0, 21)
THETA_EDGES: npt.NDArray[np.float64] = np.linspace(0.0, np.pi, 19)
SPACING_GRID: npt.NDArray[np.float64] = np.linspace(0.0, 4.0, 161)
MOMENT_NAMES = ("r", "cos", "r2", "r3", "cos2")


@dataclass(frozen=True, eq=False)
class Reference:
    """One reference ensemble.

    geometry: "plane" or "line". family: the verdict it speaks for. mean (p,) and covariance (p, p)
    per level of the descriptors of :mod:`lbwork.levels.descriptors`. moments: (5, 2) values and
    sampling errors in the order of :data:`MOMENT_NAMES` (on a line of min(r, 1/r)). spacing_cdf:
    share of the unfolded spacings below each point of :data:`SPACING_GRID`. levels: sampled
    reference levels behind the table.
    """

    name: str
    geometry: str
    family: str
    mean: npt.NDArray[np.float64]
    covariance: npt.NDArray[np.float64]
    moments: npt.NDArray[np.float64]
    spacing_cdf: npt.NDArray[np.float64]
    levels: int


@cache
def _tables() -> dict[str, np.ndarray]:
    source = resources.files("lbwork.levels").joinpath("reference_tables.npz")
    with source.open("rb") as stream, np.load(stream) as archive:
        return {key: archive[key] for key in archive.files}


@cache
def _references() -> dict[str, Reference]:
    tables = _tables()
    names = [key.removesuffix("/mean") for key in tables if key.endswith("/mean")]
    return {
        name: Reference(
            name=name,
            geometry="line" if name.startswith("1d-") else "plane",
            family="mixture" if " x" in name else name,
            mean=tables[f"{name}/mean"],
            covariance=tables[f"{name}/covariance"],
            moments=tables[f"{name}/moments"],
            spacing_cdf=tables[f"{name}/spacing_cdf"],
            levels=int(tables[f"{name}/levels"]),
        )
        for name in names
    }


def reference_names(geometry: str) -> tuple[str, ...]:
    """Names of the references for "plane" or "line"; "A x3" is three independent blocks of A."""
    return tuple(name for name, one in _references().items() if one.geometry == geometry)


def reference(name: str) -> Reference:
    """The table of one reference; raises UsageError for unknown names."""
    try:
        return _references()[name]
    except KeyError:
        known = ", ".join(_references())
        raise UsageError(f"unknown reference '{name}'; known are {known}") from None


def systematic(geometry: str) -> npt.NDArray[np.float64]:
    """Covariance (p, p) of the descriptors that does not shrink with the number of levels."""
    return _tables()[f"{geometry}_systematic"]


def reference_density(
    name: str,
) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """Density of the complex spacing ratio of one reference: (r_edges, theta_edges, pdf).

    pdf: float64 (20, 18) per unit area of the disc on the bins in r and |theta|, symmetric in
    theta, integral 1 over the disc; 1/pi everywhere for independent levels. Raises UsageError for
    unknown names and for references on a line.
    """
    if reference(name).geometry != "plane":
        raise UsageError(f"'{name}' lives on a line and has no density in the disc")
    return R_EDGES, THETA_EDGES, _tables()[f"{name}/density"].astype(np.float64)
