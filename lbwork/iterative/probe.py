"""Is a steady state the only one of its sector, and how far away is the next mode?

A random operator r is freed of all decaying modes: with ``L y = L r`` the rest ``z = r - y`` is a
zero mode, as good as the equation is solved. Once the known zero mode is taken out, z vanishes when
there is no other. What is left on the way is made of the slowest modes, and one step of inverse
iteration turns it into an estimate of the smallest eigenvalue.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from lbwork.iterative.solver import SectorSolver

__all__ = ["Probe", "probe_kernel", "smooth_start"]

ACCURACIES = (1e-4, 1e-7, 1e-10)
VANISHED = 0.02
"""Share of what a random vector has along one direction below which a rest has vanished: a start of
n entries has about ``1 / sqrt(n)`` of its length along any zero mode that is not few-body."""


@dataclass(frozen=True)
class Probe:
    """``separation``: ``||L z||`` for the slowest unit vector z that was met, zero up to rounding
    when another zero mode exists; ``applies``: cost."""

    separation: float
    applies: int


def smooth_start(solver: SectorSolver, seed: int) -> np.ndarray:
    """A random unit vector, half of it few-body operators, which slow modes overlap with.

    In a Hermitian sector: random sums of one- and two-site diagonal operators and their images
    under L; elsewhere noise that the preconditioner has smoothed.
    """
    space = solver.space
    generator = np.random.default_rng(seed)
    noise = generator.normal(size=space.size)
    if not space.hermitian:
        noise = noise + 1j * generator.normal(size=space.size)
        noise = np.asarray(noise / np.linalg.norm(noise), dtype=complex)
        smooth = solver.precondition(noise)
        return np.asarray(noise + smooth / np.linalg.norm(smooth)) / 2
    smooth = _few_body(solver, generator)
    image = solver.apply(smooth)
    smooth = smooth + image / max(float(np.linalg.norm(image)), 1e-300)
    noise /= np.linalg.norm(noise)
    size = float(np.linalg.norm(smooth))
    total = noise + (smooth / size if size > 0 else 0)
    return np.asarray(total / np.linalg.norm(total))


def _few_body(solver: SectorSolver, generator: np.random.Generator) -> np.ndarray:
    """A random sum of diagonal operators on one and two sites, of unit length."""
    space = solver.space
    sites, dimension = solver.sites, solver.dimension
    vector = np.zeros(space.size)
    # The same weights in every block: one operator on the whole chain.
    weights = generator.normal(size=(sites, dimension))
    pairs = generator.normal(size=(sites, sites))
    for block, (ket, bra) in zip(space.blocks(vector), space.pairs, strict=True):
        if ket != bra:
            continue
        states = space.kets(ket)
        powers = dimension ** np.arange(sites - 1, -1, -1)
        digits = (states[:, None] // powers) % dimension
        values = weights[np.arange(sites), digits]
        np.fill_diagonal(
            block, values.sum(axis=1) + np.einsum("ni,ij,nj->n", values, pairs, values)
        )
    return vector / max(float(np.linalg.norm(vector)), 1e-300)


def _without(vector: np.ndarray, known: list[tuple[np.ndarray, np.ndarray]]) -> np.ndarray:
    """Take out known zero modes: ``v - R (J, v)`` for pairs (J, R) with (J, R) = 1."""
    for left, right in known:
        vector = vector - np.vdot(left, vector) * right
    return vector


def probe_kernel(
    solver: SectorSolver,
    known: list[tuple[np.ndarray, np.ndarray]],
    *,
    seed: int,
    zero: float,
    tell: Callable[[str], None] = lambda text: None,
) -> Probe:
    """Look for a zero mode besides the known ones (pairs of left and right zero modes).

    ``zero``: ``||L z||`` of a unit vector below which it is a zero mode.
    """
    before = solver.applies
    rest = _without(smooth_start(solver, seed), known)
    rest /= np.linalg.norm(rest)
    scale = float(np.linalg.norm(solver.apply(rest)))

    def progress(value: float) -> None:
        tell(f"search for further zero modes: {solver.applies - before} applications")

    for accuracy in (*ACCURACIES, 0.0):
        image = solver.apply(rest)
        length = float(np.linalg.norm(rest))
        if np.linalg.norm(image) <= zero * length:
            break
        # What has not vanished by the last round is freed of decaying modes as far as a zero mode
        # can be told from a slow one.
        target = max(accuracy * scale, 0.3 * zero * length)
        solved = solver.solve(image, target, progress=progress)
        rest = _without(rest - solved.solution, known)
        if np.linalg.norm(rest) < VANISHED / np.sqrt(rest.size):
            break
    rest /= np.linalg.norm(rest)
    separation = float(np.linalg.norm(solver.apply(rest)))
    if separation > zero:
        solved = solver.solve(rest, 0.1, progress=progress)
        slower = _without(solved.solution, known)
        length = float(np.linalg.norm(slower))
        if solved.converged and length > 0:
            separation = float(np.linalg.norm(solver.apply(slower / length)))
    return Probe(separation, solver.applies - before)
