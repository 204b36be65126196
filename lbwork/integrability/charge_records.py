"""What a search for conserved charges returns."""

from __future__ import annotations

import html
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np

from lbwork.integrability.commutators import digits_of
from lbwork.integrability.density import LocalDensity

__all__ = ["ConservedCharge", "ConservedCharges"]

_SHOWN_TERMS = 6
_SHOWN_CHARGES = 24


def _number(value: complex) -> str:
    real, imaginary = round(value.real, 6) + 0.0, round(value.imag, 6) + 0.0
    if imaginary == 0:
        return f"{real:.6g}"
    if real == 0:
        return f"{imaginary:.6g}j"
    return f"({real:.6g}{imaginary:+.6g}j)"


@dataclass(frozen=True, eq=False)
class ConservedCharge:
    """``sum_j A_j`` that commutes with the sum of the density on the infinite chain.

    ``codes``: strings over ``length`` sites, see :mod:`lbwork.integrability.strings`. ``values``:
    complex coefficients of the *named* on-site operators (Z, S+, S-, E12, ...; ``ket:bra`` on a
    doubled site), the largest 1. ``acts_on``: ``ket``, ``bra`` or ``ket and bra`` (or ``sites`` for
    a chain that is not doubled). ``weights``: change of the diagonal charges, where these are
    conserved. ``residual``: ``||[Q, A]|| / (||q|| ||A||)`` in canonical coefficients.
    """

    density: LocalDensity
    codes: np.ndarray
    values: np.ndarray
    length: int
    acts_on: str
    name: str
    weights: tuple[tuple[str, int], ...]
    residual: float

    def terms(self, limit: int | None = None) -> str:
        """The density in words, largest coefficients first, e.g. ``S+:I S-:I + ...``."""
        order = np.argsort(-np.round(np.abs(self.values), 9), kind="stable")
        digits = digits_of(self.codes, self.density.basis.size, self.length)
        shown = order if limit is None else order[:limit]
        words = []
        for index in shown:
            number = _number(complex(self.values[index]))
            word = self.density.basis.word(digits[index])
            words.append({"1": "", "-1": "-"}.get(number, f"{number} ") + word)
        rest = order.size - len(words)
        if rest:
            words.append(f"{rest} more")
        return " + ".join(words).replace("+ -", "- ")

    def matrix(self) -> np.ndarray:
        """The density on ``length`` sites: complex (n**length, n**length)."""
        basis = self.density.basis
        tensor = np.zeros((basis.size,) * self.length, dtype=complex)
        digits = digits_of(self.codes, basis.size, self.length)
        tensor[tuple(digits.T)] = self.values * basis.factors[digits].prod(axis=1)
        return basis.matrix(tensor)

    @property
    def label(self) -> str:
        """Name, side and weights in a few words."""
        parts = [self.name or f"range {self.length}", f"on {self.acts_on}"]
        parts += [f"{word} {value:+d}" for word, value in self.weights if value]
        return ", ".join(parts)

    def to_dict(self) -> dict[str, Any]:
        """A JSON document; coefficients as [re, im] beside the strings in words."""
        digits = digits_of(self.codes, self.density.basis.size, self.length)
        return {
            "range": self.length,
            "acts_on": self.acts_on,
            "name": self.name,
            "weights": {word: value for word, value in self.weights},
            "residual": self.residual,
            "terms": [
                [self.density.basis.word(row), float(value.real), float(value.imag)]
                for row, value in zip(digits, self.values, strict=True)
            ],
        }

    def __str__(self) -> str:
        return f"{self.label}: {self.terms(_SHOWN_TERMS)}"


@dataclass(frozen=True, eq=False)
class ConservedCharges:
    """All conserved operators of range up to ``max_range``.

    ``dimensions[k - 1]``: dimension of those of range up to k. ``charges``: a basis, shortest
    first; empty from the range on where there are too many to list (``listed_range`` is the last
    range listed). ``residual``: largest residual in the basis. ``margin``: singular values (largest
    counted as zero, smallest not) of what was left to decide, relative to their norm. ``methods``:
    one word per range, ``elimination`` or ``leading parts``.
    """

    density: LocalDensity
    max_range: int
    dimensions: tuple[int, ...]
    charges: tuple[ConservedCharge, ...]
    listed_range: int
    residual: float
    margin: tuple[float, float]
    methods: tuple[str, ...]

    @property
    def increments(self) -> tuple[int, ...]:
        """New conserved operators at each range."""
        return tuple(int(step) for step in np.diff(self.dimensions, prepend=0))

    @property
    def growth(self) -> str:
        """``tower``, ``fragmented``, ``none``, ``irregular`` or ``too short``.

        tower: something new at every range from 2 on. none: nothing new from range 3 on.
        fragmented: the number of new operators grows at least threefold with every range from 2 on
        and exceeds 20, as for a space that falls apart into exponentially many pieces.
        """
        new = self.increments[1:]
        if len(new) < 2:
            return "too short"
        if new[-1] > 20 and all(after >= 3 * step > 0 for step, after in pairwise(new)):
            return "fragmented"
        if all(step > 0 for step in new):
            return "tower"
        if not any(new[1:]):
            return "none"
        return "irregular"

    @property
    def sentence(self) -> str:
        """What the growth means, in one sentence."""
        listed = ", ".join(str(dimension) for dimension in self.dimensions)
        meaning = {
            "tower": "a new charge at every range, the sign of integrability",
            "fragmented": (
                "exponentially many conserved operators: the space is fragmented, which by itself "
                "is no sign of integrability"
            ),
            "none": "no charge beyond range two, as in a generic chain",
            "irregular": "new charges at some ranges only; look at longer ones",
            "too short": "look at range three at least",
        }[self.growth]
        closed = "; ket and bra are counted apart" if self._has_sides else ""
        return f"dimensions {listed} up to range 1..{self.max_range}: {meaning}{closed}"

    @property
    def _has_sides(self) -> bool:
        return any(charge.acts_on in ("ket", "bra") for charge in self.charges)

    def to_dict(self) -> dict[str, Any]:
        """A JSON document with all listed charges."""
        return {
            "density": str(self.density),
            "max_range": self.max_range,
            "dimensions": list(self.dimensions),
            "increments": list(self.increments),
            "growth": self.growth,
            "sentence": self.sentence,
            "listed_range": self.listed_range,
            "residual": self.residual,
            "margin": list(self.margin),
            "methods": list(self.methods),
            "charges": [charge.to_dict() for charge in self.charges],
        }

    def __str__(self) -> str:
        lines = [f"conserved charges, {self.density}", f"  {self.sentence}"]
        lines += [f"  {charge}" for charge in self.charges[:_SHOWN_CHARGES]]
        if len(self.charges) > _SHOWN_CHARGES:
            lines.append(f"  and {len(self.charges) - _SHOWN_CHARGES} more")
        if self.listed_range < self.max_range:
            lines.append(f"  listed up to range {self.listed_range} only")
        lines.append(f"  largest residual {self.residual:.1e}")
        return "\n".join(lines)

    def _repr_html_(self) -> str:
        rows = "".join(
            f"<tr><td>{html.escape(charge.label)}</td><td>"
            f"{html.escape(charge.terms(_SHOWN_TERMS))}</td></tr>"
            for charge in self.charges[:_SHOWN_CHARGES]
        )
        caption = html.escape(f"conserved charges, {self.density}: {self.sentence}")
        return f"<table><caption>{caption}</caption>{rows}</table>"
