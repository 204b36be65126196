"""All diagonal symmetries of a generator, continuous and cyclic, from integer linear algebra.

A product of on-site phases ``exp(2 pi i c_j(a_j))`` commutes with L when every transition
``b -> a`` between basis states that L contains satisfies ``sum_j c_j(a_j) - c_j(b_j) = 0 mod 1``.
The transitions are integer vectors, so the group of all solutions is the dual of
``Z**n / span(transitions)``; its free part are U(1) charges, its torsion cyclic ones (parities).
Phases may differ between the two sublattices (odd and even sites).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from lbwork.symmetry.canonical import CanonicalTerms, local_digits, sublattice_count
from lbwork.symmetry.integer_lattice import quotient_group

__all__ = ["Charge", "ChargeLabel", "charge_sectors", "find_charges", "label_text", "labels_of"]

ChargeLabel = tuple[int, ...]
"""One integer per charge: the sum over sites of its values, modulo its modulus."""


@dataclass(frozen=True, eq=False)
class Charge:
    """A conserved diagonal quantity ``sum_j values[j, a_j]`` (mod ``modulus`` when it is not 0).

    ``values`` is an int64 array (L, d**2). ``offset`` and ``scale`` turn the sum into the number a
    person reads: ``offset + scale * sum``. ``kind`` is ``strong ket``, ``strong bra``, ``weak`` or
    ``superoperator`` (conserved by the generator but not of the form ket plus bra).
    """

    name: str
    kind: str
    values: np.ndarray
    modulus: int
    offset: float = 0.0
    scale: float = 1.0

    def text(self, label: int) -> str:
        """The value in words, e.g. ``ket S^z = -1/2``."""
        if self.modulus:
            return f"{self.name} = {label} mod {self.modulus}"
        number = self.offset + self.scale * label
        doubled = round(2 * number)
        shown = str(doubled // 2) if doubled % 2 == 0 else f"{doubled}/2"
        return f"{self.name} = {shown}"


def label_text(charges: Sequence[Charge], label: ChargeLabel) -> str:
    """All charges of a sector in words; ``no charge`` when there is none."""
    parts = [charge.text(value) for charge, value in zip(charges, label, strict=True)]
    return ", ".join(parts) if parts else "no charge"


def _transition_rows(terms: CanonicalTerms, base: int, sublattices: int) -> np.ndarray:
    """Distinct relations ``e(a) - e(b)``, one row per kind of transition; digit 0 is the gauge."""
    width = sublattices * (base - 1)
    found: set[bytes] = set()
    for support, matrix in terms.items():
        threshold = 1e-12 * np.abs(matrix).max()
        rows, columns = np.nonzero(np.abs(matrix) > threshold)
        moving = rows != columns
        digits = local_digits(base, len(support))
        relation = np.zeros((int(moving.sum()), sublattices, base), dtype=np.int64)
        index = np.arange(relation.shape[0])
        for position, site in enumerate(support):
            # Each row index occurs once per position, so plain indexing adds without collisions.
            relation[index, site % sublattices, digits[rows[moving], position]] += 1
            relation[index, site % sublattices, digits[columns[moving], position]] -= 1
        flat = np.ascontiguousarray(relation[:, :, 1:].reshape(-1, width))
        found.update(row.tobytes() for row in np.unique(flat, axis=0))
    rows_found = [np.frombuffer(row, dtype=np.int64) for row in sorted(found)]
    return np.array(rows_found, dtype=np.int64).reshape(len(rows_found), width)


def _named_candidates(
    dimension: int, sublattices: int
) -> Iterator[tuple[str, str, np.ndarray, int]]:
    """Familiar charges in the order in which they are preferred: (name, kind, values, modulus)."""
    ket, bra = np.divmod(np.arange(dimension**2), dimension)
    uniform = [
        ("ket S^z", "strong ket", -ket, 0),
        ("bra S^z", "strong bra", -bra, 0),
        ("S^z difference", "weak", bra - ket, 0),
    ]
    if dimension > 2:
        for level in range(1, dimension):
            uniform.append((f"ket level {level}", "strong ket", (ket == level) * 1, 0))
            uniform.append((f"bra level {level}", "strong bra", (bra == level) * 1, 0))
            difference = (ket == level) * 1 - (bra == level) * 1
            uniform.append((f"level {level} difference", "weak", difference, 0))
    for modulus in range(dimension, 1, -1):
        word = "parity" if modulus == 2 else f"Z{modulus} charge"
        uniform.append((f"ket {word}", "strong ket", ket, modulus))
        uniform.append((f"bra {word}", "strong bra", bra, modulus))
        uniform.append((f"joint {word}", "weak", ket - bra, modulus))
    uniform.append(("coherences", "superoperator", (ket != bra) * 1, 0))
    uniform.append(("coherence parity", "superoperator", (ket != bra) * 1, 2))
    for name, kind, values, modulus in uniform:
        yield name, kind, np.tile(values, (sublattices, 1)), modulus
    if sublattices == 2:
        for name, kind, values, modulus in uniform:
            odd_sites = np.zeros((2, dimension**2), dtype=np.int64)
            odd_sites[0] = values
            yield f"{name} (odd sites)", kind, odd_sites, modulus


def _is_conserved(rows: np.ndarray, values: np.ndarray, modulus: int) -> bool:
    relative = (values - values[:, :1])[:, 1:].ravel()
    change = rows @ relative
    return not np.any(change % modulus if modulus else change)


def find_charges(
    terms: CanonicalTerms, dimension: int, sites: int, ring: bool
) -> tuple[Charge, ...]:
    """The finest set of diagonal charges of a generator, familiar ones first.

    On a ring with an odd number of sites there are no sublattices, only uniform charges are sought.
    Familiar charges are kept as long as each splits the sectors further; what they leave unresolved
    is completed with charges read off the Smith normal form, so that together they are complete.
    """
    base = dimension**2
    sublattices = sublattice_count(sites, ring)
    rows = _transition_rows(terms, base, sublattices)
    group = quotient_group(rows)
    transform = np.zeros((sublattices, base, len(group.moduli)), dtype=np.int64)
    transform[:, 1:, :] = group.transform.reshape(sublattices, base - 1, -1)
    pattern = np.arange(sites) % sublattices
    complete = [
        Charge(f"charge {index + 1}", "superoperator", transform[pattern, :, index], modulus)
        for index, modulus in enumerate(group.moduli)
    ]
    wanted = len(charge_sectors(complete, sites, base))
    chosen: list[Charge] = []
    count = 1
    for name, kind, values, modulus in _named_candidates(dimension, sublattices):
        if count == wanted:
            return tuple(chosen)
        if not _is_conserved(rows, values, modulus):
            continue
        spin = (dimension - 1) / 2
        offset = 0.0
        if name in ("ket S^z", "bra S^z"):
            offset = spin * sites
        elif name in ("ket S^z (odd sites)", "bra S^z (odd sites)"):
            offset = spin * ((sites + 1) // 2)
        candidate = Charge(name, kind, values[pattern], modulus, offset)
        refined = len(charge_sectors([*chosen, candidate], sites, base))
        if refined > count:
            chosen.append(candidate)
            count = refined
    for candidate in complete:
        if count == wanted:
            break
        refined = len(charge_sectors([*chosen, candidate], sites, base))
        if refined > count:
            chosen.append(candidate)
            count = refined
    return tuple(chosen)


def labels_of(charges: Sequence[Charge], digits: np.ndarray) -> np.ndarray:
    """Charge labels of basis states: ``digits`` (n, L) -> int64 array (n, number of charges)."""
    columns = np.arange(digits.shape[1])
    labels = np.zeros((digits.shape[0], len(charges)), dtype=np.int64)
    for index, charge in enumerate(charges):
        total = charge.values[columns, digits].sum(axis=1)
        labels[:, index] = total % charge.modulus if charge.modulus else total
    return labels


def charge_sectors(
    charges: Sequence[Charge], sites: int, base: int
) -> dict[ChargeLabel, tuple[int, tuple[int, ...]]]:
    """Sizes of all charge sectors without listing states: label -> (size, digits of one state).

    Grows the chain site by site; the cost is sites x sectors x base.
    """
    sectors: dict[ChargeLabel, tuple[int, tuple[int, ...]]] = {(0,) * len(charges): (1, ())}
    moduli = [charge.modulus for charge in charges]
    for site in range(sites):
        steps = [
            tuple(int(charge.values[site, digit]) for charge in charges) for digit in range(base)
        ]
        grown: dict[ChargeLabel, tuple[int, tuple[int, ...]]] = {}
        for label, (size, state) in sectors.items():
            for digit, step in enumerate(steps):
                target = tuple(
                    (value + change) % modulus if modulus else value + change
                    for value, change, modulus in zip(label, step, moduli, strict=True)
                )
                if target in grown:
                    known, example = grown[target]
                    grown[target] = (known + size, example)
                else:
                    grown[target] = (size, (*state, digit))
        sectors = grown
    return sectors
