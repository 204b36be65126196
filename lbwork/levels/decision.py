"""When evidence is good enough for a verdict, on one sequence and on several that should agree."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from lbwork import defaults
from lbwork.levels.likelihood import Evidence, evidence, scatter_probability
from lbwork.levels.records import LevelOptions, SequenceStatistics

__all__ = ["UNDECIDED", "Agreement", "SequenceVerdict", "agreement", "decide", "fits", "single"]

UNDECIDED = "undecided"


@dataclass(frozen=True)
class SequenceVerdict:
    """Verdict on one sequence alone; `refused` says why it was left out, None if it was used."""

    label: str
    expected_class: str
    verdict: str
    confidence: float
    levels_used: int
    mean_ratio: float | None
    refused: str | None

    def to_dict(self) -> dict[str, Any]:
        """JSON-able fields."""
        return dict(vars(self))

    @property
    def sure(self) -> bool:
        """Whether the verdict can be held against that of other sequences."""
        return self.verdict != UNDECIDED and self.confidence >= defaults.LEVEL_SURE_CONFIDENCE


@dataclass(frozen=True)
class Agreement:
    """Whether pooled sequences follow one ensemble.

    probability: of their scatter, if they do. levels: reference levels behind each sure verdict.
    conflict: a fair share of the levels has another sure verdict and the scatter is no accident, so
    that pooling them is void; a smaller share is named but does not stop the verdict.
    disagreeing: labels of the sequences whose sure verdict is another than most levels have.
    """

    probability: float
    levels: dict[str, int]
    conflict: bool
    disagreeing: tuple[str, ...]


def fits(weighed: Evidence) -> bool:
    """Whether the closest reference describes the levels, exactly or far better than others."""
    return (
        weighed.fit >= defaults.LEVEL_FIT_MINIMUM
        or weighed.contrast <= defaults.LEVEL_DISTANCE_RATIO
    )


def decide(weighed: Evidence, levels: int, options: LevelOptions) -> tuple[str, float]:
    """(verdict, probability of the most probable family)."""
    confidence = weighed.posterior[weighed.family]
    decided = (
        levels >= options.verdict_minimum
        and fits(weighed)
        and confidence >= options.confidence_minimum
    )
    return (weighed.family if decided else UNDECIDED), confidence


def single(one: SequenceStatistics, options: LevelOptions) -> SequenceVerdict:
    """Verdict on one sequence alone."""
    verdict, confidence, mean = UNDECIDED, 0.0, None
    if one.refused is None:
        verdict, confidence = decide(evidence((one,)), one.levels_used, options)
        mean = float(np.mean(np.abs(one.ratios)))
    return SequenceVerdict(
        label=one.label,
        expected_class=one.expected_class,
        verdict=verdict,
        confidence=confidence,
        levels_used=one.levels_used,
        mean_ratio=mean,
        refused=one.refused,
    )


def agreement(
    pool: tuple[SequenceStatistics, ...], weighed: Evidence, options: LevelOptions
) -> Agreement:
    """Hold the sequences of a pool against each other; `weighed` is the evidence of the pool."""
    probability = scatter_probability(pool, weighed.closest, weighed.ratios_only)
    sure = [verdict for verdict in (single(one, options) for one in pool) if verdict.sure]
    levels: dict[str, int] = {}
    for verdict in sure:
        levels[verdict.verdict] = levels.get(verdict.verdict, 0) + verdict.levels_used
    leading = max(levels, key=lambda name: levels[name]) if levels else UNDECIDED
    minority = 1 - levels.get(leading, 0) / max(sum(levels.values()), 1)
    return Agreement(
        probability=probability,
        levels=levels,
        conflict=minority > defaults.LEVEL_CONFLICT_SHARE
        and probability < defaults.LEVEL_SCATTER_MINIMUM,
        disagreeing=tuple(one.label for one in sure if one.verdict != leading),
    )
