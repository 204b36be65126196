"""From statistics to a verdict with its confidence, in numbers and in words."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from lbwork import defaults
from lbwork.errors import UsageError
from lbwork.levels.decision import (
    UNDECIDED,
    Agreement,
    SequenceVerdict,
    agreement,
    decide,
    fits,
    single,
)
from lbwork.levels.intervals import Interval, mean_with_interval
from lbwork.levels.likelihood import Evidence, evidence
from lbwork.levels.records import LevelOptions, LevelStatistics, SequenceStatistics
from lbwork.levels.wording import finding, reason_undecided

__all__ = ["Verdict", "judge_levels"]

_DEGENERATE_SHARE = 0.2
_INDEPENDENT_RATIO = {"poisson": 2.0 / 3.0, "1d-poisson": 2.0 * np.log(2.0) - 1.0}


@dataclass(frozen=True)
class Verdict:
    """What the level statistics of a run say.

    verdict: poisson, A, AI+, AII+, 1d-poisson, 1d-GOE, 1d-GUE, 1d-GSE, mixture or undecided.
    confidence: posterior probability of the most probable family, 0 if there were no levels; for
    the priors see :class:`lbwork.levels.likelihood.Evidence`. mean_ratio: of |z|, on a line of
    min(r, 1/r). mean_cosine: of cos arg z, None on a line. log_likelihood: per reference.
    posterior: per family. closest: reference of highest likelihood in the most probable family.
    fit: goodness-of-fit probability of the closest reference. sequences_agree: probability of the
    scatter between sequences, if they follow one ensemble. disagreeing: labels of sequences whose
    own, sure verdict is another than that of most levels.
    """

    verdict: str
    confidence: float
    levels_used: int
    mean_ratio: Interval | None
    mean_cosine: Interval | None
    log_likelihood: dict[str, float]
    posterior: dict[str, float]
    closest: str | None
    fit: float
    sequences_agree: float
    disagreeing: tuple[str, ...]
    expected_class: str
    degenerate_levels: int
    unreliable_levels: int
    bulk_cut: str
    sentence: str
    sequences: tuple[SequenceVerdict, ...]

    def to_dict(self) -> dict[str, Any]:
        """JSON-able document; intervals as {value, low, high} or None."""
        document = dict(vars(self))
        for name in ("mean_ratio", "mean_cosine"):
            interval: Interval | None = document[name]
            document[name] = None if interval is None else interval.to_dict()
        document["disagreeing"] = list(self.disagreeing)
        document["sequences"] = [one.to_dict() for one in self.sequences]
        return document

    def __str__(self) -> str:
        lines = [
            f"verdict      {self.verdict} (confidence {self.confidence:.3f})",
            f"levels used  {self.levels_used}",
        ]
        if self.mean_ratio is not None:
            lines.append(f"<r>          {self.mean_ratio}")
        if self.mean_cosine is not None:
            lines.append(f"<cos theta>  {self.mean_cosine}")
        return "\n".join([*lines, self.sentence])


def judge_levels(statistics: LevelStatistics) -> Verdict:
    """Verdict on all used sequences together and on each alone.

    Sequences are pooled when they share geometry and expected class; the verdict is that of the
    pool with most levels, others are named in the sentence. Pooling N-weighted averages equals
    adding the log-likelihoods of the sequences, up to terms that measure their scatter; when the
    scatter is no accident and sure verdicts on single sequences differ, there is no verdict.
    """
    options = statistics.options
    singles = tuple(single(one, options) for one in statistics.sequences)
    pools: dict[tuple[str, str], list[SequenceStatistics]] = {}
    for one in statistics.used:
        pools.setdefault((one.geometry, one.expected_class), []).append(one)
    ranked = sorted(pools.values(), key=lambda pool: -sum(one.levels_used for one in pool))
    if not ranked:
        return _nothing(statistics, singles)
    main = tuple(ranked[0])
    weighed = evidence(main)
    levels = sum(one.levels_used for one in main)
    verdict, confidence = decide(weighed, levels, options)
    agreed = agreement(main, weighed, options)
    if agreed.conflict:
        verdict = UNDECIDED
    expected = main[0].expected_class
    mean_ratio = mean_with_interval(tuple(np.abs(one.ratios) for one in main), options.seed)
    sentences = [_headline(verdict, weighed, agreed, levels, expected, options)]
    sentences += [_other_pool(tuple(pool), options) for pool in ranked[1:]]
    if weighed.ratios_only:
        sentences.append(
            "Judged by the spacing ratios alone: the sequences are too short, or their density too "
            "uneven, to unfold spacings."
        )
    if weighed.fit < defaults.LEVEL_FIT_MINIMUM and not agreed.conflict:
        sentences.append(_misfit(weighed, mean_ratio, verdict))
    sentences += _remarks(statistics, agreed.disagreeing)
    return Verdict(
        verdict=verdict,
        confidence=confidence,
        levels_used=levels,
        mean_ratio=mean_ratio,
        mean_cosine=_mean_cosine(main, options.seed),
        log_likelihood=weighed.log_likelihood,
        posterior=weighed.posterior,
        closest=weighed.closest,
        fit=weighed.fit,
        sequences_agree=agreed.probability,
        disagreeing=agreed.disagreeing,
        expected_class=expected,
        degenerate_levels=sum(one.degenerate_levels for one in statistics.sequences),
        unreliable_levels=sum(one.unreliable_levels for one in statistics.sequences),
        bulk_cut=_bulk_cut(main, options),
        sentence=" ".join(sentences),
        sequences=singles,
    )


def _headline(
    verdict: str,
    weighed: Evidence,
    agreed: Agreement,
    levels: int,
    expected: str,
    options: LevelOptions,
) -> str:
    if verdict != UNDECIDED:
        text = finding(verdict, weighed.closest, expected)
        return f"{text[0].upper()}{text[1:]} ({levels} reference levels)."
    if agreed.conflict:
        tally = ", ".join(f"{name} {count} levels" for name, count in agreed.levels.items())
        return f"Undecided: the sequences do not follow one ensemble ({tally}); judge them apart."
    order = sorted(weighed.posterior, key=lambda family: -weighed.posterior[family])
    text = reason_undecided(
        levels,
        options.verdict_minimum,
        (order[0], order[1]),
        weighed.posterior[order[0]],
        fits(weighed),
    )
    return f"{text[0].upper()}{text[1:]}."


def _other_pool(pool: tuple[SequenceStatistics, ...], options: LevelOptions) -> str:
    levels = sum(one.levels_used for one in pool)
    verdict, _ = decide(evidence(pool), levels, options)
    where = (
        "on a line" if pool[0].geometry == "line" else f"expecting class {pool[0].expected_class}"
    )
    return f"Sequences {where} ({levels} levels), judged apart: {verdict}."


def _misfit(weighed: Evidence, mean_ratio: Interval, verdict: str) -> str:
    """What to think of a closest reference that does not describe the levels in detail."""
    kind = "1d-poisson" if weighed.closest.startswith("1d") else "poisson"
    if mean_ratio.high < _INDEPENDENT_RATIO[kind]:
        return (
            "The levels lie even closer together than independent ones, as those of free or nearly "
            "degenerate generators do: no sign of repulsion."
        )
    if verdict == UNDECIDED:
        return f"The fit of {weighed.closest} has probability {weighed.fit:.1e}."
    return (
        f"The levels deviate from {weighed.closest} in detail (probability {weighed.fit:.1e}) but "
        "are far closer to it than to any other ensemble."
    )


def _remarks(statistics: LevelStatistics, disagreeing: tuple[str, ...]) -> list[str]:
    """Caveats: disagreement, degeneracies, refused sequences, finite size."""
    remarks = []
    if disagreeing:
        remarks.append(f"Sequences that disagree on their own: {', '.join(disagreeing)}.")
    given = sum(one.levels for one in statistics.sequences)
    if all(one.doubled for one in statistics.used):
        remarks.append(
            "Every level is twofold degenerate: Kramers pairs of class AII-dagger, or two sectors "
            "with one spectrum."
        )
    elif sum(one.degenerate_share * one.levels for one in statistics.used) > (
        _DEGENERATE_SHARE * given
    ):
        remarks.append(
            "A large share of the levels is exactly degenerate: a sign of a non-Abelian symmetry "
            "or of one not resolved."
        )
    refused = [one for one in statistics.sequences if one.refused is not None]
    if refused:
        remarks.append(f"{len(refused)} of {len(statistics.sequences)} sequences were left out.")
    remarks.append("Finite-size statistics: compare another chain length before concluding.")
    return remarks


def _mean_cosine(pool: tuple[SequenceStatistics, ...], seed: int) -> Interval | None:
    if pool[0].geometry == "line":
        return None
    cosines: tuple[npt.NDArray[np.float64], ...] = tuple(
        np.cos(np.angle(one.ratios)) for one in pool
    )
    return mean_with_interval(cosines, seed)


def _bulk_cut(pool: tuple[SequenceStatistics, ...], options: LevelOptions) -> str:
    dropped = sum(one.edge_levels for one in pool)
    if pool[0].geometry == "line":
        return f"{dropped} levels: {options.line_cut:.0%} at each end"
    return (
        f"{dropped} levels: centroid of the {defaults.LEVEL_EDGE_NEIGHBOURS} nearest farther than "
        f"{options.edge_offset:g} of their reach, or within {options.real_band:g} mean spacings of "
        "the real axis of a real matrix"
    )


def _nothing(statistics: LevelStatistics, singles: tuple[SequenceVerdict, ...]) -> Verdict:
    reasons = "; ".join(
        sorted({one.refused for one in statistics.sequences if one.refused is not None})
    )
    classes = {one.expected_class for one in statistics.sequences}
    if not classes:
        raise UsageError("no level sequence to judge; pass at least one")
    return Verdict(
        verdict=UNDECIDED,
        confidence=0.0,
        levels_used=0,
        mean_ratio=None,
        mean_cosine=None,
        log_likelihood={},
        posterior={},
        closest=None,
        fit=0.0,
        sequences_agree=1.0,
        disagreeing=(),
        expected_class=statistics.sequences[0].expected_class,
        degenerate_levels=sum(one.degenerate_levels for one in statistics.sequences),
        unreliable_levels=sum(one.unreliable_levels for one in statistics.sequences),
        bulk_cut="no sequence was used",
        sentence=f"Undecided: no sequence could be used ({reasons}).",
        sequences=singles,
    )
