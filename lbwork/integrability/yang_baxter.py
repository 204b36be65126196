"""Does an R-matrix satisfy the relations that make a density integrable, and is it its density?

With sites as indices and ``R(u, u) = P``:

Yang-Baxter     R12(u,v) R13(u,w) R23(v,w) = R23(v,w) R13(u,w) R12(u,v)
unitarity       R12(u,v) R21(v,u) ~ 1
Sutherland      [R13 R23, Q12(u)] = R13' R23 - R13 R23',  ' = d/du, all R at (u, v)
                [R13 R12, Q23(v)] = R13 R12' - R13' R12,  ' = d/dv
density         Q(u) = P dR(u,v)/du at v = u

C. Yang, Phys. Rev. Lett. 19, 1312 (1967); R. Baxter, Ann. Phys. 70, 193 (1972); B. Sutherland,
J. Math. Phys. 11, 3183 (1970); all from memory, the relations as derived by differentiation of the
first at coinciding parameters.
"""

from __future__ import annotations

import html
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from lbwork import defaults
from lbwork.errors import UsageError
from lbwork.integrability.density import LocalDensity, local_density
from lbwork.integrability.r_matrix import RMatrix, ThreeSites, permutation
from lbwork.model import Model

__all__ = ["Relation", "YangBaxterReport", "yang_baxter_residual"]


@dataclass(frozen=True)
class Relation:
    """One relation: the largest relative distance of its two sides over the points."""

    name: str
    residual: float

    @property
    def holds(self) -> bool:
        """Whether the residual is below ``YANG_BAXTER_TOLERANCE``."""
        return self.residual < defaults.YANG_BAXTER_TOLERANCE

    def __str__(self) -> str:
        word = "holds" if self.holds else "FAILS"
        return f"{self.name:<28}{word}  {self.residual:.2e}"


@dataclass(frozen=True)
class YangBaxterReport:
    """Relations of an R-matrix in the order in which they should be looked at.

    ``factor``: ``Q(u0) = factor * q`` up to identity and telescoping parts, None without a density.
    ``mirrored``: whether the density fits only after exchange of left and right. ``points``: number
    of random points.
    """

    name: str
    relations: tuple[Relation, ...]
    factor: complex | None
    mirrored: bool
    points: int

    @property
    def passed(self) -> bool:
        """Whether every relation holds."""
        return all(relation.holds for relation in self.relations)

    def residual(self, name: str) -> float:
        """Residual of a relation by name; UsageError for an unknown one."""
        for relation in self.relations:
            if relation.name == name:
                return relation.residual
        known = ", ".join(relation.name for relation in self.relations)
        raise UsageError(f"no relation '{name}' was checked; there are {known}")

    @property
    def sentence(self) -> str:
        """Which relations fail and by how much."""
        failing = [relation for relation in self.relations if not relation.holds]
        if not failing:
            mirrored = " (left and right exchanged)" if self.mirrored else ""
            return f"all relations hold{mirrored}"
        words = [f"{relation.name} fails by {relation.residual:.1e}" for relation in failing]
        return "; ".join(words)

    def to_dict(self) -> dict[str, Any]:
        """A JSON document."""
        return {
            "name": self.name,
            "relations": {relation.name: relation.residual for relation in self.relations},
            "passed": self.passed,
            "factor": None if self.factor is None else [self.factor.real, self.factor.imag],
            "mirrored": self.mirrored,
            "points": self.points,
            "sentence": self.sentence,
        }

    def __str__(self) -> str:
        lines = [f"R-matrix '{self.name}' at {self.points} random points"]
        lines += [f"  {relation}" for relation in self.relations]
        if self.factor is not None:
            lines.append(f"  its density is {self.factor:.6g} times the given one")
        return "\n".join([*lines, f"  {self.sentence}"])

    def _repr_html_(self) -> str:
        rows = "".join(
            f"<tr><td>{html.escape(relation.name)}</td><td>{relation.residual:.2e}</td></tr>"
            for relation in self.relations
        )
        return f"<table><caption>{html.escape(self.sentence)}</caption>{rows}</table>"


def _distance(left: np.ndarray, right: np.ndarray) -> float:
    scale = max(float(np.linalg.norm(left)), float(np.linalg.norm(right)), 1e-300)
    return float(np.linalg.norm(left - right)) / scale


def _off_direction(matrix: np.ndarray, direction: np.ndarray) -> float:
    """Relative distance of a matrix from multiples of another."""
    size = float(np.linalg.norm(matrix))
    part = np.vdot(direction, matrix) / np.vdot(direction, direction)
    return float(np.linalg.norm(matrix - part * direction)) / max(size, 1e-300)


def yang_baxter_residual(
    r_matrix: RMatrix | Callable[[complex, complex], np.ndarray],
    source: Model | LocalDensity | np.ndarray | None = None,
    *,
    at: complex = 0.0,
    points: int = 4,
    spread: float = 0.3,
    center: complex = 0.0,
    seed: int = 0,
    dimension: int | None = None,
) -> YangBaxterReport:
    """Check all relations of an R-matrix at random complex points, and whose density it has.

    ``r_matrix``: an :class:`RMatrix` or a function of u, v (then ``dimension`` n is read off a
    value unless given). ``source``: model or density to compare with ``Q(at)``; ``at`` matters only
    if R is not of difference form. Points are normal with standard deviation ``spread`` around
    ``center`` in real and imaginary part. UsageError for bad arguments or a singular R-matrix;
    NotCertifiedError where R is not analytic.
    """
    if not isinstance(r_matrix, RMatrix):
        if dimension is None:
            dimension = round(np.sqrt(np.asarray(r_matrix(0.1, 0.2)).shape[0]))
        r_matrix = RMatrix(r_matrix, dimension)
    if isinstance(points, bool) or not isinstance(points, int) or points < 1:
        raise UsageError(f"points = {points!r} is not one of 1, 2, ...; give such a number")
    generator = np.random.default_rng(seed)
    shape = (points, 3, 2)
    numbers = center + spread * (generator.normal(size=shape) @ np.array([1, 1j]))
    found: dict[str, float] = {}

    def note(name: str, value: float) -> None:
        found[name] = max(found.get(name, 0.0), value)

    for u, v, w in numbers:
        _check_point(r_matrix, complex(u), complex(v), complex(w), note)
    factor, mirrored = None, False
    if source is not None:
        distance, factor, mirrored = _compare_density(r_matrix, source, complex(at))
        note("density of the model", distance)
    relations = tuple(Relation(name, value) for name, value in found.items())
    return YangBaxterReport(r_matrix.name, relations, factor, mirrored, points)


def _check_point(
    r_matrix: RMatrix, u: complex, v: complex, w: complex, note: Callable[[str, float], None]
) -> None:
    sites, swap = ThreeSites(r_matrix.dimension), permutation(r_matrix.dimension)
    if _off_direction(r_matrix(u, u), np.eye(swap.shape[0])) < defaults.YANG_BAXTER_TOLERANCE:
        raise UsageError(
            f"R-matrix '{r_matrix.name}' is the identity at equal parameters, the braid form; "
            "multiply it with the permutation from the left"
        )
    ruv, ruw, rvw, rvu = r_matrix(u, v), r_matrix(u, w), r_matrix(v, w), r_matrix(v, u)
    left = sites.first(ruv) @ sites.outer(ruw) @ sites.last(rvw)
    right = sites.last(rvw) @ sites.outer(ruw) @ sites.first(ruv)
    note("Yang-Baxter", _distance(left, right))
    note("regularity R(u,u) ~ P", _off_direction(r_matrix(u, u), swap))
    product = ruv @ swap @ rvu @ swap
    note("unitarity", _off_direction(product, np.eye(swap.shape[0])))
    # The Sutherland relations take R(u, u) = P, not a multiple of it, in Q.
    at_u, at_v = r_matrix(u, u), r_matrix(v, v)
    qu = swap @ r_matrix.derivative(u, u, 0) / _multiple(at_u, swap)
    qv = swap @ r_matrix.derivative(v, v, 0) / _multiple(at_v, swap)
    du, dv = r_matrix.derivative(u, v, 0), r_matrix.derivative(u, v, 1)
    scale = float(np.linalg.norm(ruv)) ** 2 * (float(np.linalg.norm(qu)) + 1e-300)
    both = sites.outer(ruv) @ sites.last(ruv)
    q12 = sites.first(qu)
    rest = both @ q12 - q12 @ both - sites.outer(du) @ sites.last(ruv)
    rest += sites.outer(ruv) @ sites.last(du)
    note("Sutherland in u", float(np.linalg.norm(rest)) / scale)
    both = sites.outer(ruv) @ sites.first(ruv)
    q23 = sites.last(qv)
    rest = both @ q23 - q23 @ both - sites.outer(ruv) @ sites.first(dv)
    rest += sites.outer(dv) @ sites.first(ruv)
    note("Sutherland in v", float(np.linalg.norm(rest)) / scale)


def _multiple(matrix: np.ndarray, swap: np.ndarray) -> complex:
    value = complex(np.vdot(swap, matrix) / np.vdot(swap, swap))
    if abs(value) < 1e-12 * float(np.linalg.norm(matrix)):
        raise UsageError(
            "R(u, u) has no part along the permutation, so that it has no density; correct it"
        )
    return value


def _compare_density(
    r_matrix: RMatrix, source: Model | LocalDensity | np.ndarray, at: complex
) -> tuple[float, complex, bool]:
    """Distance of Q(at) from multiples of q, the multiple, and whether q had to be mirrored."""
    n = r_matrix.dimension
    density = local_density(source)
    if density.dimension != n:
        raise UsageError(
            f"R-matrix '{r_matrix.name}' has {n} states per site, the {density} has "
            f"{density.dimension}; for a Hamiltonian pass hamiltonian_density(model)"
        )
    swap = permutation(n)
    matrix = swap @ r_matrix.derivative(at, at, 0) / _multiple(r_matrix(at, at), swap)
    own = LocalDensity(matrix, n, density.doubled, r_matrix.name)
    if own.scale < 1e-12 * float(np.linalg.norm(matrix)):
        raise UsageError(
            f"R-matrix '{r_matrix.name}' has a density without content at u = {at:.3g}"
        )
    results = []
    for mirrored in (False, True):
        given = density.gauge_fixed
        if mirrored:
            given = swap @ given @ swap
        product = complex(np.vdot(given, own.gauge_fixed) / np.vdot(given, given))
        rest = own.gauge_fixed - product * given
        distance = float(np.linalg.norm(rest) / np.linalg.norm(given))
        results.append((distance, product * own.scale / density.scale, mirrored))
    if results[1][0] < 1e-3 * results[0][0]:
        return results[1]
    return results[0]
