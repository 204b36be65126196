"""Means with bootstrap intervals that know about the correlations of near levels."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from lbwork import defaults

__all__ = ["Interval", "mean_with_interval"]


@dataclass(frozen=True)
class Interval:
    """A mean and its 95 % interval."""

    value: float
    low: float
    high: float

    def to_dict(self) -> dict[str, float]:
        """{"value", "low", "high"}."""
        return {"value": self.value, "low": self.low, "high": self.high}

    def __str__(self) -> str:
        return f"{self.value:.4f} [{self.low:.4f}, {self.high:.4f}]"


def mean_with_interval(parts: tuple[npt.NDArray[np.float64], ...], seed: int) -> Interval:
    """Mean over all values of `parts` with the 2.5 and 97.5 % points of a block bootstrap.

    Each part holds the values of one sequence in spatial order; blocks of
    :data:`lbwork.defaults.LEVEL_BOOTSTRAP_BLOCK` consecutive values are redrawn together, because
    near levels share neighbours. Source: H. R. Kuensch, Ann. Statist. 17, 1217 (1989); from memory.
    """
    size = defaults.LEVEL_BOOTSTRAP_BLOCK
    blocks = [block for part in parts for block in np.array_split(part, max(1, part.size // size))]
    sums = np.array([np.sum(block) for block in blocks])
    counts = np.array([block.size for block in blocks])
    generator = np.random.default_rng(seed)
    draws = generator.multinomial(
        len(blocks), np.full(len(blocks), 1.0 / len(blocks)), size=defaults.LEVEL_BOOTSTRAP_SAMPLES
    )
    means = (draws @ sums) / (draws @ counts)
    low, high = np.quantile(means, [0.025, 0.975])
    return Interval(float(np.sum(sums) / np.sum(counts)), float(low), float(high))
