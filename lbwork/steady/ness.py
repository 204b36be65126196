"""The steady state of a model, or all of them."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from lbwork import defaults
from lbwork.errors import CapacityError, NotCertifiedError
from lbwork.generator import Lindbladian
from lbwork.model import Model
from lbwork.observables.currents import continuity_error, spin_currents
from lbwork.observables.local import (
    magnetisation_profile,
    spectrum_quantities,
    zz_correlations,
)
from lbwork.steady.branches import mixed_limit, steady_branches
from lbwork.steady.records import SteadyBranch, SteadyOptions, SteadyState
from lbwork.steady.space import as_matrix
from lbwork.steady.zero_modes import SectorZeroModes, ZeroModes, zero_modes
from lbwork.symmetry import Sector, SectorPlan, plan_sectors

__all__ = ["certified_state", "steady_state"]


def _unique_density(plan: SectorPlan, found: SectorZeroModes) -> np.ndarray:
    """The zero mode as a matrix of trace 1, not yet made Hermitian."""
    density = as_matrix(plan.model, found.block.isometry @ found.kernel.right[:, 0])
    trace = complex(np.trace(density))
    if abs(trace) < 1e-12 * np.linalg.norm(density):
        raise NotCertifiedError(
            f"the only zero mode of {plan.model.name} has no trace (sector "
            f"'{found.sector.label}'); the generator does not preserve the trace"
        )
    return density / trace


def _has_full_rank(plan: SectorPlan, found: SectorZeroModes) -> bool:
    density = _unique_density(plan, found)
    smallest = spectrum_quantities((density + density.conj().T) / 2)[0]
    return smallest > defaults.STEADY_POSITIVE


def certified_state(
    generator: Lindbladian,
    density: np.ndarray,
    states: tuple[SteadyBranch, ...],
    found: tuple[int, str, float],
) -> SteadyState:
    """Certificate and observables of a density matrix (D, D) of trace 1, from any solver.

    ``found``: number of zero modes, how they were counted, separation from the next mode. Raises
    NotCertifiedError with the :class:`SteadyState` as ``partial`` when the state is not steady to
    :data:`lbwork.defaults.STEADY_RESIDUAL_TOLERANCE`, not accurate to
    :data:`lbwork.defaults.STEADY_ACCURACY`, or not positive.
    """
    model = generator.model
    count, dimension = model.sites, model.local_dimension
    size = float(np.linalg.norm(density))
    hermiticity = float(np.linalg.norm(density - density.conj().T)) / size
    density = (density + density.conj().T) / 2
    residual = float(np.linalg.norm(generator.apply(density))) / size
    norm = max(generator.norm_bound, np.finfo(float).tiny)
    smallest, purity, entropy = spectrum_quantities(density)
    currents = spin_currents(model, density)
    zero_count, method, separation = found
    failures = []
    if residual > defaults.STEADY_RESIDUAL_TOLERANCE * norm:
        failures.append(f"residual {residual:.1e}")
    if residual > defaults.STEADY_ACCURACY * separation:
        failures.append(f"residual {residual:.1e} against a next mode at {separation:.1e}")
    if smallest < -defaults.STEADY_NEGATIVITY:
        failures.append(f"smallest eigenvalue {smallest:.1e}")
    state = SteadyState(
        model=model,
        density=density,
        states=states or (SteadyBranch("unique", density, residual, 1.0),),
        zero_modes=zero_count,
        zero_mode_method=method,
        separation=separation,
        nearly_degenerate=bool(separation < defaults.STEADY_NEAR_DEGENERATE * norm),
        magnetisation=magnetisation_profile(density, count, dimension),
        spin_current=currents.current,
        current_reason=currents.reason,
        correlations=zz_correlations(density, count, dimension),
        trace=float(np.trace(density).real),
        hermiticity_error=hermiticity,
        min_eigenvalue=smallest,
        residual=residual,
        purity=purity,
        entropy=entropy,
        continuity_error=(
            None if currents.current is None else continuity_error(generator, density, currents)
        ),
        certified=not failures,
    )
    if failures:
        raise NotCertifiedError(f"steady state of {model.name}: {'; '.join(failures)}", state)
    return state


def steady_state(
    model: Model | SectorPlan,
    *,
    options: SteadyOptions | None = None,
    progress: Callable[[int, int, Sector], None] | None = None,
) -> SteadyState:
    """The steady state of a model; all steady states where there are several.

    Zero modes are counted in every sector that can have one. With several, ``density`` is the
    long-time limit of the maximally mixed state and ``states`` holds legal states with orthogonal
    supports. ``progress(done, total, sector)`` is called before each sector. Raises CapacityError
    for chains that do not fit, NotCertifiedError when the certificate fails.
    """
    options = options or SteadyOptions()
    plan = plan_sectors(model) if isinstance(model, Model) else model
    if plan.total_dimension > defaults.STEADY_SPACE_DIMENSION:
        raise CapacityError(
            f"a density matrix of {plan.model.sites} sites has {plan.total_dimension} entries, "
            f"limit {defaults.STEADY_SPACE_DIMENSION}; use fewer sites"
        )
    generator = Lindbladian(plan.model)
    found: ZeroModes = zero_modes(
        plan,
        filtered={"auto": None, "factorised": False, "filtered": True}[options.method],
        full_rank=None if options.search_all else lambda item: _has_full_rank(plan, item),
        progress=progress,
    )
    summary = (found.count, found.method, found.separation)
    if found.count == 1:
        density = _unique_density(plan, found.with_modes[0])
        return certified_state(generator, density, (), summary)
    limit, conserved = mixed_limit(plan, found)
    branches = steady_branches(plan, generator, limit, conserved)
    return certified_state(generator, limit / np.trace(limit), branches, summary)
