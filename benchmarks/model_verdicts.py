"""Verdicts on published models at the sizes that documentation quotes.

    python benchmarks/model_verdicts.py [--large]

Prints size, verdict, mean ratio and cosine, time; exit status 1 when one is not as expected.
``merged`` is a deliberately unresolved symmetry: two sectors of a chaotic ring judged as one.
"""

from __future__ import annotations

import argparse
import sys
import time

import numpy as np

from lbwork import full_spectrum, judge_levels, level_statistics, load_model, plan_sectors
from lbwork.levels import LevelSequence, Verdict
from lbwork.spectrum import sector_spectrum
from lbwork.study import level_sequences

CHAOTIC = ("A", "AI+", "AII+")
SMALL = (
    ("xx-dephasing", 7, ("poisson", "undecided")),
    ("xxz-nnn-driven", 6, ("A",)),
    ("random-two-site", 5, ("A",)),
    ("random-two-site", 6, ("A",)),
    ("xyz-driven", 6, ("poisson", "undecided")),
)
LARGE = (
    ("xx-dephasing", 8, ("poisson", "undecided")),
    ("xxz-nnn-driven", 7, ("A",)),
)


def shown(name: str, sites: int, verdict: Verdict, wanted: tuple[str, ...], seconds: float) -> bool:
    """Print one line; True when the verdict is one of those expected."""
    good = verdict.verdict in wanted
    print(
        f"{name:<18} L={sites}  {verdict.verdict:<10} {verdict.levels_used:5d} levels  <r> "
        f"{verdict.mean_ratio}  <cos> {verdict.mean_cosine}  {seconds:5.1f} s"
        f"{'' if good else '   EXPECTED ' + ' or '.join(wanted)}",
        flush=True,
    )
    return good


def merged_verdict() -> Verdict:
    """Momentum 1 and 2 of the random ring taken as if they were one sector."""
    plan = plan_sectors(load_model("random-two-site", sites=6))
    chosen = [sector for sector in plan.sectors if not sector.self_conjugate][:2]
    levels = np.concatenate([sector_spectrum(plan, sector).eigenvalues for sector in chosen])
    return judge_levels(level_statistics([LevelSequence(levels, label="two momenta as one")]))


def main() -> int:
    """Run all cases."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--large", action="store_true", help="add the sizes that take minutes")
    options = parser.parse_args()
    good = True
    for name, sites, wanted in SMALL + (LARGE if options.large else ()):
        started = time.perf_counter()
        spectrum = full_spectrum(load_model(name, sites=sites))
        verdict = judge_levels(level_statistics(level_sequences(spectrum)))
        good &= shown(name, sites, verdict, wanted, time.perf_counter() - started)
        for item in spectrum.plan.symmetries.unresolved:
            print(f"{'':<18} unresolved: {item.name}")
    started = time.perf_counter()
    verdict = merged_verdict()
    good &= shown("merged", 6, verdict, ("mixture",), time.perf_counter() - started)
    return 0 if good else 1


if __name__ == "__main__":
    sys.exit(main())
