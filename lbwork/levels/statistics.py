"""Level statistics of a set of sequences: clean, cut to the bulk, take ratios and spacings."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
import numpy.typing as npt

from lbwork import defaults
from lbwork.errors import UsageError
from lbwork.levels.cleaning import CleanLevels, clean
from lbwork.levels.descriptors import line_descriptors, plane_descriptors
from lbwork.levels.neighbours import Neighbourhood, edge_offset, neighbourhood, unreliable
from lbwork.levels.ratios import complex_spacing_ratios, gap_ratios
from lbwork.levels.records import (
    LevelOptions,
    LevelSequence,
    LevelStatistics,
    SequenceStatistics,
)
from lbwork.levels.spacings import line_spacings, plane_spacings

__all__ = ["level_statistics", "sequence_statistics"]


def level_statistics(
    sequences: Iterable[LevelSequence], options: LevelOptions | None = None
) -> LevelStatistics:
    """Statistics of every sequence; spacings are taken within each sequence only.

    Raises UsageError if there is no sequence at all. A sequence that cannot be used is kept in the
    result with its reason, it does not raise.
    """
    chosen = LevelOptions() if options is None else options
    taken = tuple(sequence_statistics(sequence, chosen) for sequence in sequences)
    if not taken:
        raise UsageError("no level sequence given; pass at least one")
    return LevelStatistics(taken, chosen)


def sequence_statistics(sequence: LevelSequence, options: LevelOptions) -> SequenceStatistics:
    """Statistics of one sequence, or the reason why it is refused."""
    levels = clean(sequence, options)
    if levels.levels.size < options.sequence_minimum:
        reason = (
            f"{levels.levels.size} distinct levels, fewer than the {options.sequence_minimum} "
            "that local statistics need"
        )
        return _record(sequence, levels, refused=reason)
    if levels.geometry == "line":
        return _line(sequence, levels, options)
    return _plane(sequence, levels, options)


def _record(
    sequence: LevelSequence,
    levels: CleanLevels,
    *,
    refused: str | None = None,
    unreliable_levels: int = 0,
    edge_levels: int = 0,
    ratios: npt.NDArray[np.complex128] | None = None,
    spacings: npt.NDArray[np.float64] | None = None,
    descriptors: npt.NDArray[np.float64] | None = None,
) -> SequenceStatistics:
    return SequenceStatistics(
        label=sequence.label,
        expected_class=sequence.expected_class,
        weight=sequence.weight,
        geometry=levels.geometry,
        levels=int(sequence.eigenvalues.size),
        degenerate_levels=levels.degenerate_levels,
        degenerate_share=levels.degenerate_share,
        largest_multiplicity=levels.largest_multiplicity,
        doubled=levels.doubled,
        real_levels=levels.real_levels,
        mirrored_levels=levels.mirrored_levels,
        unreliable_levels=unreliable_levels,
        edge_levels=edge_levels,
        ratios=np.empty(0, dtype=np.complex128) if ratios is None else ratios,
        spacings=np.empty(0) if spacings is None else spacings,
        descriptors=np.empty((0, 0)) if descriptors is None else descriptors,
        refused=refused,
    )


def _refusal(candidates: int, unsharp: int) -> str | None:
    if candidates == 0:
        return "no level is left after the bulk cut"
    share = unsharp / candidates
    if share <= defaults.LEVEL_REFUSED_SHARE:
        return None
    return (
        f"the error bounds of {share:.0%} of the levels exceed the set share of their spacing "
        f"(at most {defaults.LEVEL_REFUSED_SHARE:.0%} may): rounding can fake level repulsion"
    )


def _unit_mean(spacings: npt.NDArray[np.float64]) -> npt.NDArray[np.float64]:
    return spacings / np.mean(spacings)


def _unsharp(
    near: Neighbourhood, bounds: npt.NDArray[np.float64], share: float
) -> npt.NDArray[np.bool_]:
    """Levels that are unreliable, or whose ratio rests on a neighbour not known sharply enough."""
    around = np.max(bounds[near.index[:, :2]], axis=1)
    return unreliable(near, np.maximum(bounds, around), share)


def _plane(
    sequence: LevelSequence, levels: CleanLevels, options: LevelOptions
) -> SequenceStatistics:
    near = neighbourhood(levels.levels)
    deep = edge_offset(near) < options.edge_offset
    if levels.mirror_axis:
        # Levels near the axis are correlated with their own mirror images. They stay neighbours
        # of others, but are no reference levels themselves.
        deep &= levels.levels.imag > options.real_band * near.local_spacing
    unsharp = _unsharp(near, levels.bounds, options.error_share)
    edge_levels = int(np.sum(~deep))
    unreliable_levels = int(np.sum(deep & unsharp))
    refused = _refusal(int(np.sum(deep)), unreliable_levels)
    if refused is not None:
        return _record(
            sequence,
            levels,
            refused=refused,
            unreliable_levels=unreliable_levels,
            edge_levels=edge_levels,
        )
    used = near.order[(deep & ~unsharp)[near.order]]
    return _record(
        sequence,
        levels,
        unreliable_levels=unreliable_levels,
        edge_levels=edge_levels,
        ratios=complex_spacing_ratios(near)[used],
        spacings=_unit_mean(plane_spacings(near)[used]),
        descriptors=plane_descriptors(near)[used],
    )


def _line(
    sequence: LevelSequence, levels: CleanLevels, options: LevelOptions
) -> SequenceStatistics:
    positions = levels.levels.real
    count = positions.size
    gaps = np.diff(positions)
    inner = np.arange(3, count - 3)
    cut = int(np.ceil(options.line_cut * count))
    deep = (inner >= cut) & (inner < count - cut)
    bounds = levels.bounds
    around = np.maximum(bounds[inner], np.maximum(bounds[inner - 1], bounds[inner + 1]))
    unsharp = around > options.error_share * np.minimum(gaps[inner - 1], gaps[inner])
    unreliable_levels = int(np.sum(deep & unsharp))
    edge_levels = count - int(np.sum(deep))
    refused = _refusal(int(np.sum(deep)), unreliable_levels)
    if refused is not None:
        return _record(
            sequence,
            levels,
            refused=refused,
            unreliable_levels=unreliable_levels,
            edge_levels=edge_levels,
        )
    used = deep & ~unsharp
    return _record(
        sequence,
        levels,
        unreliable_levels=unreliable_levels,
        edge_levels=edge_levels,
        ratios=gap_ratios(positions)[2:-2][used].astype(np.complex128),
        spacings=_unit_mean(line_spacings(positions)[2:-2][used]),
        descriptors=line_descriptors(positions)[used],
    )
