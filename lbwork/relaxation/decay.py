"""The asymptotic decay rate, read off the approach to the steady state.

The distance ``delta = rho - rho_steady`` moves linearly, so it is carried on and rescaled window by
window until one decaying mode, or one oscillating pair, is left: three equidistant snapshots fulfil
``delta_2 = a delta_1 + b delta_0`` and the roots of ``z^2 = a z + b`` are ``exp(lambda w)`` for
windows of length w (G. R. B. de Prony (1795); from memory).
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from lbwork import defaults
from lbwork.errors import NotCertifiedError
from lbwork.generator import Lindbladian
from lbwork.model import Model
from lbwork.observables import checked_density
from lbwork.provenance import limited_threads
from lbwork.relaxation.evolution import state_space
from lbwork.relaxation.krylov import Propagator
from lbwork.relaxation.records import DecayRate
from lbwork.steady import steady_state

__all__ = ["asymptotic_rate"]


def _level(snapshots: list[np.ndarray], window: float) -> tuple[complex, float]:
    """The slowest level in three snapshots, and the share of the last that is not described."""
    first, second, third = snapshots
    single = float(np.vdot(second, third).real / np.vdot(second, second).real)
    misfit = float(np.linalg.norm(third - single * second) / np.linalg.norm(third))
    if misfit < 1e-7 and single > 0:
        return complex(np.log(single) / window), misfit
    table = np.stack([second, first], axis=1)
    fit, *_ = np.linalg.lstsq(table, third, rcond=1e-12)
    misfit = float(np.linalg.norm(third - table @ fit) / np.linalg.norm(third))
    roots = np.roots([1.0, -fit[0], -fit[1]]).astype(complex)
    roots = roots[np.abs(roots) > 1e-12]
    levels = np.log(roots) / window
    return complex(levels[int(np.argmax(levels.real))]), misfit


def asymptotic_rate(
    model: Model,
    state: np.ndarray | None = None,
    *,
    tolerance: float = 1e-8,
    longest: float = 1e5,
    tell: Callable[[str], None] = lambda words: None,
) -> DecayRate:
    """Rate at which a state reaches the steady one at late times.

    ``state``: density matrix (D, D); by default a random one of full rank, which every mode is in.
    A state of higher symmetry reaches the gap of its own sectors only. ``tolerance``: relative
    change of the level over a window that ends the wait. Raises NotCertifiedError when there is no
    unique steady state or the rate does not settle before time ``longest``.
    """
    generator = Lindbladian(model)
    size = generator.dimension
    if state is None:
        random = np.random.default_rng(1)
        matrix = random.normal(size=(size, size)) + 1j * random.normal(size=(size, size))
        state = matrix @ matrix.conj().T
        state = state / np.trace(state)
    density = checked_density(state, size, "the initial state")
    final = steady_state(model)
    if final.zero_modes > 1:
        raise NotCertifiedError(
            f"{model.name} has {final.zero_modes} steady modes; which one is approached depends on "
            "the start"
        )
    with limited_threads(1):
        space = state_space(generator, density)
        carrier = Propagator(
            space.apply,
            generator.norm_bound,
            space.size,
            space.dtype,
            defaults.RELAXATION_TOLERANCE,
        )
        known = space.vector(final.density)
        current = space.vector(density) - known
        if np.linalg.norm(current) < 1e-9 * np.linalg.norm(known):
            raise NotCertifiedError("the initial state is the steady state; nothing decays")
        window = 4.0 / max(generator.norm_bound, 1e-300)
        snapshots, waited, before = [current], 0.0, None
        while waited < longest:
            current = carrier.forward(snapshots[-1], window)
            waited += window
            # Rounding and the error of the steady state must not grow back with the rescaling.
            trace = np.trace(space.matrix(current)).real
            snapshots = [*snapshots[-2:], current - trace * known]
            if len(snapshots) == 3:
                level, misfit = _level(snapshots, window)
                tell(f"time {waited:.4g}, level {level:.8g}, misfit {misfit:.1e}")
                settled = before is not None and abs(level - before) <= tolerance * abs(level)
                if settled and misfit < 1e-6:
                    return DecayRate(
                        -level.real, abs(level.imag), abs(level - (before or 0)), misfit, waited
                    )
                before = level
                scale = float(np.linalg.norm(snapshots[-1]))
                if scale == 0:
                    raise NotCertifiedError("the steady state is reached exactly in finite time")
                snapshots = [item / scale for item in snapshots]
                # A window must be long enough for decay to show, short enough for one turn.
                rate = max(abs(level.real), 1e-12)
                turn = np.pi / (4 * abs(level.imag)) if abs(level.imag) > 1e-12 else np.inf
                wanted = min(0.5 / rate, turn)
                if not 0.4 * window < wanted < 2.5 * window:
                    window = min(wanted, 2 * window)
                    snapshots, before = snapshots[-1:], None
    raise NotCertifiedError(
        f"the decay rate of {model.name} did not settle before time {longest:g}: the slowest modes "
        "are too close together"
    )
