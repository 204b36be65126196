"""States and operators as a person writes them: ``neel``, ``gibbs:0.5``, ``Z Z@3``."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from lbwork.errors import UsageError
from lbwork.model import Model
from lbwork.model.sources import resolve_operator
from lbwork.observables.reference_states import (
    checked_density,
    gibbs_state,
    maximally_mixed,
    product_state,
    spin_coherent,
)

__all__ = ["operator_from_words", "state_from_words"]

_PATTERNS = {
    "neel": lambda site, count: ("up", "down")[site % 2],
    "domain-wall": lambda site, count: ("up", "down")[2 * site >= count],
}

_DIRECTIONS = {
    "x+": (np.pi / 2, 0.0),
    "x-": (np.pi / 2, np.pi),
    "y+": (np.pi / 2, np.pi / 2),
    "y-": (np.pi / 2, -np.pi / 2),
}
"""Angles in radians of the spins along an axis."""


def operator_from_words(model: Model, words: str) -> tuple[np.ndarray, tuple[int, ...]]:
    """``"X Y@2"``: an operator expression in the model's words and its first site (from 1).

    Returns the matrix (d**k, d**k) and its 0-based sites. Raises UsageError for a site that does
    not exist, ModelError for a wrong expression.
    """
    text, separator, place = words.rpartition("@")
    if not separator or not place.strip().isdigit():
        raise UsageError(f"'{words}': write an operator and its first site, e.g. Z Z@3")
    names = {key: complex(value) for key, value in model.parameters.items()}
    operator = resolve_operator(text.strip(), model.local_dimension, names, f"'{words}'")
    first = int(place) - 1
    sites = tuple(first + offset for offset in range(operator.count))
    if first < 0 or (model.boundary == "open" and sites[-1] >= model.sites):
        raise UsageError(f"'{words}' does not fit on sites 1..{model.sites}")
    if first >= model.sites or operator.count > model.sites:
        raise UsageError(f"'{words}' does not fit on sites 1..{model.sites}")
    return operator.matrix, tuple(site % model.sites for site in sites)


def state_from_words(model: Model, words: str) -> np.ndarray:
    """A density matrix (D, D) as a person writes it.

    ``mixed``; ``gibbs:BETA`` or ``gibbs:BETA,FIELD``, see
    :func:`lbwork.observables.gibbs_state`; ``neel``, ``domain-wall``; the path of an npy file; or
    one word per site, or one for all of them: ``up``, ``down``, ``mixed``, a level (0 is the
    highest), ``x+``, ``x-``, ``y+``, ``y-`` (along and against an axis), or ``THETA,PHI``, the
    angles of a spin in radians. Raises UsageError for unknown words and for files that do not hold
    a density matrix.
    """
    dimension, count = model.local_dimension, model.sites
    size = dimension**count
    if words == "mixed":
        return maximally_mixed(count, dimension)
    if words.startswith("gibbs:"):
        numbers = _numbers(words.removeprefix("gibbs:"))
        if len(numbers) not in (1, 2):
            raise UsageError(
                f"'{words}': write the inverse temperature, and a field behind a comma if there is "
                "one, e.g. gibbs:0.5"
            )
        return gibbs_state(model, *numbers)
    if words.endswith(".npy"):
        return checked_density(_loaded(Path(words)), size, f"'{words}'")
    if words in _PATTERNS:
        parts = [_PATTERNS[words](site, count) for site in range(count)]
    else:
        parts = words.split()
        parts = parts * count if len(parts) == 1 else parts
    sites = [_site_state(part, dimension) for part in parts]
    unknown = [part for part, state in zip(parts, sites, strict=True) if state is None]
    if unknown or len(parts) != count:
        fault = f"; '{unknown[0]}' is not a word" if unknown else f"; it has {len(parts)} words"
        raise UsageError(
            f"'{words}' is not a state of {count} sites{fault}; write mixed, neel, domain-wall, "
            f"gibbs:BETA, a file name ending in .npy, or one or {count} of: up, down, mixed, x+, "
            f"x-, y+, y-, levels 0..{dimension - 1}, THETA,PHI"
        )
    return product_state([state for state in sites if state is not None])


def _numbers(text: str) -> list[float]:
    """Numbers between commas; none where one of them does not read."""
    try:
        return [float(part) for part in text.split(",")]
    except ValueError:
        return []


def _site_state(word: str, dimension: int) -> np.ndarray | None:
    """The one-site density matrix that a word names, None for other words."""
    if word == "mixed":
        return maximally_mixed(1, dimension)
    if word in ("up", "down") or (word.isdecimal() and int(word) < dimension):
        # Not by angles: the rounding of a sine would leave coherences between the levels.
        level = {"up": 0, "down": dimension - 1}.get(word)
        return np.diag(np.eye(dimension)[int(word) if level is None else level]).astype(complex)
    angles = list(_DIRECTIONS.get(word, ())) or _numbers(word)
    if len(angles) != 2:
        return None
    theta, phi = angles
    return spin_coherent(theta, phi, dimension)


def _loaded(path: Path) -> np.ndarray:
    try:
        return np.asarray(np.load(path, allow_pickle=False))
    except (OSError, ValueError, EOFError) as error:
        reason = " ".join(str(error).split())
        raise UsageError(f"'{path}' cannot be read as an array: {reason}") from None
