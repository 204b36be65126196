"""What a spectrum calculation returns: sector spectra, the whole spectrum, the gap."""

from __future__ import annotations

import html
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from lbwork import defaults
from lbwork.model import Model
from lbwork.symmetry import Sector, SectorPlan

__all__ = [
    "GapResult",
    "SectorSpectrum",
    "Spectrum",
    "SpectrumCertificate",
    "SpectrumOptions",
    "expected_class",
    "pairs",
]

_CLASSES = {"none": "A", "symmetric": "AI+", "antisymmetric": "AII+"}


def expected_class(transposition: str) -> str:
    """Bulk symmetry class that the transposition symmetry of a sector asks for.

    No transposition symmetry: A; ``B = X B^T X^-1`` with symmetric X: AI+, antisymmetric X: AII+
    (R. Hamazaki, K. Kawabata, N. Kura, M. Ueda, Phys. Rev. Research 2, 023286 (2020)).
    """
    return _CLASSES[transposition]


def pairs(values: npt.NDArray[np.complex128]) -> list[list[float]]:
    """Complex numbers as [re, im] for a JSON document."""
    return [[float(value.real), float(value.imag)] for value in values]


def _html_table(title: str, header: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    head = "".join(f"<th>{html.escape(cell)}</th>" for cell in header)
    body = "".join(
        "<tr>" + "".join(f"<td>{html.escape(cell)}</td>" for cell in row) + "</tr>" for row in rows
    )
    return f"<table><caption>{html.escape(title)}</caption><tr>{head}</tr>{body}</table>"


@dataclass(frozen=True)
class SpectrumOptions:
    """How dense sector spectra are computed.

    threads: BLAS threads of the solve. samples: levels per sector whose residual is recomputed.
    seed: which levels these are, together with the index of the sector.
    """

    threads: int = defaults.DENSE_THREADS
    samples: int = defaults.LEVEL_SAMPLES
    seed: int = 0

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of the options."""
        return {"threads": self.threads, "samples": self.samples, "seed": self.seed}


@dataclass(frozen=True)
class SpectrumCertificate:
    """Evidence for one sector, relative to the norm of its block.

    trace_error: ``|sum lambda - tr B| / (sqrt(n) ||B||_F)``. square_error:
    ``|sum lambda^2 - tr B^2| / ||B||_F^2``. residual: largest ``||(B - lambda) v|| / ||B||`` over
    ``sampled_levels`` levels, v from inverse iteration. largest_real_part: ``max Re lambda``,
    absolute. largest_condition: largest eigenvalue condition number, capped at 1/eps.
    unreliable_levels: share of levels whose error bound exceeds
    :data:`lbwork.defaults.LEVEL_ERROR_SHARE` of the distance to the nearest level.
    """

    trace_error: float
    square_error: float
    residual: float
    sampled_levels: int
    largest_real_part: float
    largest_condition: float
    unreliable_levels: float
    threads: int

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of all fields."""
        return {
            "trace_error": self.trace_error,
            "square_error": self.square_error,
            "residual": self.residual,
            "sampled_levels": self.sampled_levels,
            "largest_real_part": self.largest_real_part,
            "largest_condition": self.largest_condition,
            "unreliable_levels": self.unreliable_levels,
            "threads": self.threads,
        }


@dataclass(frozen=True, eq=False)
class SectorSpectrum:
    """All eigenvalues of the generator in one sector.

    eigenvalues: complex128 (n,), part by part in the order of ``parts`` (sizes of the irreducible
    parts). error_bounds: float64 (n,), first-order absolute bound ``eps ||B|| kappa``, capped at
    ``||B||``.
    """

    sector: Sector
    eigenvalues: npt.NDArray[np.complex128]
    error_bounds: npt.NDArray[np.float64]
    parts: tuple[int, ...]
    real_matrix: bool
    expected_class: str
    certificate: SpectrumCertificate

    def with_copies(self) -> npt.NDArray[np.complex128]:
        """Levels of all sectors this one stands for, (n * multiplicity,)."""
        plain = self.sector.multiplicity - self.sector.conjugates
        mirrored = np.tile(self.eigenvalues.conj(), self.sector.conjugates)
        return np.concatenate([np.tile(self.eigenvalues, plain), mirrored])

    def to_dict(self) -> dict[str, Any]:
        """A JSON document; complex numbers as [re, im]."""
        return {
            "label": self.sector.label,
            "dimension": self.sector.dimension,
            "multiplicity": self.sector.multiplicity,
            "conjugates": self.sector.conjugates,
            "real_matrix": self.real_matrix,
            "eigenvalues": pairs(self.eigenvalues),
            "error_bounds": [float(bound) for bound in self.error_bounds],
            "parts": list(self.parts),
            "expected_class": self.expected_class,
            "certificate": self.certificate.to_dict(),
        }


@dataclass(frozen=True, eq=False)
class Spectrum:
    """The spectra of all sectors of a model, in the order of the plan."""

    model: Model
    plan: SectorPlan
    sectors: tuple[SectorSpectrum, ...]

    def eigenvalues(self) -> npt.NDArray[np.complex128]:
        """All ``d**(2L)`` eigenvalues with multiplicity, sector by sector."""
        return np.concatenate([sector.with_copies() for sector in self.sectors])

    def to_dict(self) -> dict[str, Any]:
        """A JSON document with one entry per sector."""
        return {
            "model": self.model.name,
            "identity": self.model.identity,
            "total_dimension": self.plan.total_dimension,
            "sectors": [sector.to_dict() for sector in self.sectors],
        }

    def _rows(self) -> list[list[str]]:
        return [
            [
                item.sector.label,
                str(item.sector.dimension),
                str(item.sector.multiplicity),
                str(len(item.parts)),
                item.expected_class,
                f"{item.certificate.residual:.1e}",
                f"{item.certificate.unreliable_levels:.1%}",
            ]
            for item in self.sectors
        ]

    def __str__(self) -> str:
        lines = [f"spectrum of {self.model}: {self.plan.total_dimension} levels"]
        lines.append("  size  copies  parts  class  residual  unreliable  sector")
        lines += [
            f"{size:>6}  {copies:>6}  {parts:>5}  {kind:>5}  {residual:>8}  {share:>10}  {label}"
            for label, size, copies, parts, kind, residual, share in self._rows()
        ]
        return "\n".join(lines)

    def _repr_html_(self) -> str:
        header = ("sector", "size", "copies", "parts", "class", "residual", "unreliable")
        return _html_table(f"spectrum of {self.model}", header, self._rows())


@dataclass(frozen=True, eq=False)
class GapResult:
    """The Liouvillian gap: ``min -Re(lambda)`` over all eigenvalues that are not zero modes.

    eigenvalue: the level that sets the gap (non-negative imaginary part; of a complex pair both
    belong to it), or None when every level is a zero mode. zero_modes: number of eigenvalues that
    are zero, over all sectors with their copies. oscillating_modes: number of eigenvalues on the
    imaginary axis that are not zero; if there are any the gap is 0. residual:
    ``||L v - lambda v|| / ||L||`` for a normalised v, recomputed. slow_modes: complex128, the
    slowest distinct levels. methods: how each searched sector was treated. sector_gaps: slowest
    rate in each searched sector, None where all is zero. tolerance: absolute size below which a
    level counts as zero. scope: what was searched, in words. applies: preconditioned applications
    (matrix-free method). mode: operator (D, D) of Frobenius norm 1 that decays with the gap
    (matrix-free method, else None).
    """

    gap: float
    eigenvalue: complex | None
    zero_modes: int
    oscillating_modes: int
    residual: float
    residual_space: str
    sector: str
    searched: tuple[str, ...]
    methods: tuple[str, ...]
    sector_gaps: tuple[float | None, ...]
    slow_modes: npt.NDArray[np.complex128]
    tolerance: float
    model: Model
    certified: bool = True
    scope: str = "all sectors"
    applies: int = 0
    mode: npt.NDArray[np.complex128] | None = None

    def to_dict(self) -> dict[str, Any]:
        """A JSON document; complex numbers as [re, im]."""
        level = None if self.eigenvalue is None else self.eigenvalue
        return {
            "gap": self.gap,
            "eigenvalue": None if level is None else [float(level.real), float(level.imag)],
            "zero_modes": self.zero_modes,
            "oscillating_modes": self.oscillating_modes,
            "residual": self.residual,
            "residual_space": self.residual_space,
            "sector": self.sector,
            "searched": list(self.searched),
            "methods": list(self.methods),
            "sector_gaps": list(self.sector_gaps),
            "slow_modes": pairs(self.slow_modes),
            "tolerance": self.tolerance,
            "certified": self.certified,
            "scope": self.scope,
            "applies": self.applies,
        }

    def _rows(self) -> list[list[str]]:
        level = "none" if self.eigenvalue is None else f"{self.eigenvalue:.12g}"
        return [
            ["gap", f"{self.gap:.12g}"],
            ["eigenvalue", level],
            ["zero modes", str(self.zero_modes)],
            ["oscillating modes", str(self.oscillating_modes)],
            ["residual", f"{self.residual:.1e} ({self.residual_space})"],
            ["sector", self.sector],
            ["sectors searched", f"{len(self.searched)} ({self.scope})"],
            ["slow levels", "  ".join(f"{value:.6g}" for value in self.slow_modes[:4])],
        ]

    def __str__(self) -> str:
        lines = [f"gap of {self.model}"]
        return "\n".join(lines + [f"  {name:<17}  {value}" for name, value in self._rows()])

    def _repr_html_(self) -> str:
        return _html_table(f"gap of {self.model}", ("quantity", "value"), self._rows())
