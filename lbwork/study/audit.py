"""The whole examination of a model in one dossier."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from lbwork import defaults
from lbwork.errors import CapacityError, NotCertifiedError
from lbwork.generator import GeneratorCertificate, Lindbladian
from lbwork.levels import LevelOptions, LevelStatistics, Verdict, judge_levels, level_statistics
from lbwork.model import Model
from lbwork.spectrum import (
    GapResult,
    Spectrum,
    SpectrumOptions,
    full_spectrum,
    spectral_gap,
)
from lbwork.steady import SteadyState, steady_state
from lbwork.store import RunStore
from lbwork.study.kept import start_run
from lbwork.study.sequences import level_sequences
from lbwork.study.spectra import kept_spectrum
from lbwork.symmetry import SectorPlan, plan_sectors

__all__ = ["Audit", "audit"]


@dataclass(frozen=True, eq=False)
class Audit:
    """Everything that was found about a model, with the certificates.

    ``refused`` names parts that could not be certified or did not fit, with the reason; an audit
    with an entry there is not certified.
    """

    model: Model
    plan: SectorPlan
    generator: GeneratorCertificate
    spectrum: Spectrum
    statistics: LevelStatistics
    verdict: Verdict
    gap: GapResult | None
    steady: SteadyState | None
    refused: dict[str, str]
    run_id: str | None

    @property
    def certified(self) -> bool:
        """True when every part was computed and certified."""
        return self.generator.certified and not self.refused

    def conclusion(self) -> str:
        """The finding in words: verdict, gap, steady state, unresolved symmetries."""
        lines = [self.verdict.sentence]
        if self.gap is not None:
            lines.append(
                f"Liouvillian gap {self.gap.gap:.8g} with {self.gap.zero_modes} zero mode(s) over "
                f"{len(self.gap.searched)} sector(s): {self.gap.scope}."
            )
        if self.steady is not None:
            lines.append(
                f"Steady state: residual {self.steady.residual:.1e}, smallest eigenvalue "
                f"{self.steady.min_eigenvalue:.1e}, purity {self.steady.purity:.6g}."
            )
        for item in self.plan.symmetries.unresolved:
            lines.append(f"Unresolved: {item.name}. {item.advice}.")
        for part, reason in self.refused.items():
            lines.append(f"Not certified: {part}: {reason}")
        return "\n".join(lines)

    def levels_document(self) -> dict[str, Any]:
        """Verdict and statistics in one document, with the ratios that the figures need."""
        return {**self.verdict.to_dict(), **self.statistics.to_dict()}

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of all parts; the spectrum by size only (it is kept in the run)."""
        return {
            "model": self.model.name,
            "identity": self.model.identity,
            "certified": self.certified,
            "conclusion": self.conclusion(),
            "generator": self.generator.to_dict(),
            "plan": self.plan.to_dict(),
            "levels": self.verdict.to_dict(),
            "gap": None if self.gap is None else self.gap.to_dict(),
            "steady": None if self.steady is None else self.steady.to_dict(),
            "refused": dict(self.refused),
            "run": self.run_id,
        }

    def __str__(self) -> str:
        return f"audit of {self.model}\n{self.conclusion()}"


def _attempt(part: str, refused: dict[str, str], work: Callable[[], Any]) -> Any:
    """Run one part; a refusal is recorded with its reason instead of ending the audit."""
    try:
        return work()
    except (NotCertifiedError, CapacityError) as error:
        refused[part] = str(error)
        return None


def audit(
    model: Model | SectorPlan,
    *,
    store: RunStore | None = None,
    fresh: bool = False,
    progress: Callable[[float, float, str], None] | None = None,
) -> Audit:
    """Spectrum, level statistics and verdict, gap and steady state of a model, in one run.

    ``model`` may be a plan already made, so that the symmetry search runs once.

    ``progress(done, total, what)`` counts sectors and then parts. With a store the run is kept
    sector by sector and an interrupted audit is taken up again. Raises what the spectrum raises;
    gap and steady state that cannot be certified are recorded in ``refused``.
    """
    plan = plan_sectors(model) if isinstance(model, Model) else model
    model = plan.model
    options = SpectrumOptions()
    total = len(plan.sectors) + 3

    def tell(done: float, what: str) -> None:
        if progress is not None:
            progress(done, total, what)

    if store is None:
        spectrum = full_spectrum(
            plan, options=options, progress=lambda done, _, sector: tell(done, sector.label)
        )
        return _finish(plan, spectrum, tell, None)
    document = {
        "spectrum": options.to_dict(),
        "levels": {"seed": LevelOptions().seed},
        "zero_mode_tolerance": defaults.ZERO_MODE_TOLERANCE,
    }
    sectors = [sector.to_dict() for sector in plan.sectors]
    with start_run(
        store, "audit", model, options=document, plan=sectors, seed=options.seed, fresh=fresh
    ) as writer:
        spectrum = kept_spectrum(
            plan,
            writer,
            options=options,
            progress=lambda done, _, sector: tell(done, sector.label),
        )
        result = _finish(plan, spectrum, tell, writer.run_id)
        writer.write_result("generator", result.generator.to_dict(), {})
        writer.write_result("levels", result.levels_document(), {})
        if result.gap is not None:
            writer.write_result("gap", result.gap.to_dict(), {})
        if result.steady is not None:
            writer.write_result("steady", result.steady.to_dict(), {})
        summary = {"conclusion": result.conclusion(), "refused": dict(result.refused)}
        writer.write_result("audit", {**summary, "certified": result.certified}, {})
        writer.finish("complete" if result.certified else "uncertified")
    return result


def _finish(
    plan: SectorPlan,
    spectrum: Spectrum,
    tell: Callable[[float, str], None],
    run_id: str | None,
) -> Audit:
    refused: dict[str, str] = {}
    count = len(plan.sectors)
    tell(count, "level statistics")
    statistics = level_statistics(level_sequences(spectrum))
    verdict = judge_levels(statistics)
    tell(count + 1, "gap")
    gap = _attempt("gap", refused, lambda: spectral_gap(plan))
    tell(count + 2, "steady state")
    steady = _attempt("steady state", refused, lambda: steady_state(plan))
    tell(count + 3, "done")
    return Audit(
        model=plan.model,
        plan=plan,
        generator=Lindbladian(plan.model).certificate(),
        spectrum=spectrum,
        statistics=statistics,
        verdict=verdict,
        gap=gap,
        steady=steady,
        refused=refused,
        run_id=run_id,
    )
