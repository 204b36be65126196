"""States and operators as a person writes them: ``neel``, ``gibbs:0.5``, ``Z Z@3``."""

from __future__ import annotations

from pathlib import Path

import numpy as np

from lbwork.errors import UsageError
from lbwork.model import Model
from lbwork.model.sources import resolve_operator
from lbwork.observables.reference_states import checked_density, gibbs_state, product_state

__all__ = ["operator_from_words", "state_from_words"]

_PATTERNS = {
    "up": lambda site, count: 0,
    "down": lambda site, count: 1,
    "neel": lambda site, count: site % 2,
    "domain-wall": lambda site, count: int(2 * site >= count),
}


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
    """A density matrix (D, D): ``up``, ``down``, ``neel``, ``domain-wall``, ``mixed``,
    ``gibbs:BETA``, levels such as ``0 1 1 0`` (0 is the highest), or the path of an npy file.

    Raises UsageError for unknown words and for files that do not hold a density matrix.
    """
    dimension, count = model.local_dimension, model.sites
    size = dimension**count
    if words == "mixed":
        return np.eye(size, dtype=complex) / size
    if words.startswith("gibbs:"):
        try:
            beta = float(words.removeprefix("gibbs:"))
        except ValueError:
            raise UsageError(f"'{words}': write the inverse temperature, e.g. gibbs:0.5") from None
        return gibbs_state(model, beta)
    if words.endswith(".npy"):
        return checked_density(_loaded(Path(words)), size, f"'{words}'")
    if words in _PATTERNS:
        levels = [_PATTERNS[words](site, count) * (dimension - 1) for site in range(count)]
    else:
        parts = words.split()
        if len(parts) != count or not all(part.isdigit() for part in parts):
            known = ", ".join([*_PATTERNS, "mixed", "gibbs:BETA"])
            raise UsageError(
                f"'{words}' is not a state of {count} sites; write {known}, a file name ending in "
                f".npy, or {count} levels, e.g. {' '.join(['0'] * count)}"
            )
        levels = [int(part) for part in parts]
        if max(levels) >= dimension:
            raise UsageError(f"'{words}': levels are 0..{dimension - 1}")
    return product_state([np.diag(np.eye(dimension)[level]) for level in levels])


def _loaded(path: Path) -> np.ndarray:
    try:
        return np.asarray(np.load(path, allow_pickle=False))
    except (OSError, ValueError, EOFError) as error:
        reason = " ".join(str(error).split())
        raise UsageError(f"'{path}' cannot be read as an array: {reason}") from None
