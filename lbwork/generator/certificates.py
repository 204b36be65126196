"""Proof that a generator is of Lindblad form, recomputed from its local superoperators."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from lbwork import defaults
from lbwork.generator.terms import SuperTerm, superoperator_terms
from lbwork.model import Model

__all__ = ["GeneratorCertificate", "certify_generator"]


@dataclass(frozen=True)
class GeneratorCertificate:
    """Three defects of a generator, all relative to its size.

    ``trace_error``: largest ``||1^dag L_term||``; ``hermiticity_error``: largest
    ``||S L_term* S - L_term||`` with S the swap of ket and bra; ``dissipator_min_eigenvalue``:
    smallest eigenvalue of the dissipator matrix, which must not be negative (V. Gorini,
    A. Kossakowski, E. Sudarshan, J. Math. Phys. 17, 821 (1976); G. Lindblad, Commun. Math. Phys.
    48, 119 (1976)).
    """

    trace_error: float
    hermiticity_error: float
    dissipator_min_eigenvalue: float

    @property
    def certified(self) -> bool:
        """True when all three are within tolerance."""
        return (
            self.trace_error <= defaults.GENERATOR_TOLERANCE
            and self.hermiticity_error <= defaults.GENERATOR_TOLERANCE
            and self.dissipator_min_eigenvalue >= -defaults.GENERATOR_TOLERANCE
        )

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of the numbers and the judgement."""
        return {
            "trace_error": self.trace_error,
            "hermiticity_error": self.hermiticity_error,
            "dissipator_min_eigenvalue": self.dissipator_min_eigenvalue,
            "certified": self.certified,
        }


def _split(term: SuperTerm, dimension: int) -> np.ndarray:
    """Matrix with rows (kets, bras) instead of interleaved digits, as (D, D, D, D) tensor."""
    count = len(term.sites)
    tensor = term.matrix.reshape((dimension,) * (4 * count))
    order = [*range(0, 2 * count, 2), *range(1, 2 * count, 2)]
    tensor = tensor.transpose([*order, *(2 * count + axis for axis in order)])
    return tensor.reshape((dimension**count,) * 4)


def _dissipator_minimum(tensor: np.ndarray) -> float:
    """Smallest eigenvalue of the Choi matrix of a local term, off the identity direction.

    The Choi matrix ``C[(a c), (b d)] = <a| L(|c><d|) |b>`` of ``rho -> A rho + rho A^dag + jumps``
    is positive on the orthogonal complement of ``vec(1)`` exactly when the jump part is.
    """
    size = tensor.shape[0]
    choi = tensor.transpose(0, 2, 1, 3).reshape(size**2, size**2)
    identity = np.eye(size).ravel() / np.sqrt(size)
    projector = np.eye(size**2) - np.outer(identity, identity)
    projected = projector @ choi @ projector
    return float(np.linalg.eigvalsh((projected + projected.conj().T) / 2)[0])


def certify_generator(model: Model) -> GeneratorCertificate:
    """Check every local superoperator of a model; the sum inherits each property."""
    dimension = model.local_dimension
    trace_error = hermiticity_error = 0.0
    smallest = 0.0
    checked: set[bytes] = set()
    terms = superoperator_terms(model)
    scale = max((float(np.linalg.norm(term.matrix)) for term in terms), default=1.0) or 1.0
    for term in terms:
        key = term.matrix.tobytes()
        if key in checked:
            continue
        checked.add(key)
        tensor = _split(term, dimension)
        traced = np.einsum("aacd->cd", tensor)
        trace_error = max(trace_error, float(np.linalg.norm(traced)) / scale)
        swapped = tensor.transpose(1, 0, 3, 2).conj()
        hermiticity_error = max(hermiticity_error, float(np.linalg.norm(swapped - tensor)) / scale)
        smallest = min(smallest, _dissipator_minimum(tensor) / scale)
    return GeneratorCertificate(trace_error, hermiticity_error, smallest)
