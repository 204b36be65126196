"""Two-site densities in the form in which every integrability test takes them.

A density q of a sum over bonds is fixed up to multiples of the identity and telescoping parts
``A x 1 - 1 x A`` with A on one site. :class:`LocalDensity` removes both and the scale, so that
nothing computed from it depends on how the density was written.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from lbwork import defaults
from lbwork.errors import ModelError, UsageError
from lbwork.generator import SuperTerm, bulk_two_site_density, superoperator_terms
from lbwork.integrability.strings import (
    CommutatorTable,
    StringBasis,
    commutator_table,
    string_basis,
)
from lbwork.model import Model

__all__ = ["LocalDensity", "hamiltonian_density", "local_density"]

_JUMPS_OUT = "the jumps are left out"


@dataclass(frozen=True, eq=False)
class LocalDensity:
    """``sum_j q_{j,j+1}`` on sites of ``dimension`` n states.

    ``matrix``: q as given, complex128 (n**2, n**2). ``doubled``: each site is ket times bra of a
    site with sqrt(n) states. ``grouped``: physical sites per site of this density. ``note``: what
    of the model is not in it.
    """

    matrix: np.ndarray
    dimension: int
    doubled: bool
    name: str
    grouped: int = 1
    note: str = ""

    @cached_property
    def basis(self) -> StringBasis:
        """The on-site operators."""
        return string_basis(self.dimension, self.doubled)

    @cached_property
    def _fixed(self) -> tuple[np.ndarray, float]:
        tensor = self.basis.coefficients(self.matrix)
        scale = float(np.linalg.norm(tensor))
        tensor[0, 0] = 0
        field = 0.5 * (tensor[1:, 0] + tensor[0, 1:])
        tensor[1:, 0] = field
        tensor[0, 1:] = field
        # Kronecker products leave rounding errors where there is nothing; they would cost the
        # sparsity on which everything here relies.
        tensor[np.abs(tensor) < defaults.GENERATOR_TOLERANCE * 1e-2 * scale] = 0
        return tensor, float(np.linalg.norm(tensor))

    @property
    def coefficients(self) -> np.ndarray:
        """String coefficients (n**2, n**2) of norm one: no identity, fields shared equally."""
        tensor, scale = self._fixed
        return tensor / scale if scale else tensor

    @property
    def scale(self) -> float:
        """``sqrt(tr q^dag q / n**2)`` after gauge fixing; 0 when nothing is left."""
        return self._fixed[1]

    @property
    def gauge_fixed(self) -> np.ndarray:
        """q without identity and telescoping parts, scale one: complex (n**2, n**2)."""
        return self.basis.matrix(self.coefficients)

    @cached_property
    def table(self) -> CommutatorTable:
        """Commutators with the gauge-fixed density."""
        return commutator_table(self.basis, self.coefficients)

    def __str__(self) -> str:
        kind = "superoperator" if self.doubled else "operator"
        note = f" ({self.note})" if self.note else ""
        return f"{kind} density of {self.name}, {self.dimension} states per site{note}"


def _whole_root(number: int) -> int | None:
    root = round(number**0.5)
    return root if root * root == number else None


def _from_matrix(matrix: np.ndarray, doubled: bool | None, name: str) -> LocalDensity:
    array = np.asarray(matrix)
    if array.ndim != 2 or array.shape[0] != array.shape[1]:
        raise UsageError(f"density has shape {array.shape}; give a square matrix")
    n = _whole_root(array.shape[0])
    if n is None or n < 2:
        raise UsageError(
            f"density has {array.shape[0]} rows, which is no square of a number of states >= 2; "
            "give a two-site matrix (n**2, n**2)"
        )
    if not np.all(np.isfinite(array)):
        raise UsageError("density has infinite entries or entries that are not numbers; repair it")
    inner = _whole_root(n)
    if doubled is None:
        doubled = False
    if doubled and (inner is None or inner < 2):
        raise UsageError(
            f"density has {n} states per site, which is no square of a local dimension; pass "
            "doubled=False"
        )
    return LocalDensity(array.astype(complex), n, doubled, name)


def local_density(
    source: Model | LocalDensity | np.ndarray,
    *,
    doubled: bool | None = None,
    name: str = "given matrix",
) -> LocalDensity:
    """The density of a model's generator, or a given two-site matrix (n**2, n**2) as a density.

    Models: n = d**2, order (a1 b1 a2 b2); the bulk of an open chain is taken and the note says what
    is left out. Terms on three sites are allowed: pairs of sites are grouped into one, n = d**4; if
    there are no jumps in the bulk, the Hamiltonian is taken alone, n = d**2.
    Matrices: ``doubled=True`` declares the sites to be ket times bra. Raises ModelError if the
    model (or bulk) is not translation invariant, UsageError for a bad matrix.
    """
    if isinstance(source, LocalDensity):
        return source
    if not isinstance(source, Model):
        return _from_matrix(source, doubled, name)
    terms = superoperator_terms(source)
    base = source.local_dimension**2
    if max(len(term.sites) for term in terms) > 2:
        if not _has_bulk_jumps(source):
            return hamiltonian_density(source)
        return _grouped_density(source, terms, base, True)
    bulk = bulk_two_site_density(source)
    note = bulk.sentence if bulk.left_out else ""
    return LocalDensity(bulk.matrix, base, True, source.name, note=note)


def _has_bulk_jumps(model: Model) -> bool:
    ends = {0, model.sites - 1} if model.boundary == "open" else set()
    return any(not ends & set(jump.sites) for jump in model.placed_jumps())


def hamiltonian_density(model: Model) -> LocalDensity:
    """The Hamiltonian alone as a density on sites of d states, jumps left out.

    Raises ModelError if there is no Hamiltonian or it is not translation invariant.
    """
    terms = tuple(SuperTerm(term.sites, term.matrix) for term in model.placed_hamiltonian())
    if not terms:
        raise ModelError(f"model '{model.name}' has no Hamiltonian; ask for its generator instead")
    base = model.local_dimension
    if max(len(term.sites) for term in terms) > 2:
        return _grouped_density(model, terms, base, False)
    fields, bonds, _ = _uniform_terms(model, terms, base)
    one = np.eye(base)
    note = _JUMPS_OUT if model.placed_jumps() else ""
    matrix = bonds + 0.5 * (np.kron(fields, one) + np.kron(one, fields))
    return LocalDensity(matrix, base, False, f"the Hamiltonian of {model.name}", note=note)


def _uniform_terms(
    model: Model, terms: Iterable[SuperTerm], base: int
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The one-, two- and three-site term that the bulk repeats; ModelError if they vary."""
    ring = model.boundary == "periodic"
    uniform = []
    for width in (1, 2, 3):
        places = [np.zeros((base**width,) * 2, dtype=complex) for _ in range(model.sites)]
        for term in terms:
            if len(term.sites) == width:
                places[term.sites[0]] = places[term.sites[0]] + term.matrix
        last = model.sites - width + 1
        inner = places if ring else places[1 : last - 1] or places[:last]
        scale = max(max(float(np.abs(matrix).max()) for matrix in places), 1e-300)
        for shift, matrix in enumerate(inner):
            if np.abs(matrix - inner[0]).max() > defaults.GENERATOR_TOLERANCE * scale:
                raise ModelError(
                    f"model '{model.name}' is not translation invariant: the {width}-site term at "
                    f"site {shift + (1 if ring else 2)} differs from the one at site "
                    f"{1 if ring else 2}; only uniform chains have a density"
                )
        uniform.append(inner[0] if inner else np.zeros((base**width,) * 2, dtype=complex))
    return uniform[0], uniform[1], uniform[2]


def _grouped_density(
    model: Model, terms: tuple[SuperTerm, ...], base: int, doubled: bool
) -> LocalDensity:
    """Pairs of sites as one: q = half of what is inside 12 and 34, bond 23, triples 123 and 234."""
    site, bond, triple = _uniform_terms(model, terms, base)
    if base**4 > 256:
        raise ModelError(
            f"model '{model.name}' has three-site terms on sites of {base} states; grouped into "
            f"pairs they have {base**2} states, at most 16 are treated"
        )
    one, cell = np.eye(base), np.eye(base**2)
    inside = 0.5 * (bond + np.kron(site, one) + np.kron(one, site))
    matrix = np.kron(inside, cell) + np.kron(cell, inside)
    matrix += np.kron(np.kron(one, bond), one) + np.kron(triple, one) + np.kron(one, triple)
    name = model.name if doubled else f"the Hamiltonian of {model.name}"
    if doubled:
        matrix = _regrouped(matrix, model.local_dimension)
    note = "pairs of sites grouped into one"
    if not doubled and model.placed_jumps():
        note = f"{note}; {_JUMPS_OUT}"
    return LocalDensity(matrix, base**2, doubled, name, grouped=2, note=note)


def _regrouped(matrix: np.ndarray, dimension: int) -> np.ndarray:
    """Order (a1 b1 a2 b2 a3 b3 a4 b4) to (a1 a2 b1 b2 a3 a4 b3 b4): ket and bra of each pair."""
    tensor = matrix.reshape((dimension,) * 16)
    order = [0, 2, 1, 3, 4, 6, 5, 7]
    tensor = tensor.transpose([*order, *(8 + axis for axis in order)])
    return np.ascontiguousarray(tensor).reshape(matrix.shape)
