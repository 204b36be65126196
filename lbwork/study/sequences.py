"""From sector spectra to level sequences: one for each irreducible part."""

from __future__ import annotations

import numpy as np

from lbwork import defaults
from lbwork.levels import LevelSequence
from lbwork.spectrum import SectorSpectrum, Spectrum

__all__ = ["level_sequences"]


def _part_sequences(item: SectorSpectrum) -> list[LevelSequence]:
    """Parts that are long enough for statistics; the longest one in any case."""
    offsets = np.concatenate([[0], np.cumsum(item.parts)])
    ranked = sorted(range(len(item.parts)), key=lambda index: -item.parts[index])
    kept = [
        index
        for place, index in enumerate(ranked)
        if place == 0 or item.parts[index] >= defaults.LEVEL_SEQUENCE_MINIMUM
    ]
    sequences = []
    for index in kept:
        inside = slice(offsets[index], offsets[index + 1])
        label = item.sector.label
        if len(item.parts) > 1:
            label += f", part {index + 1} of {len(item.parts)}"
        sequences.append(
            LevelSequence(
                eigenvalues=item.eigenvalues[inside],
                error_bounds=item.error_bounds[inside],
                label=label,
                expected_class=item.expected_class,
                real_matrix=item.real_matrix,
                weight=item.sector.multiplicity,
            )
        )
    return sequences


def level_sequences(spectrum: Spectrum) -> list[LevelSequence]:
    """One sequence per sector and irreducible part, largest first.

    Levels of different sectors, or of parts that the generator does not connect both ways, are
    independent and are never mixed. Sectors too small for statistics are left out, unless all are.
    """
    sequences = [one for item in spectrum.sectors for one in _part_sequences(item)]
    sequences.sort(key=lambda one: -one.eigenvalues.size)
    large = [one for one in sequences if one.eigenvalues.size >= defaults.LEVEL_SEQUENCE_MINIMUM]
    return large or sequences[:1]
