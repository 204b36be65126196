"""Names of two-site Markov processes, read off their rates."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

__all__ = ["Transition", "process_name", "transitions"]

Transition = tuple[tuple[int, int], tuple[int, int]]
"""Occupations of two neighbouring sites before and after."""

_REACTIONS = {
    ((1, 1), (0, 0)): "pair annihilation",
    ((0, 0), (1, 1)): "pair creation",
    ((1, 1), (0, 1)): "coagulation",
    ((1, 1), (1, 0)): "coagulation",
    ((1, 0), (1, 1)): "branching",
    ((0, 1), (1, 1)): "branching",
    ((1, 0), (0, 0)): "death",
    ((0, 1), (0, 0)): "death",
    ((0, 0), (1, 0)): "birth",
    ((0, 0), (0, 1)): "birth",
}


def transitions(matrix: np.ndarray, tolerance: float) -> dict[Transition, float]:
    """Rates of all moves of a two-site Markov matrix (d**2, d**2), columns before, rows after.

    For two states the first is occupied (1) and the second empty (0), as in the spin-1/2 basis; for
    more, states are numbered 0..d-1.
    """
    dimension = round(np.sqrt(matrix.shape[0]))

    def digits(index: int) -> tuple[int, int]:
        first, second = divmod(index, dimension)
        return (1 - first, 1 - second) if dimension == 2 else (first, second)

    rates = {}
    for before in range(dimension**2):
        for after in range(dimension**2):
            if before != after and abs(matrix[after, before]) > tolerance:
                rates[(digits(before), digits(after))] = float(matrix[after, before])
    return rates


def process_name(rates: Mapping[Transition, float], dimension: int) -> str:
    """Name of a process in the words of the subject; ``frozen`` when nothing moves."""
    if not rates:
        return "frozen"
    exchanges = {move for move in rates if move[1] == move[0][::-1]}
    if dimension > 2:
        if len(exchanges) == len(rates):
            return "exclusion process of several species"
        return f"process with {dimension} states per site"
    right, left = rates.get(((1, 0), (0, 1)), 0.0), rates.get(((0, 1), (1, 0)), 0.0)
    if len(exchanges) == len(rates):
        if min(right, left) == 0:
            return "totally asymmetric exclusion process"
        same = abs(right - left) < 1e-9 * max(right, left)
        return "symmetric exclusion process" if same else "asymmetric exclusion process"
    flips = all(sum(a != b for a, b in zip(*move, strict=True)) == 1 for move in rates)
    if flips:
        return _flip_name(rates)
    words = sorted({_REACTIONS[move] for move in rates if move not in exchanges})
    if exchanges:
        words.insert(0, "diffusion")
    return f"reaction-diffusion process: {', '.join(words)}"


def _flip_name(rates: Mapping[Transition, float]) -> str:
    """Flips of one site whose rate may depend on its neighbours."""

    def rate(site: int, before: int, other: int) -> float:
        start = (before, other) if site == 0 else (other, before)
        end = (1 - before, other) if site == 0 else (other, 1 - before)
        return rates.get((start, end), 0.0)

    total = {(s, o): rate(0, s, o) + rate(1, s, o) for s in (0, 1) for o in (0, 1)}
    scale = max(rates.values())

    def same(first: float, second: float) -> bool:
        return abs(first - second) < 1e-9 * scale

    free = all(same(rate(site, s, 0), rate(site, s, 1)) for site in (0, 1) for s in (0, 1))
    if free:
        return "independent spin flips"
    mirror = all(same(rate(0, s, o), rate(1, s, o)) for s in (0, 1) for o in (0, 1))
    if mirror and same(total[0, 0], total[1, 1]) and same(total[0, 1], total[1, 0]):
        if same(total[0, 0], 0):
            return "Glauber-type process at zero temperature (voter model)"
        return "Glauber-type process"
    words = sorted({_REACTIONS[move] for move in rates})
    return f"reaction process: {', '.join(words)}"
