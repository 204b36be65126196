"""The classical process that a generator contains, if diagonal density matrices stay diagonal.

In a product basis in which they do, the populations obey ``dp/dt = M p`` with M a sum of two-site
matrices. Its integrability is judged by the same condition as that of the whole generator: an
exclusion process may be solvable although the coherences are not.
"""

from __future__ import annotations

import html
from dataclasses import dataclass
from typing import Any

import numpy as np

from lbwork import defaults
from lbwork.errors import UsageError
from lbwork.generator import bulk_two_site_density
from lbwork.integrability.density import LocalDensity, local_density
from lbwork.integrability.markov_chain import MarkovSolution, solve_markov
from lbwork.integrability.markov_names import Transition, process_name, transitions
from lbwork.integrability.product_basis import Leakage, diagonal_basis
from lbwork.integrability.reshetikhin import ReshetikhinResult, reshetikhin_residual
from lbwork.model import Model

__all__ = ["ClassicalSubchain", "classical_subchain"]


@dataclass(frozen=True, eq=False)
class ClassicalSubchain:
    """What became of the diagonal density matrices in the best product basis.

    ``preserved``: whether they stay diagonal; ``leakage``: ``||(1 - P) Q P|| / ||Q||`` on a ring of
    three sites. ``basis``: its name; ``unitary``: complex (d, d), columns are the on-site states.
    ``markov``: float64 (d**2, d**2), columns before, rows after, None unless preserved. ``rates``:
    moves of neighbouring sites. ``probability_error``: largest column sum and ``negative_rate``:
    most negative off-diagonal entry, both over the largest rate. ``name``: of the process.
    ``reshetikhin``: the conditions on ``markov``, None when nothing moves. ``ends``: terms at the
    ends of an open chain, 0 for the first and -1 for the last site, None if these leave the
    diagonal.
    """

    density: LocalDensity
    preserved: bool
    leakage: float
    basis: str
    unitary: np.ndarray
    markov: np.ndarray | None
    rates: dict[Transition, float]
    probability_error: float
    negative_rate: float
    name: str
    reshetikhin: ReshetikhinResult | None
    ends: tuple[tuple[tuple[int, ...], np.ndarray], ...] | None

    @property
    def stochastic(self) -> bool:
        """Whether probability is conserved and no rate is negative."""
        return (
            self.preserved
            and self.probability_error < defaults.SUBCHAIN_TOLERANCE
            and self.negative_rate > -defaults.SUBCHAIN_TOLERANCE
        )

    @property
    def conserves_particles(self) -> bool:
        """Whether all bulk moves are exchanges of neighbours."""
        return all(after == before[::-1] for before, after in self.rates)

    @property
    def sentence(self) -> str:
        """The outcome in one sentence."""
        if not self.preserved:
            return (
                "no product basis was found in which diagonal density matrices stay diagonal; the "
                f"best one, {self.basis}, leaks {self.leakage:.2e}"
            )
        if self.reshetikhin is None:
            return f"diagonal density matrices in the basis {self.basis} do not move"
        form = self.reshetikhin.form
        outcome = f"satisfies the {form} form of the Reshetikhin-type condition"
        if form == "none":
            outcome = "satisfies neither form of the Reshetikhin-type condition"
        return f"in the basis {self.basis}, {self.name}, which {outcome}"

    def solve(
        self,
        sites: int,
        *,
        boundary: str = "periodic",
        particles: int | None = None,
        slowest: bool = True,
    ) -> MarkovSolution:
        """The process on a chain of 3 or more sites, up to 20 of two states.

        A ring of a process that conserves particles is solved at fixed number, half filling unless
        ``particles`` says otherwise. An open chain has the terms at the ends of the model it comes
        from. The gap is left out without ``slowest``: it takes a minute beyond 1e5 states.
        UsageError when there is no process or the ends leave the diagonal.
        """
        if self.markov is None or not self.stochastic:
            raise UsageError(f"there is no classical process to solve: {self.sentence}")
        if boundary not in ("periodic", "open"):
            raise UsageError(f"boundary = {boundary!r} is not known; use periodic or open")
        if isinstance(sites, bool) or not isinstance(sites, int) or sites < 3:
            raise UsageError(f"sites = {sites!r} is no number of sites >= 3; give 3, 4, ...")
        bonds = range(sites if boundary == "periodic" else sites - 1)
        terms: list[tuple[tuple[int, ...], np.ndarray]] = [
            ((bond, (bond + 1) % sites), self.markov) for bond in bonds
        ]
        if boundary == "open":
            if self.ends is None:
                raise UsageError(
                    "the terms at the ends do not keep density matrices diagonal; solve the ring"
                )
            terms += [
                (tuple(place % sites for place in places), matrix) for places, matrix in self.ends
            ]
        dimension = self.unitary.shape[0]
        alone = boundary == "periodic" or not self.ends
        if particles is None and dimension == 2 and self.conserves_particles and alone:
            particles = sites // 2
        return solve_markov(terms, sites, boundary, dimension, particles, slowest)

    def _rates(self) -> list[tuple[str, float]]:
        def word(pair: tuple[int, int]) -> str:
            return "".join(str(digit) for digit in pair)

        return [(f"{word(a)} -> {word(b)}", rate) for (a, b), rate in self.rates.items()]

    def to_dict(self) -> dict[str, Any]:
        """A JSON document."""
        return {
            "density": str(self.density),
            "preserved": self.preserved,
            "leakage": self.leakage,
            "basis": self.basis,
            "unitary": [[[float(z.real), float(z.imag)] for z in row] for row in self.unitary],
            "name": self.name,
            "rates": dict(self._rates()),
            "probability_error": self.probability_error,
            "negative_rate": self.negative_rate,
            "stochastic": self.stochastic,
            "reshetikhin": None if self.reshetikhin is None else self.reshetikhin.to_dict(),
            "sentence": self.sentence,
        }

    def __str__(self) -> str:
        lines = [f"classical sub-chain, {self.density}", f"  {self.sentence}"]
        lines += [f"  {move:<12}rate {rate:.6g}" for move, rate in self._rates()]
        if self.reshetikhin is not None:
            lines.append(
                f"  residuals {self.reshetikhin.difference:.2e} (difference), "
                f"{self.reshetikhin.non_difference:.2e} (non-difference)"
            )
        return "\n".join(lines)

    def _repr_html_(self) -> str:
        rows = "".join(
            f"<tr><td>{html.escape(move)}</td><td>{rate:.6g}</td></tr>"
            for move, rate in self._rates()
        )
        return f"<table><caption>{html.escape(self.sentence)}</caption>{rows}</table>"


def _diagonal_block(
    matrix: np.ndarray, unitary: np.ndarray, count: int
) -> tuple[np.ndarray, float]:
    """Block (d**count, d**count) on diagonal density matrices, and the leakage out of them."""
    dimension = unitary.shape[0]
    site = np.einsum("ka,la->kla", unitary, unitary.conj()).reshape(dimension**2, dimension)
    span = site
    for _ in range(count - 1):
        span = np.kron(span, site)
    image = matrix @ span
    block = span.conj().T @ image
    return block, float(np.linalg.norm(image - span @ block))


def classical_subchain(
    source: Model | LocalDensity | np.ndarray,
    *,
    unitary: np.ndarray | None = None,
    search: bool = True,
    seed: int = 0,
) -> ClassicalSubchain:
    """Find the classical process inside a generator: basis, rates, name, integrability.

    ``unitary``: on-site basis (d, d), columns are states; by default the bases z, x, y are tried
    and then a search over all on-site unitaries. Matrices are taken as densities of doubled sites.
    UsageError for a density that is not of doubled sites or a matrix that is not unitary.
    """
    density = local_density(source, doubled=True)
    if not density.doubled:
        raise UsageError(f"the {density} is no generator; there are no density matrices to follow")
    leakage = Leakage.of(density)
    if unitary is None:
        basis, chosen, share = diagonal_basis(leakage, search=search, seed=seed)
    else:
        chosen = np.asarray(unitary, dtype=complex)
        expected = (leakage.dimension, leakage.dimension)
        if (
            chosen.shape != expected
            or np.abs(chosen.conj().T @ chosen - np.eye(leakage.dimension)).max() > 1e-10
        ):
            raise UsageError(f"basis of shape {chosen.shape} is not a unitary matrix {expected}")
        basis, share = "given", leakage.share(chosen)
    preserved = share < defaults.SUBCHAIN_TOLERANCE
    if not preserved:
        return ClassicalSubchain(
            density, False, share, basis, chosen, None, {}, 0.0, 0.0, "none", None, None
        )
    block, _ = _diagonal_block(density.matrix, chosen, 2)
    markov = np.ascontiguousarray(block.real)
    largest = float(np.abs(markov).max())
    tolerance = defaults.SUBCHAIN_TOLERANCE * max(largest, density.scale)
    markov[np.abs(markov) < tolerance] = 0
    moves = transitions(markov, tolerance)
    scale = max([abs(rate) for rate in moves.values()], default=1.0)
    condition = reshetikhin_residual(
        LocalDensity(markov + 0j, chosen.shape[0], False, f"the classical part of {density.name}")
    )
    return ClassicalSubchain(
        density,
        True,
        share,
        basis,
        chosen,
        markov,
        moves,
        float(np.abs(markov.sum(axis=0)).max()) / scale,
        min([0.0, *moves.values()]) / scale,
        process_name(moves, chosen.shape[0]),
        condition if moves else None,
        _ends(source, chosen),
    )


def _ends(
    source: Model | LocalDensity | np.ndarray, unitary: np.ndarray
) -> tuple[tuple[tuple[int, ...], np.ndarray], ...] | None:
    """Boundary terms of an open chain as Markov matrices; None if they make coherences."""
    if not isinstance(source, Model) or source.boundary == "periodic":
        return ()
    ends = []
    for term in bulk_two_site_density(source).left_out:
        block, leak = _diagonal_block(term.matrix, unitary, len(term.sites))
        if leak > defaults.SUBCHAIN_TOLERANCE * max(float(np.linalg.norm(term.matrix)), 1e-300):
            return None
        places = tuple(
            site - source.sites if site >= source.sites // 2 else site for site in term.sites
        )
        ends.append((places, np.ascontiguousarray(block.real)))
    return tuple(ends)
