"""The gap over a range of lengths with the same search at each of them."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any

from lbwork.model import Model
from lbwork.spectrum import (
    GapOptions,
    GapResult,
    GapScaling,
    gap_method,
    gap_scaling,
    spectral_gap,
)

__all__ = ["GapRange", "gap_range"]


@dataclass(frozen=True, eq=False)
class GapRange:
    """Gaps at several lengths and the power law through them."""

    scaling: GapScaling
    results: tuple[GapResult, ...]

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of the fit and of every result."""
        sizes = [result.model.sites for result in self.results]
        return {
            **self.scaling.to_dict(),
            "sizes": sizes,
            "results": [
                {"sites": size, **result.to_dict()}
                for size, result in zip(sizes, self.results, strict=True)
            ],
        }

    def __str__(self) -> str:
        lines = [str(self.scaling)]
        lines += sorted({f"  searched: {result.scope}" for result in self.results})
        return "\n".join(lines)


def gap_range(
    model: Model,
    sizes: Sequence[int],
    *,
    options: GapOptions | None = None,
    progress: Callable[[int, str], None] = lambda done, words: None,
) -> GapRange:
    """Gaps of a model at two or more lengths.

    A fit must compare like with like: when the longest chain is searched in the sectors of equal
    ket and bra charge only, all are.
    """
    options = options or GapOptions()
    models = [model.replace(sites=size) for size in sizes]
    if options.populations_only is None and any(
        gap_method(one, options) == "nearest" for one in models
    ):
        options = replace(options, populations_only=True)
    results = []
    for done, one in enumerate(models):
        progress(done, f"{one.sites} sites")

        def tell(words: str, done: int = done, sites: int = one.sites) -> None:
            progress(done, f"{sites} sites, {words}")

        results.append(spectral_gap(one, options=options, tell=tell))
    return GapRange(gap_scaling(sizes, [result.gap for result in results]), tuple(results))
