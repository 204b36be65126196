"""What goes into level statistics and what comes out: sequences, options and their statistics."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
import numpy.typing as npt

from lbwork import defaults
from lbwork.errors import UsageError

__all__ = [
    "EXPECTED_CLASSES",
    "LevelOptions",
    "LevelSequence",
    "LevelStatistics",
    "SequenceStatistics",
]

EXPECTED_CLASSES = ("A", "AI+", "AII+")
"""The three bulk classes of non-Hermitian matrices: no transposition symmetry, symmetric, self-dual
(R. Hamazaki, K. Kawabata, N. Kura, M. Ueda, Phys. Rev. Research 2, 023286 (2020))."""


@dataclass(frozen=True, eq=False)
class LevelSequence:
    """The levels of one irreducible symmetry sector; spacings are never taken across sequences.

    eigenvalues: complex128 (n,), in any order. error_bounds: float64 (n,) absolute bounds, or None
    if the levels are exact. expected_class: what the transposition symmetry of the sector asks for,
    one of :data:`EXPECTED_CLASSES`. real_matrix: the matrix is real, so that levels come in
    conjugate pairs. weight: number of symmetry-related copies the sequence stands for; it is
    carried along and never multiplies the evidence.
    Raises UsageError for wrong shapes, non-finite levels, negative bounds or an unknown class.
    """

    eigenvalues: npt.NDArray[np.complex128]
    error_bounds: npt.NDArray[np.float64] | None = None
    label: str = "levels"
    expected_class: str = "A"
    real_matrix: bool = False
    weight: int = 1

    def __post_init__(self) -> None:
        levels = np.array(self.eigenvalues, dtype=np.complex128)
        if levels.ndim != 1:
            raise UsageError(
                f"sequence '{self.label}': levels have shape {levels.shape}; give a flat array"
            )
        if not np.all(np.isfinite(levels)):
            raise UsageError(f"sequence '{self.label}': a level is not finite; drop the sector")
        if self.expected_class not in EXPECTED_CLASSES:
            raise UsageError(
                f"sequence '{self.label}': unknown class '{self.expected_class}'; "
                f"one of {', '.join(EXPECTED_CLASSES)} is needed"
            )
        levels.setflags(write=False)
        object.__setattr__(self, "eigenvalues", levels)
        if self.error_bounds is None:
            return
        bounds = np.array(self.error_bounds, dtype=np.float64)
        if bounds.shape != levels.shape:
            raise UsageError(
                f"sequence '{self.label}': {bounds.size} error bounds for {levels.size} levels"
            )
        if np.any(np.isnan(bounds)) or np.any(bounds < 0):
            raise UsageError(f"sequence '{self.label}': an error bound is negative or not a number")
        bounds.setflags(write=False)
        object.__setattr__(self, "error_bounds", bounds)


@dataclass(frozen=True)
class LevelOptions:
    """How levels are cleaned and judged; every default stands in :mod:`lbwork.defaults`."""

    degeneracy_tolerance: float = defaults.LEVEL_DEGENERACY_TOLERANCE
    error_share: float = defaults.LEVEL_ERROR_SHARE
    edge_offset: float = defaults.LEVEL_EDGE_OFFSET
    real_band: float = defaults.LEVEL_REAL_BAND
    line_cut: float = defaults.LEVEL_LINE_CUT
    sequence_minimum: int = defaults.LEVEL_SEQUENCE_MINIMUM
    verdict_minimum: int = defaults.LEVEL_VERDICT_MINIMUM
    confidence_minimum: float = defaults.LEVEL_CONFIDENCE_MINIMUM
    seed: int = 0

    def __post_init__(self) -> None:
        if not 0 <= self.line_cut < 0.5:
            raise UsageError(f"line cut {self.line_cut} is not within 0 <= cut < 0.5")
        if not 0 < self.edge_offset <= 1:
            raise UsageError(f"edge offset {self.edge_offset} is not within 0 < offset <= 1")
        if self.sequence_minimum <= defaults.LEVEL_EDGE_NEIGHBOURS + 1:
            raise UsageError(
                f"at least {defaults.LEVEL_EDGE_NEIGHBOURS + 2} levels per sequence are needed for "
                f"the local density; got a minimum of {self.sequence_minimum}"
            )


@dataclass(frozen=True, eq=False)
class SequenceStatistics:
    """Statistics of one sequence.

    geometry: "plane" or "line". levels: how many were given.
    degenerate_levels: levels beyond the first of each exactly degenerate cluster.
    degenerate_share: share of all levels in such clusters. largest_multiplicity: of the largest
    cluster, 1 if there is none. doubled: every level is exactly twofold.
    real_levels, mirrored_levels: set aside because the matrix is real.
    unreliable_levels: not used because of error bounds. edge_levels: dropped by the bulk cut.
    ratios: complex128 (m,), the complex spacing ratios in spatial order (on a line: the
    consecutive-gap ratios min(r, 1/r), real). spacings: float64 (m,) unfolded nearest-neighbour
    spacings of mean 1. descriptors: float64 (m, p), per-level quantities the verdict is made from.
    refused: why the sequence is not used, None if it is.
    """

    label: str
    expected_class: str
    weight: int
    geometry: str
    levels: int
    degenerate_levels: int = 0
    degenerate_share: float = 0.0
    largest_multiplicity: int = 1
    doubled: bool = False
    real_levels: int = 0
    mirrored_levels: int = 0
    unreliable_levels: int = 0
    edge_levels: int = 0
    ratios: npt.NDArray[np.complex128] = field(
        default_factory=lambda: np.empty(0, dtype=np.complex128)
    )
    spacings: npt.NDArray[np.float64] = field(default_factory=lambda: np.empty(0))
    descriptors: npt.NDArray[np.float64] = field(default_factory=lambda: np.empty((0, 0)))
    refused: str | None = None

    @property
    def levels_used(self) -> int:
        """Number of reference levels, each of which contributes one ratio."""
        return int(self.ratios.size)

    def to_dict(self) -> dict[str, Any]:
        """JSON-able counts and the ratios as [re, im] pairs."""
        return {
            "label": self.label,
            "expected_class": self.expected_class,
            "weight": self.weight,
            "geometry": self.geometry,
            "levels": self.levels,
            "levels_used": self.levels_used,
            "degenerate_levels": self.degenerate_levels,
            "degenerate_share": self.degenerate_share,
            "largest_multiplicity": self.largest_multiplicity,
            "real_levels": self.real_levels,
            "mirrored_levels": self.mirrored_levels,
            "unreliable_levels": self.unreliable_levels,
            "edge_levels": self.edge_levels,
            "refused": self.refused,
            "ratios": [[float(z.real), float(z.imag)] for z in self.ratios],
            "spacings": [float(s) for s in self.spacings],
        }


@dataclass(frozen=True, eq=False)
class LevelStatistics:
    """Statistics of all sequences of a run, with the options they were taken with."""

    sequences: tuple[SequenceStatistics, ...]
    options: LevelOptions

    @property
    def used(self) -> tuple[SequenceStatistics, ...]:
        """The sequences that were not refused."""
        return tuple(sequence for sequence in self.sequences if sequence.refused is None)

    @property
    def levels_used(self) -> int:
        """Number of reference levels of all used sequences."""
        return sum(sequence.levels_used for sequence in self.used)

    @property
    def ratios(self) -> npt.NDArray[np.complex128]:
        """Complex spacing ratios of all used sequences in the plane, complex128 (m,)."""
        parts = [sequence.ratios for sequence in self.used if sequence.geometry == "plane"]
        return np.concatenate(parts) if parts else np.empty(0, dtype=np.complex128)

    @property
    def gap_ratios(self) -> npt.NDArray[np.float64]:
        """Consecutive-gap ratios min(r, 1/r) of all used sequences on a line, float64 (m,)."""
        parts = [sequence.ratios.real for sequence in self.used if sequence.geometry == "line"]
        return np.concatenate(parts) if parts else np.empty(0)

    @property
    def spacings(self) -> npt.NDArray[np.float64]:
        """Unfolded nearest-neighbour spacings, mean 1 in each sequence, float64 (m,)."""
        parts = [sequence.spacings for sequence in self.used]
        return np.concatenate(parts) if parts else np.empty(0)

    def to_dict(self) -> dict[str, Any]:
        """JSON-able document of all sequences."""
        return {
            "levels_used": self.levels_used,
            "sequences": [sequence.to_dict() for sequence in self.sequences],
        }

    def __str__(self) -> str:
        lines = [
            f"{'sequence':<24} {'levels':>7} {'used':>6} {'degenerate':>11} {'unreliable':>11}"
        ]
        for sequence in self.sequences:
            note = f"  refused: {sequence.refused}" if sequence.refused else ""
            lines.append(
                f"{sequence.label[:24]:<24} {sequence.levels:>7} {sequence.levels_used:>6} "
                f"{sequence.degenerate_levels:>11} {sequence.unreliable_levels:>11}{note}"
            )
        return "\n".join(lines)
