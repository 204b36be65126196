"""The frozen description of a dissipative chain, from which everything else follows."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from types import MappingProxyType
from typing import Any

from lbwork.errors import ModelError
from lbwork.model.canonical import canonical_document
from lbwork.model.document import model_document, number_document
from lbwork.model.frame import (
    checked_boundary,
    checked_description,
    checked_items,
    checked_name,
    checked_number,
    checked_parameters,
)
from lbwork.model.hermiticity import check_hermitian
from lbwork.model.places import Chain, PlacedJump, PlacedOperator, place_jumps, place_terms
from lbwork.model.terms import Jump, Term
from lbwork.model.words import nearest, shown

__all__ = ["Model"]

MAX_SITES = 256


@dataclass(frozen=True, eq=False)
class Model:
    """A chain with Hamiltonian and jump operators; validated when it is made, never changed.

    Parameters
    ----------
    name, description: free text.
    sites: number of sites L, 1..256. local_dimension: states per site, 2..10.
    boundary: ``open`` or ``periodic``; on a ring a k-site operator has L places and wraps around
    (two sites: bond 1 joins 1 and 2, bond 2 joins 2 and 1).
    parameters: named numbers that expressions may use.
    hamiltonian, jumps: :class:`Term` and :class:`Jump` entries.

    ``L(rho) = -i[H, rho] + sum_k g_k (l_k rho l_k^dag - 1/2 {l_k^dag l_k, rho})``, hbar = 1, all
    energies and rates in one common unit. Raises ModelError naming the place and the way out.

    Two models are equal when they are written alike (:meth:`to_dict`); they are the same physics
    when their :attr:`identity` is the same.
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
        sites = checked_number("sites", self.sites, 1, MAX_SITES)
        dimension = checked_number("local_dimension", self.local_dimension, 2, 10)
        checked = {
            "name": checked_name(self.name),
            "description": checked_description(self.description),
            "sites": sites,
            "local_dimension": dimension,
            "boundary": checked_boundary(self.boundary, sites),
            "parameters": MappingProxyType(checked_parameters(self.parameters, dimension)),
            "hamiltonian": checked_items(self.hamiltonian, Term, "hamiltonian"),
            "jumps": checked_items(self.jumps, Jump, "jump"),
        }
        for key, value in checked.items():
            object.__setattr__(self, key, value)
        if not self.hamiltonian and not self.jumps:
            raise ModelError("model: there is neither a hamiltonian nor a jump; add one")
        # Placing evaluates every expression, so that a model that exists can be used.
        placed = self._placed
        check_hermitian(placed[0], dimension)

    @cached_property
    def _placed(self) -> tuple[tuple[tuple[int, PlacedOperator], ...], tuple[PlacedJump, ...]]:
        names = {key: complex(value) for key, value in self.parameters.items()}
        names["L"] = complex(self.sites)
        chain = Chain(self.sites, self.local_dimension, self.boundary == "periodic", names)
        return place_terms(chain, self.hamiltonian), place_jumps(chain, self.jumps)

    def placed_hamiltonian(self) -> tuple[PlacedOperator, ...]:
        """H as a sum of operators on given sites, coefficients multiplied in."""
        return tuple(operator for _, operator in self._placed[0])

    def placed_jumps(self) -> tuple[PlacedJump, ...]:
        """Jump operators on given sites, coefficients multiplied in, rates > 0."""
        return self._placed[1]

    def replace(self, **changes: Any) -> Model:
        """A new model with other ``sites``, ``boundary``, ``name`` or parameter values.

        Raises ModelError for an unknown parameter, with the nearest name, and when the model does
        not exist after the change, for example because a list has too few values for more sites.
        """
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
                    f"model '{self.name}' has no parameter {shown(key)}{nearest(key, known)}; "
                    f"it has {', '.join(parameters) or 'none'}"
                )
        return Model(**(self._fields() | {"parameters": parameters} | fields))

    def _fields(self) -> dict[str, Any]:
        return {
            "name": self.name,
            "sites": self.sites,
            "local_dimension": self.local_dimension,
            "boundary": self.boundary,
            "parameters": dict(self.parameters),
            "hamiltonian": self.hamiltonian,
            "jumps": self.jumps,
            "description": self.description,
        }

    def __reduce__(self) -> tuple[Callable[..., Model], tuple[Any, ...]]:
        # Copies and other processes get the source form and validate it again.
        return Model, tuple(self._fields().values())

    @cached_property
    def _canonical(self) -> str:
        document = canonical_document(
            self.sites,
            self.local_dimension,
            self.boundary,
            self.placed_hamiltonian(),
            self.placed_jumps(),
        )
        return json.dumps(document, sort_keys=True, separators=(",", ":"), allow_nan=False)

    def canonical_json(self) -> str:
        """Canonical form: independent of how terms are written, split, ordered or named.

        H as coefficients of products of an orthonormal Hermitian on-site basis (identity part
        dropped), each jump as a rate and a normalised operator in the same basis with a fixed
        phase, rounded to 12 significant digits of the largest coefficient.
        """
        return self._canonical

    @cached_property
    def identity(self) -> str:
        """SHA-256 of :meth:`canonical_json`, 64 hexadecimal digits."""
        return hashlib.sha256(self._canonical.encode()).hexdigest()

    def to_dict(self) -> dict[str, Any]:
        """The model as it was written: a JSON document with the keys of a model file."""
        return model_document(self)

    def to_toml(self) -> str:
        """The text of a model file that reads back as an equal model."""
        # The file reader stands above this module: it makes models.
        from lbwork.model.files import model_to_toml

        return model_to_toml(self)

    @staticmethod
    def from_toml(text: str) -> Model:
        """A model from the text of a model file; raises ModelError."""
        from lbwork.model.files import model_from_toml

        return model_from_toml(text)

    @cached_property
    def _source(self) -> str:
        return json.dumps(self.to_dict(), sort_keys=True)

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Model) and self._source == other._source

    def __hash__(self) -> int:
        return hash(self._source)

    def __str__(self) -> str:
        kind = "ring" if self.boundary == "periodic" else "open chain"
        values = ", ".join(
            f"{key}={number_document(value)}" for key, value in self.parameters.items()
        )
        return (
            f"{self.name}: {kind} of {self.sites} sites, local dimension {self.local_dimension}"
            + (f", {values}" if values else "")
        )
