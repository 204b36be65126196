"""The steady state of a model, or all of them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from lbwork import defaults
from lbwork.errors import CapacityError, NotCertifiedError
from lbwork.generator import Lindbladian
from lbwork.iterative import (
    ClosedChain,
    chain_equations,
    closed_chain,
    component_matrix,
    make_hermitian,
)
from lbwork.model import Model
from lbwork.observables.currents import continuity_error, spin_currents
from lbwork.observables.local import (
    magnetisation_profile,
    spectrum_quantities,
    weight_quantities,
    zz_correlations,
)
from lbwork.provenance import limited_threads
from lbwork.spectrum.options import zero_tolerance
from lbwork.steady.branches import mixed_limit, steady_branches
from lbwork.steady.cost import steady_cost
from lbwork.steady.matrix_free import DegenerateComponent, IterativeStates, iterative_states
from lbwork.steady.records import SteadyBranch, SteadyOptions, SteadyState
from lbwork.steady.space import as_matrix
from lbwork.steady.zero_modes import SectorZeroModes, ZeroModes, zero_modes
from lbwork.symmetry import Sector, SectorPlan, plan_sectors
from lbwork.symmetry.charges import label_text

__all__ = ["Finding", "certified_state", "steady_state"]


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


@dataclass(frozen=True)
class Finding:
    """How a state was found: what the certificate takes over from the solver.

    ``zero_modes``: how many, ``words``: how they were counted, ``separation``: from the next mode.
    ``eigenvalues``: of the density matrix, where the solver has them block by block.
    """

    zero_modes: int
    words: str
    separation: float
    method: str = "factorised"
    splitting: str = ""
    applies: int = 0
    probe_applies: int = 0
    eigenvalues: np.ndarray | None = None


def certified_state(
    generator: Lindbladian,
    density: np.ndarray,
    states: tuple[SteadyBranch, ...],
    found: Finding,
) -> SteadyState:
    """Certificate and observables of a density matrix (D, D) of trace 1, from any solver.

    ``density`` is made Hermitian in place. Raises NotCertifiedError with the :class:`SteadyState`
    as ``partial`` when the state is not steady to
    :data:`lbwork.defaults.STEADY_RESIDUAL_TOLERANCE`, not accurate to
    :data:`lbwork.defaults.STEADY_ACCURACY`, or not positive.
    """
    model = generator.model
    count, dimension = model.sites, model.local_dimension
    size = float(np.linalg.norm(density))
    hermiticity = make_hermitian(density) / size
    image = generator.apply(density)
    residual = float(np.linalg.norm(image)) / size
    del image
    norm = max(generator.norm_bound, np.finfo(float).tiny)
    weights = np.linalg.eigvalsh(density) if found.eigenvalues is None else found.eigenvalues
    smallest, purity, entropy = weight_quantities(weights)
    currents = spin_currents(model, density)
    separation = found.separation
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
        zero_modes=found.zero_modes,
        zero_mode_method=found.words,
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
        method=found.method,
        splitting=found.splitting,
        applies=found.applies,
        probe_applies=found.probe_applies,
    )
    if failures:
        raise NotCertifiedError(f"steady state of {model.name}: {'; '.join(failures)}", state)
    return state


def steady_state(
    model: Model | SectorPlan,
    *,
    options: SteadyOptions | None = None,
    progress: Callable[[int, int, Sector], None] | None = None,
    tell: Callable[[str], None] | None = None,
) -> SteadyState:
    """The steady state of a model; all steady states where there are several.

    Zero modes are counted in every sector that can have one. With several, ``density`` is the
    long-time limit of the maximally mixed state and ``states`` holds legal states with orthogonal
    supports. Short chains are solved sector by sector (``progress(done, total, sector)`` before
    each), long ones matrix-free (``tell(words)`` after each application). Raises CapacityError for
    chains that do not fit, NotCertifiedError when the certificate fails.
    """
    options = options or SteadyOptions()
    plan = None if isinstance(model, Model) else model
    chain = model if isinstance(model, Model) else model.model
    entries = chain.local_dimension ** (2 * chain.sites)
    small = entries <= defaults.STEADY_SECTOR_SPACE
    if options.method == "matrix-free" or (
        options.method == "auto" and not small and not options.search_all
    ):
        report = None if plan is None else plan.symmetries
        steady_cost(chain, report).require_fit(chain.sites)
        try:
            return _matrix_free_state(chain, plan, options, tell)
        except DegenerateComponent as error:
            if entries > defaults.STEADY_DEGENERATE_SPACE:
                raise NotCertifiedError(
                    f"{chain.name} has several steady states that no conserved charge tells "
                    f"apart ({error}); use at most d**(2L) = {defaults.STEADY_DEGENERATE_SPACE}"
                ) from None
    plan = plan_sectors(chain) if plan is None else plan
    return _sector_state(plan, options, progress)


def _matrix_free_state(
    model: Model,
    plan: SectorPlan | None,
    options: SteadyOptions,
    tell: Callable[[str], None] | None,
) -> SteadyState:
    """Steady states from preconditioned Krylov iteration."""
    generator = Lindbladian(model)
    with limited_threads(1):
        equations = chain_equations(model, None if plan is None else plan.symmetries)
        closed = closed_chain(equations, zero_tolerance(model))
        if closed is not None:
            return _closed_state(generator, closed)
        found = iterative_states(
            equations,
            splitting=None if options.splitting == "auto" else options.splitting,
            zero=zero_tolerance(model),
            tell=tell or (lambda words: None),
        )
        eigenvalues, branches = [], []
        size = generator.dimension
        several = len(found.components) > 1
        density = np.zeros((size, size), dtype=complex)
        names = _component_names(found)
        for name, part in zip(names, found.components, strict=True):
            weight = sum(rows for rows, _ in part.space.shapes) / size
            eigenvalues.append(weight * part.eigenvalues)
            if several:
                alone = component_matrix(found.equations, part.space, part.vector)
                density += weight * alone
                residual = float(np.linalg.norm(generator.apply(alone)) / np.linalg.norm(alone))
                branches.append(SteadyBranch(name, alone, residual, weight))
            else:
                density = component_matrix(found.equations, part.space, part.vector)
        summary = Finding(
            len(found.components) + found.coherences,
            found.method,
            found.separation,
            "matrix-free",
            found.splitting,
            found.applies,
            found.probe_applies,
            np.concatenate(eigenvalues),
        )
        # Solver and vectors make room for the certificate.
        del found
        return certified_state(generator, density, tuple(branches), summary)


def _closed_state(generator: Lindbladian, closed: ClosedChain) -> SteadyState:
    """The maximally mixed state of a chain without dissipation, among its many steady states."""
    size = generator.dimension
    density = np.eye(size, dtype=complex) / size
    summary = Finding(
        closed.zero_modes,
        "no dissipation: squares of the multiplicities of the energies",
        closed.smallest,
        "matrix-free",
        eigenvalues=np.full(size, 1 / size),
    )
    branch = SteadyBranch("maximally mixed; every function of H is steady", density, 0.0, 1.0)
    return certified_state(generator, density, (branch,), summary)


def _component_names(found: IterativeStates) -> list[str]:
    """Strong charges of each component in words, numbered where they do not tell them apart."""
    groups = found.equations.groups
    strong = [index for index, flag in enumerate(groups.strong) if flag]
    charges = [groups.charges[index] for index in strong]
    names = []
    for number, part in enumerate(found.components, start=1):
        labels = {tuple(groups.labels[ket][strong].tolist()) for ket, _ in part.space.pairs}
        text = label_text(charges, labels.pop()) if charges and len(labels) == 1 else ""
        names.append(text or f"state {number}")
    return [
        name if names.count(name) == 1 else f"state {number} {name}"
        for number, name in enumerate(names, start=1)
    ]


def _sector_state(
    plan: SectorPlan,
    options: SteadyOptions,
    progress: Callable[[int, int, Sector], None] | None,
) -> SteadyState:
    """Steady states from the null vectors of the sector blocks."""
    if plan.total_dimension > defaults.STEADY_SPACE_DIMENSION:
        raise CapacityError(
            f"a density matrix of {plan.model.sites} sites has {plan.total_dimension} entries, "
            f"limit {defaults.STEADY_SPACE_DIMENSION}; use fewer sites"
        )
    generator = Lindbladian(plan.model)
    filtered = {"factorised": False, "filtered": True}.get(options.method)
    found: ZeroModes = zero_modes(
        plan,
        filtered=filtered,
        full_rank=None if options.search_all else lambda item: _has_full_rank(plan, item),
        progress=progress,
    )
    method = "filtered" if "Krylov" in found.method else "factorised"
    summary = Finding(found.count, found.method, found.separation, method)
    if found.count == 1:
        density = _unique_density(plan, found.with_modes[0])
        return certified_state(generator, density, (), summary)
    limit, conserved = mixed_limit(plan, found)
    branches = steady_branches(plan, generator, limit, conserved)
    return certified_state(generator, limit / np.trace(limit), branches, summary)
