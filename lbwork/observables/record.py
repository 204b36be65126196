"""Everything that is read off a density matrix in one record."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from typing import Any

import numpy as np

from lbwork.generator import Lindbladian
from lbwork.model import Model
from lbwork.observables.closeness import Closeness, closeness
from lbwork.observables.cost import entanglement_cost
from lbwork.observables.currents import spin_currents
from lbwork.observables.energy import energy_continuity_error, energy_currents
from lbwork.observables.entanglement import logarithmic_negativity, operator_entanglement
from lbwork.observables.entropies import (
    left_entropies,
    purity,
    renyi_two,
    von_neumann_entropy,
)
from lbwork.observables.local import (
    expectation,
    require_state_shape,
    spin_correlations,
    spin_profile,
)

__all__ = ["Observables", "observables_of"]


@dataclass(frozen=True, eq=False)
class Observables:
    """What :func:`observables_of` reads off a state; arrays are float64, logarithms natural.

    profile (3, L): ``<2 S^x>``, ``<2 S^y>``, ``<2 S^z>``; correlations (3, L, L): connected, of the
    same. spin_current, spin_sources, spin_reason: see :mod:`lbwork.observables.currents`.
    energy_density, energy_current, energy_sources, energy_reason: see
    :mod:`lbwork.observables.energy`; energy_continuity: error of the continuity equation. purity
    and renyi_two: of the state. None when not asked for: entropy (von Neumann) of the state and,
    per cut (L-1,), left_entropy and left_renyi_two of sites 1..l, operator_entropy and
    operator_rank of the state as a vector, negativity. expectations and closeness: of the
    operators and references given.
    """

    profile: np.ndarray
    correlations: np.ndarray
    spin_current: np.ndarray | None
    spin_sources: np.ndarray
    spin_reason: str
    energy_density: np.ndarray
    energy_current: np.ndarray | None
    energy_sources: np.ndarray
    energy_reason: str
    energy_continuity: float | None
    purity: float
    renyi_two: float
    entropy: float | None
    left_entropy: np.ndarray | None
    left_renyi_two: np.ndarray | None
    operator_entropy: np.ndarray | None
    operator_rank: np.ndarray | None
    negativity: np.ndarray | None
    expectations: Mapping[str, complex]
    closeness: Mapping[str, Closeness]

    def to_dict(self) -> dict[str, Any]:
        """A JSON document; complex numbers as [re, im]."""

        def plain(values: np.ndarray | None) -> list[Any] | None:
            return None if values is None else values.tolist()

        return {
            "profile": dict(zip("xyz", self.profile.tolist(), strict=True)),
            "correlations": dict(zip("xyz", self.correlations.tolist(), strict=True)),
            "spin_current": plain(self.spin_current),
            "spin_sources": plain(self.spin_sources),
            "spin_reason": self.spin_reason,
            "energy_density": plain(self.energy_density),
            "energy_current": plain(self.energy_current),
            "energy_sources": plain(self.energy_sources),
            "energy_reason": self.energy_reason,
            "energy_continuity": self.energy_continuity,
            "purity": self.purity,
            "renyi_two": self.renyi_two,
            "entropy": self.entropy,
            "left_entropy": plain(self.left_entropy),
            "left_renyi_two": plain(self.left_renyi_two),
            "operator_entropy": plain(self.operator_entropy),
            "operator_rank": plain(self.operator_rank),
            "negativity": plain(self.negativity),
            "expectations": {
                name: [value.real, value.imag] for name, value in self.expectations.items()
            },
            "closeness": {name: asdict(value) for name, value in self.closeness.items()},
        }

    def __str__(self) -> str:
        def row(values: np.ndarray) -> str:
            return "  ".join(f"{value:+.6f}" for value in values)

        rows = [(f"profile {name}", row(self.profile["xyz".index(name)])) for name in "xyz"]
        for name, current, reason in (
            ("spin current", self.spin_current, self.spin_reason),
            ("energy current", self.energy_current, self.energy_reason),
        ):
            rows.append((name, f"none: {reason}" if current is None else row(current)))
        if self.energy_continuity is not None:
            rows.append(("energy continuity", f"{self.energy_continuity:.1e}"))
        rows.append(("purity", f"{self.purity:.9g}"))
        rows.append(("second Renyi entropy", f"{self.renyi_two:.9g}"))
        if self.entropy is not None:
            rows.append(("von Neumann entropy", f"{self.entropy:.9g}"))
        for name, values in (
            ("entropy of left part", self.left_entropy),
            ("second Renyi, left part", self.left_renyi_two),
            ("operator entanglement", self.operator_entropy),
            ("Schmidt rank", self.operator_rank),
            ("logarithmic negativity", self.negativity),
        ):
            if values is not None:
                whole = values.dtype.kind == "i"
                rows.append((name, "  ".join(str(v) for v in values) if whole else row(values)))
        rows += [(name, f"{value:.10g}") for name, value in self.expectations.items()]
        rows += [
            (
                f"against {name}",
                f"fidelity {item.fidelity:.9g}, trace distance {item.trace_distance:.9g}, "
                f"overlap {item.overlap:.9g}, alignment {item.alignment:.9g}",
            )
            for name, item in self.closeness.items()
        ]
        width = max(len(name) for name, _ in rows)
        return "\n".join(f"  {name:<{width}}  {value}" for name, value in rows)


def observables_of(
    model: Model,
    density: np.ndarray,
    *,
    entanglement: bool = True,
    operators: Mapping[str, tuple[np.ndarray, tuple[int, ...]]] | None = None,
    references: Mapping[str, np.ndarray] | None = None,
) -> Observables:
    """Profiles, currents, entropies and entanglement of a density matrix (D, D), steady or not.

    ``operators``: by name, matrices (d**k, d**k) on 0-based sites; ``references``: by name, density
    matrices to compare with. Without ``entanglement`` everything per cut and the entropy are left
    out; :func:`lbwork.observables.entanglement_cost` says what they cost. Raises CapacityError
    when they do not fit in memory, UsageError for shapes that are not those of the model.
    """
    count, dimension = model.sites, model.local_dimension
    require_state_shape(density, count, dimension)
    for state in (references or {}).values():
        require_state_shape(state, count, dimension)
    if entanglement:
        entanglement_cost(count, dimension).require_fit()
    # The short work comes first, so that an operator that does not fit is refused at once.
    expectations = {
        name: expectation(density, operator, sites, count, dimension)
        for name, (operator, sites) in (operators or {}).items()
    }
    spin = spin_currents(model, density)
    energy = energy_currents(model, density)
    known = energy.current is not None
    continuity = energy_continuity_error(Lindbladian(model), density, energy) if known else None
    cuts = left_entropies(density, count, dimension) if entanglement else None
    entropies, ranks = (
        operator_entanglement(density, count, dimension) if entanglement else (None, None)
    )
    return Observables(
        profile=spin_profile(density, count, dimension),
        correlations=spin_correlations(density, count, dimension),
        spin_current=spin.current,
        spin_sources=spin.sources,
        spin_reason=spin.reason,
        energy_density=energy.density,
        energy_current=energy.current,
        energy_sources=energy.sources,
        energy_reason=energy.reason,
        energy_continuity=continuity,
        purity=purity(density),
        renyi_two=renyi_two(density),
        entropy=von_neumann_entropy(density) if entanglement else None,
        left_entropy=None if cuts is None else cuts.von_neumann,
        left_renyi_two=None if cuts is None else cuts.renyi_two,
        operator_entropy=entropies,
        operator_rank=ranks,
        negativity=logarithmic_negativity(density, count, dimension) if entanglement else None,
        expectations=expectations,
        closeness={name: closeness(density, state) for name, state in (references or {}).items()},
    )
