"""Degeneracies, mirror images, lines, error bounds and the bulk cut."""

from __future__ import annotations

import numpy as np
import pytest

from lbwork.errors import UsageError
from lbwork.levels import LevelOptions, LevelSequence, SequenceStatistics, level_statistics
from lbwork.levels.cleaning import clean, is_conjugation_closed, merge_degenerate
from lbwork.levels.ensembles import independent_levels, real_ginibre, sample_levels, self_dual


def one(sequence: LevelSequence, options: LevelOptions | None = None) -> SequenceStatistics:
    return level_statistics([sequence], options).sequences[0]


def test_clusters_are_merged_with_their_multiplicity() -> None:
    levels = np.array([1.0, 1.0 + 1e-12j, 2.0, 1.0 - 1e-12, 3.0j], dtype=complex)
    distinct, multiplicity, owner = merge_degenerate(levels, 1e-10)
    assert sorted(multiplicity) == [1, 1, 3]
    assert owner[0] == owner[1] == owner[3]
    assert distinct[owner[0]] == pytest.approx(1.0)


def test_clusters_across_a_grid_line_are_merged() -> None:
    levels = np.array([0.5e-6 - 1e-9, 0.5e-6 + 1e-9, 1.0], dtype=complex)
    assert sorted(merge_degenerate(levels, 1e-6)[1]) == [1, 2]


def test_thousands_of_copies_of_one_level_are_one_level() -> None:
    levels = np.concatenate([np.zeros(20000), independent_levels(100, np.random.default_rng(1))])
    statistics = one(LevelSequence(levels))
    assert statistics.degenerate_levels == 19999
    assert statistics.largest_multiplicity == 20000
    assert statistics.degenerate_share > 0.99


def test_degenerate_levels_are_counted_and_do_not_change_the_ratios() -> None:
    levels = independent_levels(300, np.random.default_rng(2))
    plain = one(LevelSequence(levels))
    doubled = one(LevelSequence(np.concatenate([levels, levels[:40]])))
    assert doubled.degenerate_levels == 40
    assert doubled.degenerate_share == pytest.approx(80 / 340)
    assert not doubled.doubled
    np.testing.assert_allclose(np.sort(np.abs(plain.ratios)), np.sort(np.abs(doubled.ratios)))


def test_kramers_pairs_are_one_level_each() -> None:
    spectrum = np.linalg.eigvals(self_dual(200, np.random.default_rng(3)))
    statistics = one(LevelSequence(spectrum, expected_class="AII+"))
    assert statistics.degenerate_levels == 100
    assert statistics.largest_multiplicity == 2
    assert statistics.doubled


def test_a_real_matrix_is_recognised_and_only_its_upper_half_used() -> None:
    spectrum = np.linalg.eigvals(real_ginibre(300, np.random.default_rng(4)))
    assert is_conjugation_closed(spectrum)
    detected, told = (clean(LevelSequence(spectrum, real_matrix=f), LevelOptions()) for f in (0, 1))
    real = int(np.sum(spectrum.imag == 0))
    for levels in (detected, told):
        assert levels.mirror_axis
        assert levels.real_levels == real
        assert levels.mirrored_levels == (300 - real) // 2 == levels.levels.size
        assert np.all(levels.levels.imag > 0)


def test_levels_near_the_real_axis_are_no_reference_levels() -> None:
    spectrum = np.linalg.eigvals(real_ginibre(400, np.random.default_rng(5)))
    narrow = one(LevelSequence(spectrum), LevelOptions(real_band=0.0))
    wide = one(LevelSequence(spectrum), LevelOptions(real_band=4.0))
    assert wide.levels_used < narrow.levels_used


def test_a_complex_spectrum_is_not_taken_for_a_real_matrix() -> None:
    levels = clean(LevelSequence(sample_levels("A", 150, np.random.default_rng(6))), LevelOptions())
    assert not levels.mirror_axis
    assert levels.levels.size == 150


@pytest.mark.parametrize("direction", [1.0, 1.0j])
def test_a_spectrum_on_a_line_is_judged_on_the_line(direction: complex) -> None:
    positions = np.random.default_rng(7).uniform(1.0, 2.0, size=200)
    statistics = one(LevelSequence(direction * positions + (0.3 if direction == 1.0j else 0.0)))
    assert statistics.geometry == "line"
    assert statistics.levels_used == 180
    assert np.all(statistics.ratios.imag == 0)


def test_the_mirrored_half_of_an_imaginary_line_is_set_aside() -> None:
    energies = np.random.default_rng(8).uniform(0.1, 1.0, size=100)
    statistics = one(LevelSequence(1j * np.concatenate([energies, -energies, [0.0]])))
    assert statistics.geometry == "line"
    assert (statistics.mirrored_levels, statistics.real_levels) == (100, 1)


def test_few_complex_levels_among_real_ones_are_refused() -> None:
    generator = np.random.default_rng(9)
    pairs = generator.normal(size=20) + 1j * generator.uniform(0.1, 1.0, size=20)
    levels = np.concatenate([generator.normal(size=300), pairs, pairs.conj()])
    statistics = one(LevelSequence(levels))
    assert statistics.real_levels == 300
    assert statistics.refused is not None and "20 distinct levels" in statistics.refused


def test_levels_with_wide_error_bounds_are_dropped() -> None:
    levels = independent_levels(400, np.random.default_rng(10))
    bounds = np.zeros(400)
    bounds[:8] = 1.0
    statistics = one(LevelSequence(levels, bounds))
    sharp = one(LevelSequence(levels))
    assert statistics.refused is None
    assert statistics.unreliable_levels >= 4
    assert statistics.levels_used == sharp.levels_used - statistics.unreliable_levels


def test_a_sequence_with_too_many_unreliable_levels_is_refused() -> None:
    levels = independent_levels(400, np.random.default_rng(11))
    statistics = one(LevelSequence(levels, np.full(400, 0.02)))
    assert statistics.refused is not None and "error bounds" in statistics.refused
    assert statistics.levels_used == 0


@pytest.mark.parametrize("count", [0, 1, 2, 59])
def test_too_few_levels_are_refused_with_their_number(count: int) -> None:
    levels = independent_levels(count, np.random.default_rng(12))
    statistics = one(LevelSequence(levels))
    assert statistics.refused is not None and f"{count} distinct levels" in statistics.refused


def test_the_bulk_cut_takes_the_rim_and_no_more() -> None:
    # A rim 1.2 mean spacings deep of a disc of 500 levels holds 18 % of them.
    statistics = one(LevelSequence(sample_levels("A", 500, np.random.default_rng(13))))
    assert 0.13 < statistics.edge_levels / 500 < 0.23
    assert np.mean(statistics.spacings) == pytest.approx(1.0)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ({"eigenvalues": np.ones((2, 2))}, "flat array"),
        ({"eigenvalues": np.array([1.0, np.nan])}, "not finite"),
        ({"eigenvalues": np.ones(3), "expected_class": "B"}, "unknown class 'B'"),
        ({"eigenvalues": np.ones(3), "error_bounds": np.ones(2)}, "2 error bounds for 3"),
        ({"eigenvalues": np.ones(1), "error_bounds": -np.ones(1)}, "negative"),
    ],
)
def test_bad_sequences_are_refused(arguments: dict, words: str) -> None:
    with pytest.raises(UsageError, match=words):
        LevelSequence(**arguments)


def test_no_sequence_is_an_error() -> None:
    with pytest.raises(UsageError, match="at least one"):
        level_statistics([])
