"""The list of symmetry sectors of a model: labels, sizes and how many copies each stands for.

Charge sectors that symmetries (or Hermiticity, with complex conjugation) map onto each other have
the same spectrum: one of each orbit is kept. Within it a maximal commuting set of the remaining
operations gives the irreps, and irreps related by what is left are again represented once.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from lbwork.errors import SymmetryError
from lbwork.symmetry.characters import (
    AbelianGroup,
    GroupGenerator,
    group_from_generators,
    irrep_dimensions,
    traces_by_label,
)
from lbwork.symmetry.charges import ChargeLabel, charge_sectors, label_text, labels_of
from lbwork.symmetry.monomials import MonomialMap, compose, identity_map
from lbwork.symmetry.orbits import (
    action_on_irreps,
    choose_generators,
    is_independent,
    square_on_irreps,
    translation_generator,
)
from lbwork.symmetry.report import SymmetryReport

__all__ = ["Sector", "list_sectors"]


@dataclass(frozen=True, eq=False)
class Sector:
    """One symmetry sector, standing for ``multiplicity`` sectors related to it by symmetry.

    ``conjugates`` of these carry the complex-conjugated spectrum. ``self_conjugate`` sectors have a
    real matrix in a Hermitian basis. ``transposition`` is ``symmetric``, ``antisymmetric`` or
    ``none``: how a transposition symmetry acts inside the sector. ``irrep`` gives the eigenvalue
    ``exp(2 pi i irrep / order)`` of each generator.
    """

    index: int
    label: str
    dimension: int
    multiplicity: int
    conjugates: int
    self_conjugate: bool
    transposition: str
    charge_label: ChargeLabel
    generators: tuple[GroupGenerator, ...]
    irrep: tuple[int, ...]
    reality: MonomialMap | None = field(repr=False, default=None)
    transposition_map: MonomialMap | None = field(repr=False, default=None)

    def to_dict(self) -> dict[str, Any]:
        """A JSON document of label, sizes and kind."""
        return {
            "index": self.index,
            "label": self.label,
            "dimension": self.dimension,
            "multiplicity": self.multiplicity,
            "conjugates": self.conjugates,
            "self_conjugate": self.self_conjugate,
            "transposition": self.transposition,
        }


def _irrep_text(generator: GroupGenerator, value: int, sites: int) -> str:
    if "translation" in generator.name:
        if value == 0:
            return f"momentum 0 of {generator.order}"
        return f"momentum {value} of {generator.order}"
    if generator.order == 2:
        return f"{generator.name} {'+1' if value == 0 else '-1'}"
    return f"{generator.name} {value}/{generator.order}"


def _label_of(report: SymmetryReport, operation: MonomialMap, state: np.ndarray) -> ChargeLabel:
    digits, _ = operation.apply(state[None, :])
    return tuple(int(value) for value in labels_of(report.charges, digits)[0])


def _label_orbits(
    report: SymmetryReport, sizes: dict[ChargeLabel, tuple[int, tuple[int, ...]]]
) -> Iterator[tuple[ChargeLabel, int, int]]:
    """(representative, size of its orbit, how many members are conjugates)."""
    operations = [item.operation for item in report.symmetries] + [report.hermiticity.operation]
    seen: dict[ChargeLabel, bool] = {}
    for label in sorted(sizes, key=lambda item: (sum(abs(value) for value in item), item)):
        if label in seen:
            continue
        seen[label] = False
        orbit, pending = [label], [label]
        while pending:
            current = pending.pop()
            state = np.array(sizes[current][1])
            for operation in operations:
                image = _label_of(report, operation, state)
                if image not in seen:
                    seen[image] = seen[current] != operation.antilinear
                    orbit.append(image)
                    pending.append(image)
        yield label, len(orbit), sum(seen[member] for member in orbit)


class _SectorFamily:
    """All irreps of one charge sector under its commuting set, and the relations among them."""

    def __init__(self, report: SymmetryReport, label: ChargeLabel, state: np.ndarray) -> None:
        self.report = report
        self.label = label
        self.state = state
        self.sites = report.model.sites
        shifts = self._shifts()
        self.translation = shifts[-1] if report.translation else None
        coset = [identity_map(self.sites, report.base)] + [m for _, m in shifts[:-1]]
        self.linear = [
            (self._coset_name(item.name, number), compose(shift, item.operation))
            for item in report.point
            for number, shift in enumerate(coset)
        ]
        self.linear = [
            (name, operation)
            for name, operation in self.linear
            if _label_of(report, operation, state) == label
        ]
        hermiticity = report.hermiticity.operation
        everything = [
            compose(shift, operation)
            for operation in (
                identity_map(self.sites, report.base),
                *(item.operation for item in report.point),
            )
            for shift in coset
        ]
        self.antilinear = [
            operation
            for operation in (compose(hermiticity, other) for other in everything)
            if _label_of(report, operation, state) == label
        ]
        conjugated = [
            MonomialMap(
                item.operation.site_map, item.operation.digit_map, item.operation.signs, True
            )
            for item in report.transpositions
        ]
        self.transpositions = [
            operation
            for operation in (compose(shift, item) for item in conjugated for shift in coset)
            if _label_of(report, operation, state) == label
        ]

    @staticmethod
    def _coset_name(name: str, number: int) -> str:
        return name if number == 0 else f"{name} and shift by {number}"

    def _shifts(self) -> list[tuple[str, MonomialMap]]:
        """Powers of the translation up to the first that keeps the charge sector."""
        if self.report.translation is None:
            return []
        step = self.report.translation.operation
        powers = [(self.report.translation.name, step)]
        while _label_of(self.report, powers[-1][1], self.state) != self.label:
            count = len(powers) + 1
            powers.append((f"translation, power {count}", compose(step, powers[-1][1])))
        return powers

    def groups(self) -> tuple[AbelianGroup, AbelianGroup | None]:
        """The commuting set for general momentum, and the larger one where momentum is 0 or pi."""
        base = self.report.base
        shift = None
        if self.translation is not None:
            shift = translation_generator(*self.translation, self.state)
        if shift is None:
            chosen = choose_generators([], self.linear, self.state)
            return group_from_generators(chosen, self.sites, base), None
        on_site = [item for item in self.linear if not item[1].moves_sites]
        general = choose_generators([shift], on_site, self.state)
        group = group_from_generators(general, self.sites, base)
        return group, self._with_reflection(general, group)

    def _with_reflection(
        self, general: Sequence[GroupGenerator], group: AbelianGroup
    ) -> AbelianGroup | None:
        """Add a reflection that commutes with the on-site ones and normalises the translation."""
        base = self.report.base
        for name, operation in self.linear:
            if not operation.moves_sites or operation.permutation_key in group.index_of:
                continue
            picked = choose_generators(general[1:], [(name, operation)], self.state)
            if len(picked) != len(general):
                continue
            if not is_independent(picked[-1], group.index_of, self.sites, base):
                continue
            if action_on_irreps(operation, group, self.state) is not None:
                return group_from_generators([*general, picked[-1]], self.sites, base)
        return None


def _reflected_irreps(general: AbelianGroup, larger: AbelianGroup, state: np.ndarray) -> np.ndarray:
    """True for the irreps of ``general`` that the added reflection maps to themselves."""
    relation = action_on_irreps(larger.generators[-1].operation, general, state)
    if relation is None:
        return np.zeros(len(general.irreps()), dtype=bool)
    return np.asarray(relation.image == np.arange(relation.image.size))


def _classes(
    family: _SectorFamily, group: AbelianGroup, members: np.ndarray
) -> list[tuple[int, int, int]]:
    """Group the irreps ``members`` into classes: (representative, size, conjugates)."""
    operations = [operation for _, operation in family.linear] + family.antilinear
    relations = [
        relation
        for relation in (action_on_irreps(op, group, family.state) for op in operations)
        if relation is not None
    ]
    allowed = set(members.tolist())
    seen: dict[int, bool] = {}
    classes = []
    for start in members.tolist():
        if start in seen:
            continue
        seen[start] = False
        found, pending = [start], [start]
        while pending:
            current = pending.pop()
            for relation in relations:
                image = int(relation.image[current])
                if image in allowed and image not in seen:
                    seen[image] = seen[current] != relation.antilinear
                    found.append(image)
                    pending.append(image)
        classes.append((start, len(found), sum(seen[item] for item in found)))
    return classes


def _involution(
    operations: Sequence[MonomialMap], group: AbelianGroup, state: np.ndarray, irrep: int
) -> tuple[MonomialMap, int] | None:
    """An antilinear operation that keeps the irrep, with its square there (+1 preferred)."""
    fallback = None
    for operation in operations:
        relation = action_on_irreps(operation, group, state)
        if relation is None or relation.image[irrep] != irrep:
            continue
        square = square_on_irreps(operation, group, state)
        if square is None:
            continue
        value = square[irrep]
        if abs(value - 1) < 1e-6:
            return operation, 1
        if abs(value + 1) < 1e-6:
            fallback = operation, -1
    return fallback


def _combined_order(
    general: AbelianGroup, larger: AbelianGroup | None, state: np.ndarray
) -> list[tuple[AbelianGroup, np.ndarray]]:
    """Each group with the irreps it is used for: the larger one where momentum is 0 or pi."""
    everything = np.arange(len(general.irreps()))
    if larger is None:
        return [(general, everything)]
    fixed = _reflected_irreps(general, larger, state)
    order = larger.generators[-1].order
    inside = (everything[fixed][:, None] * order + np.arange(order)[None, :]).ravel()
    return [(larger, inside), (general, everything[~fixed])]


def list_sectors(report: SymmetryReport) -> tuple[Sector, ...]:
    """All sectors of a model, one for each class of related ones, largest charge sectors unsorted.

    Raises SymmetryError when the dimensions times multiplicities do not add up to ``d**(2 L)``.
    """
    sites, base = report.model.sites, report.base
    sizes = charge_sectors(report.charges, sites, base)
    traces: dict[bytes, dict[ChargeLabel, int]] = {}
    sectors: list[Sector] = []
    total = 0
    for label, orbit_size, orbit_conjugates in _label_orbits(report, sizes):
        family = _SectorFamily(report, label, np.array(sizes[label][1]))
        counted = 0
        for group, members in _combined_order(*family.groups(), family.state):
            dimensions = _dimensions(group, label, report, traces, members)
            for representative, size, conjugates in _classes(family, group, members):
                dimension = int(dimensions[representative])
                if dimension == 0:
                    continue
                counted += dimension * size
                mirrored = conjugates * (orbit_size - orbit_conjugates)
                mirrored += (size - conjugates) * orbit_conjugates
                sectors.append(
                    _sector(
                        family,
                        group,
                        representative,
                        dimension,
                        (len(sectors), size * orbit_size, mirrored),
                    )
                )
        if counted != sizes[label][0]:
            raise SymmetryError(
                f"sectors of {label_text(report.charges, label)} hold {counted} states, "
                f"not {sizes[label][0]}"
            )
        total += counted * orbit_size
    if total != base**sites:
        raise SymmetryError(f"sectors hold {total} states, not {base}**{sites}")
    return tuple(sectors)


def _dimensions(
    group: AbelianGroup,
    label: ChargeLabel,
    report: SymmetryReport,
    traces: dict[bytes, dict[ChargeLabel, int]],
    members: np.ndarray,
) -> np.ndarray:
    """Dimensions of the irreps; where reflection is added, valid for ``members`` only."""
    needed = []
    for element in group.elements:
        key = element.permutation_key + element.signs.tobytes()
        if key not in traces:
            traces[key] = traces_by_label(element, report.charges)
        needed.append(traces[key])
    return irrep_dimensions(group, label, needed, members)


def _sector(
    family: _SectorFamily,
    group: AbelianGroup,
    irrep: int,
    dimension: int,
    numbers: tuple[int, int, int],
) -> Sector:
    index, multiplicity, conjugates = numbers
    values = group.irreps()[irrep]
    parts = [label_text(family.report.charges, family.label)] if family.report.charges else []
    parts += [
        _irrep_text(generator, int(value), family.sites)
        for generator, value in zip(group.generators, values, strict=True)
    ]
    reality = _involution(family.antilinear, group, family.state, irrep)
    transposed = _involution(family.transpositions, group, family.state, irrep)
    kinds = {None: "none", 1: "symmetric", -1: "antisymmetric"}
    return Sector(
        index=index,
        label=", ".join(parts) or "whole space",
        dimension=dimension,
        multiplicity=multiplicity,
        conjugates=conjugates,
        self_conjugate=reality is not None and reality[1] == 1,
        transposition=kinds[transposed[1] if transposed else None],
        charge_label=family.label,
        generators=group.generators,
        irrep=tuple(int(value) for value in values),
        reality=reality[0] if reality is not None and reality[1] == 1 else None,
        transposition_map=transposed[0] if transposed else None,
    )
