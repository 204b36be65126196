"""A spin-1/2 model as sums of Pauli strings, and the plain chains that closed forms apply to."""

from __future__ import annotations

from dataclasses import dataclass
from functools import reduce
from itertools import product

import numpy as np
import numpy.typing as npt

from lbwork import defaults
from lbwork.errors import ModelError
from lbwork.model import Model

__all__ = [
    "PauliString",
    "PlainChain",
    "hamiltonian_strings",
    "jump_strings",
    "plain_chain",
    "require_open_spin_half",
    "shown_string",
    "uniform",
]

PauliString = tuple[tuple[int, str], ...]
"""Pairs (0-based site, ``X``, ``Y`` or ``Z``) by ascending site; empty for the identity."""

_PAULI = {
    "I": np.eye(2, dtype=complex),
    "X": np.array([[0, 1], [1, 0]], dtype=complex),
    "Y": np.array([[0, -1j], [1j, 0]], dtype=complex),
    "Z": np.diag([1.0 + 0j, -1.0]),
}


def shown_string(string: PauliString) -> str:
    """A string as messages show it, with 1-based sites: ``X_1 Y_2``."""
    return " ".join(f"{letter}_{site + 1}" for site, letter in string) or "the identity"


def uniform(values: np.ndarray) -> bool:
    """Whether all values are the same to rounding."""
    spread = np.ptp(values) if values.size else 0.0
    return bool(spread <= defaults.CONSERVATION_TOLERANCE * np.abs(values).max(initial=0.0))


def require_open_spin_half(model: Model, need: str) -> None:
    """Raises ModelError unless the model is an open spin-1/2 chain; ``need`` names the method."""
    if model.local_dimension != 2:
        raise ModelError(
            f"model '{model.name}': local dimension {model.local_dimension}; {need} needs spin 1/2"
        )
    if model.boundary != "open":
        raise ModelError(
            f"model '{model.name}' is a ring, whose closing bond carries the parity of all sites; "
            f"{need} needs an open chain"
        )


def _strings(sites: tuple[int, ...], matrix: np.ndarray) -> dict[PauliString, complex]:
    found: dict[PauliString, complex] = {}
    for letters in product("IXYZ", repeat=len(sites)):
        whole = reduce(np.kron, [_PAULI[letter] for letter in letters])
        # Pauli strings are orthogonal: coefficient = tr(P A) / 2^k.
        value = complex(np.vdot(whole, matrix)) / matrix.shape[0]
        if value != 0:
            pairs = zip(sites, letters, strict=True)
            found[tuple(sorted(pair for pair in pairs if pair[1] != "I"))] = value
    return _without_rounding(found)


def _without_rounding(strings: dict[PauliString, complex]) -> dict[PauliString, complex]:
    largest = max((abs(value) for value in strings.values()), default=0.0)
    limit = defaults.CONSERVATION_TOLERANCE * largest
    return {key: value for key, value in strings.items() if abs(value) > limit}


def hamiltonian_strings(model: Model) -> dict[PauliString, float]:
    """H as real coefficients of Pauli strings, identity left out. Needs spin 1/2."""
    total: dict[PauliString, complex] = {}
    for term in model.placed_hamiltonian():
        for string, value in _strings(term.sites, term.matrix).items():
            total[string] = total.get(string, 0) + value
    return {key: value.real for key, value in _without_rounding(total).items() if key}


def jump_strings(model: Model) -> list[tuple[float, dict[PauliString, complex]]]:
    """Rate and Pauli coefficients of every jump operator. Needs spin 1/2."""
    return [(jump.rate, _strings(jump.sites, jump.matrix)) for jump in model.placed_jumps()]


@dataclass(frozen=True, eq=False)
class PlainChain:
    """Open chain with one- and two-site terms in Z, XX, YY, ZZ and jumps S+, S-, Z.

    Real float64 arrays: field (L,); xx, yy, zz (L-1,); rates raising, lowering, dephasing (L,).
    """

    field: npt.NDArray[np.float64]
    xx: npt.NDArray[np.float64]
    yy: npt.NDArray[np.float64]
    zz: npt.NDArray[np.float64]
    raising: npt.NDArray[np.float64]
    lowering: npt.NDArray[np.float64]
    dephasing: npt.NDArray[np.float64]


def plain_chain(model: Model, need: str) -> PlainChain:
    """Couplings and rates of a model without any other terms; ModelError names the first other."""
    require_open_spin_half(model, need)
    count = model.sites
    bonds = {letter * 2: np.zeros(count - 1) for letter in "XYZ"}
    field = np.zeros(count)
    for string, value in hamiltonian_strings(model).items():
        word = "".join(letter for _, letter in string)
        places = [site for site, _ in string]
        if word == "Z":
            field[places[0]] = value
        elif word in bonds and places[1] == places[0] + 1:
            bonds[word][places[0]] = value
        else:
            raise ModelError(
                f"model '{model.name}': {need} has no place for the term {shown_string(string)}"
            )
    rates = {name: np.zeros(count) for name in ("raising", "lowering", "dephasing")}
    for rate, strings in jump_strings(model):
        kind, site, strength = _plain_jump(strings)
        if kind is None:
            words = ", ".join(shown_string(string) for string in strings)
            raise ModelError(
                f"model '{model.name}': {need} allows the jumps S+, S- and Z, not one made of "
                f"{words}"
            )
        rates[kind][site] += rate * strength
    return PlainChain(field, bonds["XX"], bonds["YY"], bonds["ZZ"], **rates)


def _plain_jump(strings: dict[PauliString, complex]) -> tuple[str | None, int, float]:
    sites = {site for string in strings for site, _ in string}
    if len(sites) != 1:
        return None, 0, 0.0
    (site,) = sites
    local = {string[0][1] if string else "I": value for string, value in strings.items()}
    if set(local) == {"Z"}:
        return "dephasing", site, abs(local["Z"]) ** 2
    if set(local) == {"X", "Y"}:
        size = abs(local["X"])
        for kind, sign in (("raising", 1j), ("lowering", -1j)):
            if abs(local["Y"] - sign * local["X"]) <= defaults.CONSERVATION_TOLERANCE * size:
                # S+ = (X + iY)/2.
                return kind, site, 4 * size**2
    return None, 0, 0.0
