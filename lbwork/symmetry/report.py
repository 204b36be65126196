"""What symmetries a model has: the search from end to end and the record it returns."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from lbwork import defaults
from lbwork.errors import SymmetryError
from lbwork.generator import superoperator_terms
from lbwork.model import Model
from lbwork.symmetry.algebra import (
    commuting_generators,
    ket_generators,
)
from lbwork.symmetry.block import LocalRows, local_rows
from lbwork.symmetry.canonical import CanonicalTerms, canonical_terms, sublattice_count
from lbwork.symmetry.charges import Charge, find_charges
from lbwork.symmetry.discrete import (
    DiscreteSymmetry,
    find_point_symmetries,
    find_translation,
    hermiticity_map,
)
from lbwork.symmetry.hidden import UnresolvedSymmetry, unresolved_symmetries
from lbwork.symmetry.local_basis import rotate_terms, rotation_to_diagonal
from lbwork.symmetry.monomials import images_agree

__all__ = ["SymmetryReport", "find_symmetries"]


@dataclass(frozen=True, eq=False)
class SymmetryReport:
    """Everything found by :func:`find_symmetries`.

    ``rotation`` (sublattices, d, d) is the on-site change of basis in which the charges are
    diagonal, or None; ``terms`` and ``constant`` are the generator in that basis; ``point`` are
    reflections and on-site permutations, ``transpositions`` the operations with
    ``S L^T S^-1 = L``.
    """

    model: Model
    rotation: np.ndarray | None
    terms: CanonicalTerms
    constant: complex
    charges: tuple[Charge, ...]
    translation: DiscreteSymmetry | None
    point: tuple[DiscreteSymmetry, ...]
    transpositions: tuple[DiscreteSymmetry, ...]
    hermiticity: DiscreteSymmetry
    unresolved: tuple[UnresolvedSymmetry, ...]

    @property
    def base(self) -> int:
        """States per site of the doubled chain, ``d**2``."""
        return self.model.local_dimension**2

    @cached_property
    def rows(self) -> tuple[LocalRows, ...]:
        """The local terms prepared for reading off rows of the generator."""
        return local_rows(self.terms)

    @property
    def symmetries(self) -> tuple[DiscreteSymmetry, ...]:
        """All discrete symmetries, translation first."""
        return ((self.translation,) if self.translation else ()) + self.point

    def to_dict(self) -> dict[str, Any]:
        """A JSON document: charges, discrete symmetries with residuals, what stays unresolved."""
        return {
            "basis": "as written" if self.rotation is None else "rotated on each site",
            "charges": [
                {
                    "name": charge.name,
                    "kind": charge.kind,
                    "type": f"Z{charge.modulus}" if charge.modulus else "U(1)",
                }
                for charge in self.charges
            ],
            "symmetries": [
                {"name": item.name, "residual": item.residual} for item in self.symmetries
            ],
            "hermiticity_residual": self.hermiticity.residual,
            "transpositions": [item.name for item in self.transpositions],
            "unresolved": [item.to_dict() for item in self.unresolved],
        }

    def __str__(self) -> str:
        lines = []
        for charge in self.charges:
            kind = f"Z{charge.modulus}" if charge.modulus else "U(1)"
            lines.append(f"charge     {charge.name} ({kind}, {charge.kind})")
        for item in self.symmetries:
            lines.append(f"discrete   {item.name}  [residual {item.residual:.0e}]")
        for unresolved in self.unresolved:
            lines.append(f"unresolved {unresolved.name}: {unresolved.advice}")
        return "\n".join(lines) if lines else "no symmetry but Hermiticity"


def _constant(model: Model) -> complex:
    base = model.local_dimension**2
    return complex(
        sum(np.trace(term.matrix) / base ** len(term.sites) for term in superoperator_terms(model))
    )


def find_symmetries(model: Model, *, charges_only: bool = False) -> SymmetryReport:
    """Find the symmetries of a model's generator by computation, and prove each numerically.

    Continuous on-site generators come from a linear solve, diagonal charges (all U(1) and cyclic
    ones) from integer algebra, reflections and on-site permutations from a search whose signs are
    solved for; every one is compared with the generator term by term. With ``charges_only``
    discrete and unresolved symmetries are not looked for (their search takes seconds for d > 2).
    Raises SymmetryError when the generator does not preserve Hermiticity.
    """
    dimension = model.local_dimension
    ring = model.boundary == "periodic"
    base = dimension**2
    sites = model.sites
    terms = canonical_terms(superoperator_terms(model), base)
    sublattices = sublattice_count(sites, ring)
    weak = commuting_generators(terms, ket_generators(dimension), sublattices=sublattices)
    rotation = None
    if weak is not None and terms:
        rotation = rotation_to_diagonal(weak, dimension)
        if rotation is not None:
            terms = rotate_terms(terms, rotation, sublattices)
    hermiticity = hermiticity_map(sites, dimension)
    residual = images_agree(hermiticity, terms, np.inf)
    if residual > defaults.SYMMETRY_TOLERANCE:
        raise SymmetryError(
            f"the generator does not preserve Hermiticity (mismatch {residual:.1e}); "
            "check that the Hamiltonian is Hermitian and the rates are real"
        )
    if charges_only:
        return SymmetryReport(
            model=model,
            rotation=rotation,
            terms=terms,
            constant=_constant(model),
            charges=find_charges(terms, dimension, sites, ring),
            translation=None,
            point=(),
            transpositions=(),
            hermiticity=DiscreteSymmetry("Hermiticity", hermiticity, residual),
            unresolved=(),
        )
    translation = find_translation(terms, sites, base) if ring and terms else None
    site_centred = ring and (translation is None or translation.name != "translation")
    charges = find_charges(terms, dimension, sites, ring)
    return SymmetryReport(
        model=model,
        rotation=rotation,
        terms=terms,
        constant=_constant(model),
        charges=charges,
        translation=translation,
        point=find_point_symmetries(terms, sites, dimension, ring, site_centred=site_centred),
        transpositions=find_point_symmetries(
            terms, sites, dimension, ring, site_centred=site_centred, transpose=True
        ),
        hermiticity=DiscreteSymmetry("Hermiticity", hermiticity, residual),
        unresolved=unresolved_symmetries(terms, charges, weak, dimension, sublattices),
    )
