"""Everything that is read off a density matrix in one record."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from typing import Any

import numpy as np

from lbwork.errors import CapacityError
from lbwork.generator import Lindbladian
from lbwork.model import Model
from lbwork.observables.energy import energy_continuity_error, energy_currents
from lbwork.observables.entanglement import (
    entanglement_memory,
    left_entropies,
    logarithmic_negativity,
    operator_entanglement,
    renyi_two,
)
from lbwork.observables.local import expectation, spin_profile
from lbwork.observables.reference_states import Closeness, closeness
from lbwork.provenance import usable_memory

__all__ = ["Observables", "observables_of"]


@dataclass(frozen=True, eq=False)
class Observables:
    """profile (3, L): ``<2 S^x>``, ``<2 S^y>``, ``<2 S^z>``. energy_density, energy_current,
    energy_sources, energy_reason: see :mod:`lbwork.observables.energy`; energy_continuity: error of
    the continuity equation. renyi_two: of the state. Per cut, None when not asked for:
    left_entropy and left_renyi_two of sites 1..l, operator_entropy and operator_rank of the state
    as a vector, negativity. expectations and closeness: of the operators and references given."""

    profile: np.ndarray
    energy_density: np.ndarray
    energy_current: np.ndarray | None
    energy_sources: np.ndarray
    energy_reason: str
    energy_continuity: float | None
    renyi_two: float
    left_entropy: np.ndarray | None
    left_renyi_two: np.ndarray | None
    operator_entropy: np.ndarray | None
    operator_rank: np.ndarray | None
    negativity: np.ndarray | None
    expectations: Mapping[str, complex]
    closeness: Mapping[str, Closeness]

    def to_dict(self) -> dict[str, Any]:
        """A JSON document; complex numbers as [re, im]."""

        def plain(values: np.ndarray | None) -> list[float] | None:
            return None if values is None else [float(value) for value in values]

        return {
            "profile": {name: plain(row) for name, row in zip("xyz", self.profile, strict=True)},
            "energy_density": plain(self.energy_density),
            "energy_current": plain(self.energy_current),
            "energy_sources": plain(self.energy_sources),
            "energy_reason": self.energy_reason,
            "energy_continuity": self.energy_continuity,
            "renyi_two": self.renyi_two,
            "left_entropy": plain(self.left_entropy),
            "left_renyi_two": plain(self.left_renyi_two),
            "operator_entropy": plain(self.operator_entropy),
            "operator_rank": (
                None if self.operator_rank is None else [int(rank) for rank in self.operator_rank]
            ),
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
        if self.energy_current is None:
            rows.append(("energy current", f"none: {self.energy_reason}"))
        else:
            rows.append(("energy current", row(self.energy_current)))
            rows.append(("energy continuity", f"{self.energy_continuity:.1e}"))
        rows.append(("second Renyi entropy", f"{self.renyi_two:.9g}"))
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
                f"overlap {item.overlap:.9g}",
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
    """Profiles, energy currents, entropies and entanglement of a density matrix (D, D).

    ``operators``: by name, matrices (d**k, d**k) on 0-based sites; ``references``: by name, density
    matrices to compare with. Raises CapacityError when the entanglement does not fit in memory.
    """
    count, dimension = model.sites, model.local_dimension
    if entanglement and entanglement_memory(count, dimension) > usable_memory():
        needed = entanglement_memory(count, dimension) / 2**30
        raise CapacityError(
            f"the entanglement of {count} sites needs up to {needed:.1f} GiB; leave it out or use "
            "fewer sites"
        )
    energy = energy_currents(model, density)
    cuts = left_entropies(density, count, dimension) if entanglement else None
    entropies, ranks = (
        operator_entanglement(density, count, dimension) if entanglement else (None, None)
    )
    return Observables(
        profile=spin_profile(density, count, dimension),
        energy_density=energy.density,
        energy_current=energy.current,
        energy_sources=energy.sources,
        energy_reason=energy.reason,
        energy_continuity=(
            None
            if energy.current is None
            else energy_continuity_error(Lindbladian(model), density, energy)
        ),
        renyi_two=renyi_two(density),
        left_entropy=None if cuts is None else cuts.von_neumann,
        left_renyi_two=None if cuts is None else cuts.renyi_two,
        operator_entropy=entropies,
        operator_rank=ranks,
        negativity=logarithmic_negativity(density, count, dimension) if entanglement else None,
        expectations={
            name: expectation(density, operator, sites, count, dimension)
            for name, (operator, sites) in (operators or {}).items()
        },
        closeness={name: closeness(density, state) for name, state in (references or {}).items()},
    )
