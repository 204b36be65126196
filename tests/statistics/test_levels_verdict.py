"""Verdicts on seeded spectra whose class is known, with negative controls."""

from __future__ import annotations

import json

import numpy as np
import pytest

from lbwork.levels import LevelSequence, Verdict, judge_levels, level_statistics, reference
from lbwork.levels.ensembles import (
    complex_symmetric,
    independent_levels,
    real_ginibre,
    sample_levels,
    self_dual,
)

MIXTURES = ("A", "AI+", "AII+")


def spectra(name: str, count: int, levels: int, seed: int) -> list[np.ndarray]:
    generator = np.random.default_rng(seed)
    return [sample_levels(name, levels, generator) for _ in range(count)]


def judge(*levels: np.ndarray, expected: str = "A") -> Verdict:
    sequences = [
        LevelSequence(one, label=f"sector {k}", expected_class=expected)
        for k, one in enumerate(levels)
    ]
    return judge_levels(level_statistics(sequences))


@pytest.fixture(scope="module")
def ginibre_spectra() -> list[np.ndarray]:
    return spectra("A", 6, 400, seed=11)


def test_class_a_is_named_from_several_sectors(ginibre_spectra: list[np.ndarray]) -> None:
    verdict = judge(*ginibre_spectra[:4])
    assert verdict.verdict == "A"
    assert verdict.confidence > 0.99
    assert "class A, as the absence of a transposition symmetry requires" in verdict.sentence
    assert verdict.mean_ratio is not None and verdict.mean_cosine is not None
    assert verdict.mean_ratio.low < 0.738 < verdict.mean_ratio.high
    assert verdict.mean_cosine.low < -0.244 < verdict.mean_cosine.high
    assert verdict.sequences_agree > 1e-3
    assert verdict.disagreeing == ()


def test_class_ai_dagger_is_named() -> None:
    generator = np.random.default_rng(12)
    levels = [np.linalg.eigvals(complex_symmetric(400, generator)) for _ in range(4)]
    verdict = judge(*levels, expected="AI+")
    assert verdict.verdict == "AI+"
    assert "AI-dagger, as its symmetry under transposition requires" in verdict.sentence


def test_class_aii_dagger_is_named_and_its_doublets_explained() -> None:
    generator = np.random.default_rng(13)
    levels = [np.linalg.eigvals(self_dual(800, generator)) for _ in range(3)]
    verdict = judge(*levels, expected="AII+")
    assert verdict.verdict == "AII+"
    assert verdict.degenerate_levels == 1200
    assert "Kramers" in verdict.sentence


def test_a_class_other_than_the_expected_one_is_pointed_out(
    ginibre_spectra: list[np.ndarray],
) -> None:
    verdict = judge(*ginibre_spectra[:4], expected="AI+")
    assert verdict.verdict == "A"
    assert "although class AI-dagger is expected" in verdict.sentence


@pytest.mark.parametrize("seed", range(4))
def test_independent_levels_are_poisson(seed: int) -> None:
    verdict = judge(independent_levels(600, np.random.default_rng(seed)))
    assert verdict.verdict == "poisson"
    assert "regular or integrable" in verdict.sentence


def test_density_gradients_do_not_fake_repulsion_nor_hide_it(
    ginibre_spectra: list[np.ndarray],
) -> None:
    independent = independent_levels(800, np.random.default_rng(14))
    assert judge(np.exp(1.5 * independent)).verdict == "poisson"
    assert judge(*(np.exp(levels) for levels in ginibre_spectra[:4])).verdict == "A"


def test_two_merged_blocks_are_a_mixture(ginibre_spectra: list[np.ndarray]) -> None:
    merged = [np.concatenate(ginibre_spectra[k : k + 2]) for k in (0, 2)]
    verdict = judge(*merged)
    assert verdict.verdict == "mixture"
    assert verdict.closest is not None and verdict.closest.endswith(" x2")
    assert "unresolved symmetry" in verdict.sentence


def test_a_single_block_is_no_mixture(ginibre_spectra: list[np.ndarray]) -> None:
    posterior = judge(*ginibre_spectra[:4]).posterior
    assert posterior["mixture"] < 1e-6
    assert posterior["poisson"] < 1e-6


def test_a_real_matrix_has_the_bulk_statistics_of_class_a() -> None:
    generator = np.random.default_rng(15)
    levels = [np.linalg.eigvals(real_ginibre(500, generator)) for _ in range(12)]
    statistics = level_statistics([LevelSequence(one, real_matrix=True) for one in levels])
    verdict = judge_levels(statistics)
    assert verdict.verdict == "A"
    values, errors = reference("A").moments[:2].T
    assert verdict.mean_ratio is not None and verdict.mean_cosine is not None
    for interval, value, error in zip(
        (verdict.mean_ratio, verdict.mean_cosine), values, errors, strict=True
    ):
        spread = (interval.high - interval.low) / 3.92
        assert abs(interval.value - value) < 3.0 * np.hypot(spread, error)


def test_rounding_noise_is_not_taken_for_repulsion() -> None:
    levels = independent_levels(500, np.random.default_rng(16))
    verdict = judge_levels(level_statistics([LevelSequence(levels, np.full(500, 0.02))]))
    assert verdict.verdict == "undecided"
    assert verdict.unreliable_levels > 0
    assert "rounding" in verdict.sentence
    assert verdict.levels_used == 0


@pytest.mark.parametrize("count", [3, 40, 90])
def test_few_levels_are_undecided(count: int) -> None:
    verdict = judge(independent_levels(count, np.random.default_rng(17)))
    assert verdict.verdict == "undecided"
    assert str(verdict.levels_used if count == 90 else count) in verdict.sentence


def test_a_lattice_fits_no_reference() -> None:
    side = np.arange(30.0)
    jitter = np.random.default_rng(18).normal(scale=0.05, size=(2, 900))
    levels = (side[:, None] + 1j * side[None, :]).ravel() + jitter[0] + 1j * jitter[1]
    verdict = judge(levels)
    assert verdict.verdict == "undecided"
    assert "no reference describes" in verdict.sentence


def test_levels_that_cluster_are_said_to_cluster() -> None:
    generator = np.random.default_rng(27)
    parents = independent_levels(250, generator)
    steps = generator.normal(scale=0.01, size=(2, 250))
    verdict = judge(np.concatenate([parents, parents + steps[0] + 1j * steps[1]]))
    assert verdict.verdict in ("poisson", "undecided")
    assert "closer together than independent ones" in verdict.sentence


@pytest.mark.parametrize("name", ["1d-poisson", "1d-GOE", "1d-GUE", "1d-GSE"])
def test_lines_are_named(name: str) -> None:
    verdict = judge(*spectra(name, 1, 800, seed=19))
    assert verdict.verdict == name
    assert verdict.mean_cosine is None


def test_two_merged_lines_are_a_mixture() -> None:
    first, second = spectra("1d-GUE", 2, 1500, seed=20)
    assert judge(np.concatenate([first, second])).verdict == "mixture"


def test_sequences_that_disagree_are_not_pooled(ginibre_spectra: list[np.ndarray]) -> None:
    # The average of the descriptors lies between the classes and would look like AI-dagger.
    odd = independent_levels(400, np.random.default_rng(21))
    verdict = judge(*ginibre_spectra, odd)
    assert verdict.verdict == "undecided"
    assert verdict.sequences[-1].verdict == "poisson"
    assert verdict.sequences_agree < 1e-6
    assert verdict.disagreeing == ("sector 6",)
    assert "do not follow one ensemble" in verdict.sentence


def test_expected_classes_are_judged_apart(ginibre_spectra: list[np.ndarray]) -> None:
    symmetric = spectra("AI+", 2, 400, seed=22)
    sequences = [LevelSequence(one, label="a") for one in ginibre_spectra]
    sequences += [LevelSequence(one, label="s", expected_class="AI+") for one in symmetric]
    verdict = judge_levels(level_statistics(sequences))
    assert verdict.verdict == "A"
    assert verdict.expected_class == "A"
    assert "expecting class AI+" in verdict.sentence


def test_many_exact_degeneracies_are_a_sign_of_symmetry() -> None:
    levels = independent_levels(500, np.random.default_rng(23))
    verdict = judge(np.concatenate([levels, levels[:200], levels[:200]]))
    assert verdict.verdict == "poisson"
    assert verdict.degenerate_levels == 400
    assert "non-Abelian" in verdict.sentence


def test_the_same_levels_give_the_same_verdict_in_any_order() -> None:
    levels = independent_levels(400, np.random.default_rng(24))
    shuffled = np.random.default_rng(25).permutation(levels)
    first, second = judge(levels), judge(shuffled)
    assert first.verdict == second.verdict
    for name, value in first.log_likelihood.items():
        assert second.log_likelihood[name] == pytest.approx(value, rel=1e-8)


def test_documents_are_json_with_the_promised_fields() -> None:
    statistics = level_statistics(
        [LevelSequence(independent_levels(300, np.random.default_rng(26)))]
    )
    verdict = judge_levels(statistics)
    document = json.loads(json.dumps(verdict.to_dict()))
    assert {
        "verdict",
        "confidence",
        "levels_used",
        "mean_ratio",
        "mean_cosine",
        "log_likelihood",
        "sentence",
        "expected_class",
        "degenerate_levels",
        "unreliable_levels",
        "bulk_cut",
        "sequences",
    } <= set(document)
    assert set(document["mean_ratio"]) == {"value", "low", "high"}
    assert set(document["log_likelihood"]) == {"poisson", *MIXTURES} | {
        f"{name} x{blocks}" for name in MIXTURES for blocks in (2, 3, 4)
    }
    ratios = json.loads(json.dumps(statistics.to_dict()))["sequences"][0]["ratios"]
    assert len(ratios) == verdict.levels_used == statistics.ratios.size
    assert "levels used" in str(verdict)
    assert "sequence" in str(statistics)
