"""The frozen description of a dissipative chain, from which everything else follows."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from types import MappingProxyType
from typing import Any

import numpy as np

from lbwork.errors import ModelError
from lbwork.model.canonical import canonical_document, hermiticity_defect
from lbwork.model.expressions import FUNCTIONS, LocalOperator, nearest
from lbwork.model.operators import known_operator_names
from lbwork.model.terms import (
    Jump,
    Number,
    RandomOperator,
    Term,
    resolve_operator,
    scalar,
)

__all__ = ["Model", "PlacedJump", "PlacedOperator"]

MAX_SITES = 256
RESERVED = ("j", "L", "pi", *FUNCTIONS)
BOUNDARIES = ("open", "periodic")


@dataclass(frozen=True, eq=False)
class PlacedOperator:
    """An operator on given sites: 0-based ``sites`` in tensor order, complex128 ``matrix``."""

    sites: tuple[int, ...]
    matrix: np.ndarray


@dataclass(frozen=True, eq=False)
class PlacedJump:
    """A jump operator on given sites with its rate > 0."""

    sites: tuple[int, ...]
    matrix: np.ndarray
    rate: float


@dataclass(frozen=True, eq=False)
class Model:
    """A chain with Hamiltonian and jump operators; validated when it is made, never changed.

    Parameters
    ----------
    name, description: free text.
    sites: number of sites L, 1..256. local_dimension: states per site, 2..10.
    boundary: ``open`` or ``periodic``; on a ring a k-site operator has L places and wraps around.
    parameters: named numbers that expressions may use.
    hamiltonian, jumps: :class:`Term` and :class:`Jump` entries.

    ``L(rho) = -i[H, rho] + sum_k g_k (l_k rho l_k^dag - 1/2 {l_k^dag l_k, rho})``, hbar = 1, all
    energies and rates in one common unit. Raises ModelError naming the place and the way out.
    """

    name: str
    sites: int
    local_dimension: int = 2
    boundary: str = "open"
    parameters: Mapping[str, float | complex] = field(default_factory=dict)
    hamiltonian: tuple[Term, ...] = ()
    jumps: tuple[Jump, ...] = ()
    description: str = ""

    def __post_init__(self) -> None:
        _check_frame(self)
        object.__setattr__(self, "parameters", MappingProxyType(_parameters(self)))
        object.__setattr__(self, "hamiltonian", tuple(self.hamiltonian))
        object.__setattr__(self, "jumps", tuple(self.jumps))
        placed = self._placed
        defect, sites = hermiticity_defect(placed[0], self.local_dimension)
        if defect > 1e-12:
            where = ", ".join(str(site + 1) for site in sites)
            raise ModelError(
                f"hamiltonian: not Hermitian on site(s) {where} (relative defect {defect:.1e}); "
                "add the Hermitian conjugate of each term"
            )

    @cached_property
    def _placed(self) -> tuple[tuple[PlacedOperator, ...], tuple[PlacedJump, ...]]:
        names = {key: complex(value) for key, value in self.parameters.items()}
        names["L"] = complex(self.sites)
        operators = tuple(
            PlacedOperator(sites, value * operator.matrix)
            for index, term in enumerate(self.hamiltonian, start=1)
            for sites, operator, value, _ in _spread(self, term, names, f"hamiltonian term {index}")
            if value != 0
        )
        jumps = []
        for index, jump in enumerate(self.jumps, start=1):
            place = f"jump {index}"
            for sites, operator, value, at in _spread(self, jump, names, place):
                rate = _rate(jump, names, at, place)
                if rate > 0 and value != 0:
                    jumps.append(PlacedJump(sites, value * operator.matrix, rate))
        return operators, tuple(jumps)

    def placed_hamiltonian(self) -> tuple[PlacedOperator, ...]:
        """H as a sum of operators on given sites, coefficients multiplied in."""
        return self._placed[0]

    def placed_jumps(self) -> tuple[PlacedJump, ...]:
        """Jump operators on given sites, coefficients multiplied in, rates > 0."""
        return self._placed[1]

    def replace(self, **changes: Any) -> Model:
        """A new model with other ``sites``, ``boundary``, ``name`` or parameter values."""
        fields: dict[str, Any] = {}
        parameters = dict(self.parameters)
        for key, value in changes.items():
            if key in ("sites", "boundary", "name", "description"):
                fields[key] = value
            elif key in parameters:
                parameters[key] = value
            else:
                known = [*parameters, "sites", "boundary", "name"]
                raise ModelError(
                    f"model '{self.name}' has no parameter '{key}'{nearest(key, known)}; "
                    f"it has {', '.join(parameters) or 'none'}"
                )
        merged: dict[str, Any] = {
            "name": self.name,
            "sites": self.sites,
            "local_dimension": self.local_dimension,
            "boundary": self.boundary,
            "parameters": parameters,
            "hamiltonian": self.hamiltonian,
            "jumps": self.jumps,
            "description": self.description,
        }
        return Model(**(merged | fields))

    @cached_property
    def _canonical(self) -> str:
        document = canonical_document(
            self.sites, self.local_dimension, self.boundary, *self._placed
        )
        return json.dumps(document, sort_keys=True, separators=(",", ":"), allow_nan=False)

    def canonical_json(self) -> str:
        """Canonical form: independent of how terms are written, split, ordered or named.

        H as coefficients of products of an orthonormal Hermitian on-site basis (identity part
        dropped), each jump as ``sqrt(rate) l`` in the same basis with a fixed phase, all rounded to
        12 significant digits.
        """
        return self._canonical

    @cached_property
    def identity(self) -> str:
        """SHA-256 of :meth:`canonical_json`, 64 hexadecimal digits."""
        return hashlib.sha256(self._canonical.encode()).hexdigest()

    def to_dict(self) -> dict[str, Any]:
        """The model as it was written: a JSON document with the keys of a model file."""
        return {
            "name": self.name,
            "description": self.description,
            "sites": self.sites,
            "local_dimension": self.local_dimension,
            "boundary": self.boundary,
            "parameters": {key: _plain(value) for key, value in self.parameters.items()},
            "hamiltonian": [_term_document(term) for term in self.hamiltonian],
            "jump": [_term_document(jump) for jump in self.jumps],
        }

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Model) and self.to_dict() == other.to_dict()

    def __hash__(self) -> int:
        return hash(json.dumps(self.to_dict(), sort_keys=True))

    def __str__(self) -> str:
        kind = "ring" if self.boundary == "periodic" else "open chain"
        values = ", ".join(f"{key}={_plain(value)}" for key, value in self.parameters.items())
        return (
            f"{self.name}: {kind} of {self.sites} sites, local dimension {self.local_dimension}"
            + (f", {values}" if values else "")
        )


def _plain(value: Any) -> Any:
    """Numbers for a document: floats as they are, complex ones as expression text."""
    if isinstance(value, complex):
        if value.imag == 0:
            return value.real
        return f"{value.real!r}{'+' if value.imag >= 0 else '-'}{abs(value.imag)!r}j"
    return value


def _term_document(item: Term | Jump) -> dict[str, Any]:
    document: dict[str, Any] = {}
    if isinstance(item.operator, str):
        document["operator"] = item.operator
    elif isinstance(item.operator, RandomOperator):
        document["random"] = {
            "kind": item.operator.kind,
            "range": item.operator.range,
            "seed": item.operator.seed,
        }
    else:
        document["matrix"] = [[_plain(entry) for entry in row] for row in item.operator]
    document["on"] = item.on if isinstance(item.on, str) else list(item.on)
    document["coefficient"] = _listed(item.coefficient)
    if isinstance(item, Jump):
        document["rate"] = _listed(item.rate)
    return document


def _listed(value: Number | tuple[Number, ...]) -> Any:
    return [_plain(entry) for entry in value] if isinstance(value, tuple) else _plain(value)


def _check_frame(model: Model) -> None:
    if not isinstance(model.name, str) or not model.name.strip():
        raise ModelError('name: a model needs a name, e.g. name = "my-chain"')
    if len(model.name) > 80 or any(ord(character) < 32 for character in model.name):
        raise ModelError("name: at most 80 printable characters are allowed")
    for key, low, high in (("sites", 1, MAX_SITES), ("local_dimension", 2, 10)):
        value = getattr(model, key)
        if isinstance(value, bool) or not isinstance(value, int | np.integer):
            raise ModelError(f"{key}: {value!r} is not a whole number; give {low} to {high}")
        if not low <= value <= high:
            raise ModelError(f"{key}: {value} is outside {low} to {high}")
    if model.boundary not in BOUNDARIES:
        raise ModelError(
            f"boundary: {model.boundary!r} is not known{nearest(str(model.boundary), BOUNDARIES)}; "
            "use open or periodic"
        )
    if model.boundary == "periodic" and model.sites < 2:
        raise ModelError("boundary: a ring needs at least 2 sites; use open")
    if not model.hamiltonian and not model.jumps:
        raise ModelError("model has neither a hamiltonian nor a jump; add one")
    for kind, items, wanted in (
        ("hamiltonian", model.hamiltonian, Term),
        ("jump", model.jumps, Jump),
    ):
        for item in items:
            if not isinstance(item, wanted):
                raise ModelError(f"{kind}: {type(item).__name__} is not a {wanted.__name__}")


def _parameters(model: Model) -> dict[str, float | complex]:
    checked: dict[str, float | complex] = {}
    operators = known_operator_names(model.local_dimension)
    for key, value in dict(model.parameters).items():
        place = f"parameter '{key}'"
        if not isinstance(key, str) or not key.isidentifier() or not key.isascii():
            raise ModelError(f"{place}: not a legal name; use letters, digits and _")
        if key in RESERVED:
            raise ModelError(f"{place}: the name is reserved; choose another")
        if key in operators:
            raise ModelError(f"{place}: this is the name of an operator; choose another")
        if isinstance(value, list | tuple | dict):
            raise ModelError(f"{place}: a parameter is one number; put lists into coefficient")
        if isinstance(value, bool) or value is None:
            raise ModelError(f"{place}: {value!r} is not a number")
        try:
            known = scalar(value if isinstance(value, str) else complex(value), {}, place)
        except (TypeError, ValueError, OverflowError) as error:
            if isinstance(error, ModelError):
                raise
            raise ModelError(f"{place}: {value!r} is not a number") from None
        checked[key] = known.real if known.imag == 0 else known
    return checked


def _spread(
    model: Model, item: Term | Jump, names: Mapping[str, complex], place: str
) -> Iterator[tuple[tuple[int, ...], LocalOperator, complex, tuple[int, int, int]]]:
    """(sites, operator, coefficient, (number of the place, its index, how many)) of a term."""
    operator = resolve_operator(item.operator, model.local_dimension, names, place)
    firsts = _first_sites(model, item, operator.count, place)
    _check_list_length(item.coefficient, len(firsts), f"{place}: coefficient")
    for index, first in enumerate(firsts):
        sites = tuple((first + offset) % model.sites for offset in range(operator.count))
        at = (first + 1, index, len(firsts))
        value = _value_at(item.coefficient, names, at, f"{place}: coefficient")
        yield sites, operator, value, at


def _check_list_length(value: Any, count: int, place: str) -> None:
    if isinstance(value, tuple) and len(value) != count:
        raise ModelError(
            f"{place}: {len(value)} values for {count} places; give one per place or a single one"
        )


def _value_at(
    value: Any, names: Mapping[str, complex], at: tuple[int, int, int], place: str
) -> complex:
    entry = value[at[1]] if isinstance(value, tuple) else value
    return scalar(entry, {**names, "j": complex(at[0])}, place)


def _rate(jump: Jump, names: Mapping[str, complex], at: tuple[int, int, int], place: str) -> float:
    _check_list_length(jump.rate, at[2], f"{place}: rate")
    value = _value_at(jump.rate, names, at, f"{place}: rate")
    if abs(value.imag) > 1e-14 * abs(value):
        raise ModelError(f"{place}: rate {value} is complex; a rate is a real number >= 0")
    if value.real < 0:
        raise ModelError(
            f"{place}: rate {value.real:g} is negative; a rate is >= 0 (put signs and phases into "
            "the coefficient)"
        )
    return value.real


def _first_sites(model: Model, item: Term | Jump, count: int, place: str) -> list[int]:
    """0-based first sites of all places of an operator on ``count`` sites."""
    if count > model.sites:
        raise ModelError(
            f"{place}: an operator on {count} sites does not fit on {model.sites} site(s)"
        )
    ring = model.boundary == "periodic"
    last = model.sites - 1 if ring and count > 1 else model.sites - count
    named = {"sites": 1, "bonds": 2, "triples": 3}
    if isinstance(item.on, str):
        wanted = named.get(item.on, count)
        if wanted != count:
            raise ModelError(
                f"{place}: on = '{item.on}' needs an operator on {wanted} site(s), not on "
                f"{count}"
            )
        if item.on == "first":
            return [0]
        return [last] if item.on == "last" else list(range(last + 1))
    for number in item.on:
        if not 1 <= number <= last + 1:
            raise ModelError(
                f"{place}: place {number} is outside 1 to {last + 1} on this "
                f"{'ring' if ring else 'open chain'} of {model.sites} sites"
            )
    return [number - 1 for number in item.on]
