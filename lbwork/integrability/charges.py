"""All conserved local operators of a translation-invariant density, range by range.

``A = sum_j a_j`` is conserved when ``[sum_j q_{j,j+1}, A] = 0`` on the infinite chain. For a
generator, A is a superoperator; multiplication of the density matrix from the left or right with a
conserved operator of a closed chain are two different ones. A new charge at every range is the sign
of integrability (M. Grabowski, P. Mathieu, J. Phys. A 28, 4777 (1995), for closed chains; from
memory).
"""

from __future__ import annotations

import numpy as np

from lbwork import defaults
from lbwork.errors import CapacityError, NotCertifiedError, UsageError
from lbwork.integrability.charge_basis import CleanVector, clean_basis
from lbwork.integrability.charge_records import ConservedCharge, ConservedCharges
from lbwork.integrability.commutators import commutator, digits_of
from lbwork.integrability.density import LocalDensity, local_density
from lbwork.integrability.elimination import null_space
from lbwork.integrability.frames import Frame, sparsest_frame
from lbwork.integrability.leading_parts import EndMaps, charges_from_leading_parts, end_maps
from lbwork.integrability.string_vectors import StringVectors, commuted
from lbwork.model import Model

__all__ = ["conserved_charges"]

_METHODS = ("elimination", "leading parts")


def conserved_charges(
    source: Model | LocalDensity | np.ndarray,
    *,
    max_range: int = defaults.CHARGES_RANGE,
    doubled: bool | None = None,
    method: str | None = None,
) -> ConservedCharges:
    """All conserved operators of range up to ``max_range``, with a basis and its residuals.

    ``method``: ``elimination`` works for every density and lists all strings, sparse ones only go
    beyond range 3; ``leading parts`` needs a density whose two-site part commutes with no on-site
    operator on either side, and is then much faster. By default the latter is used where it can be.
    Up to ``CHARGES_LISTED`` charges are listed. Other arguments and errors as in
    :func:`lbwork.integrability.density.local_density`; UsageError for a bad range or method;
    CapacityError when a range is out of reach; NotCertifiedError when a charge fails its residual.
    """
    density = local_density(source, doubled=doubled)
    if isinstance(max_range, bool) or not isinstance(max_range, int) or max_range < 1:
        raise UsageError(
            f"max_range = {max_range!r} is not a whole number of sites; give 1, 2, ..."
        )
    if method is not None and method not in _METHODS:
        raise UsageError(f"method = {method!r} is not known; use one of {', '.join(_METHODS)}")
    if density.scale == 0:
        raise UsageError(
            f"the {density} has nothing but telescoping parts: every operator is conserved"
        )
    maps = end_maps(density.table) if method != "elimination" else None
    if maps is None and method == "leading parts":
        raise UsageError(
            f"the two-site part of the {density} commutes with an on-site operator; use method "
            "'elimination'"
        )
    if maps is None:
        _check_count(density, max_range)
    spaces, methods = [], []
    kept, rejected, residual = 0.0, 1.0, 0.0
    frame: Frame | None = None
    for length in range(1, max_range + 1):
        space, used, margin = _space(density, maps, frame, length)
        if space.columns:
            table = density.table if frame is None else frame.density.table
            residual = max(residual, float(np.max(commuted(table, space).norms)))
        if frame is not None and space.columns <= defaults.CHARGES_LISTED:
            space = frame.returned(space)
        if length == 1 and maps is None:
            frame = sparsest_frame(density, space)
        kept, rejected = max(kept, margin[0]), min(rejected, margin[1])
        spaces.append(space)
        methods.append(used)
    dimensions = tuple(space.columns for space in spaces)
    listed = sum(
        space.columns <= defaults.CHARGES_LISTED and space.values.nnz <= defaults.CHARGES_TERMS
        for space in spaces
    )
    vectors = clean_basis(spaces[:listed], density.basis, _named(density))
    charges = _records(density, vectors, spaces[0])
    result = ConservedCharges(
        density,
        max_range,
        dimensions,
        tuple(charges),
        listed,
        max([residual, *(charge.residual for charge in charges)]),
        (kept, rejected),
        tuple(methods),
    )
    if result.residual > defaults.CHARGES_RESIDUAL:
        raise NotCertifiedError(
            f"a charge of the {density} has residual {result.residual:.1e}, above "
            f"{defaults.CHARGES_RESIDUAL:.0e}: conserved and nearly conserved operators cannot be "
            "told apart; ask for a shorter range",
            result,
        )
    return result


def _check_count(density: LocalDensity, length: int) -> None:
    base = density.basis.size
    count = (base - 1) * float(base) ** (length - 1)
    if count > defaults.CHARGES_STRINGS:
        raise CapacityError(
            f"range {length} has {count:.2g} strings of {base} operators per site, at most "
            f"{defaults.CHARGES_STRINGS:.2g} are treated; ask for shorter charges"
        )


def _space(
    density: LocalDensity, maps: EndMaps | None, frame: Frame | None, length: int
) -> tuple[StringVectors, str, tuple[float, float]]:
    """Conserved operators of range up to ``length``, columns of norm one, in the frame if any."""
    base = density.basis.size
    if maps is not None and length > 1:
        whole, parameters = charges_from_leading_parts(density, maps, length)
        space = whole.times(parameters.vectors.tocsr())
        used = _METHODS[1]
    else:
        codes = np.arange(base ** (length - 1), base**length)
        table = density.table if frame is None else frame.density.table
        _, matrix = commutator(table, codes, length)
        parameters = null_space(matrix)
        entries = parameters.vectors.tocoo()
        space = StringVectors.summed(
            base, length, codes[entries.row], entries.col, entries.data, parameters.vectors.shape[1]
        )
        used = _METHODS[0]
    norms = space.norms
    if norms.size:
        space = space.times(np.diag(1 / norms))
    return space, used, (parameters.largest_kept, parameters.smallest_rejected)


def _named(density: LocalDensity) -> list[tuple[str, StringVectors]]:
    """The density itself and, on a doubled chain, its parts on the ket and on the bra alone."""
    base = density.basis.size
    tensor = density.coefficients.copy()
    # Canonical form: a field counts once, at the first site.
    tensor[1:, 0] += tensor[0, 1:]
    tensor[0, :] = 0
    codes = np.flatnonzero(tensor)
    values = tensor.ravel()[codes]
    if not density.doubled:
        return [("energy", _single(base, codes, values))]
    sides = np.bitwise_or.reduce(density.basis.sides[digits_of(codes, base, 2)], axis=1)
    found = [
        (name, _single(base, codes[sides == side], values[sides == side]))
        for name, side in (("energy of the ket", 1), ("energy of the bra", 2))
        if np.any(sides == side)
    ]
    return [*found, ("generator", _single(base, codes, values))]


def _single(base: int, codes: np.ndarray, values: np.ndarray) -> StringVectors:
    return StringVectors.summed(base, 2, codes, np.zeros_like(codes), values, 1)


def _records(
    density: LocalDensity, vectors: list[CleanVector], singles: StringVectors
) -> list[ConservedCharge]:
    basis = density.basis
    conserved = _diagonal_charges(density, singles)
    charges = []
    for vector in vectors:
        digits = digits_of(vector.codes, basis.size, vector.length)
        values = vector.values * basis.factors[digits].prod(axis=1)
        column = np.zeros(vector.codes.size, dtype=np.int64)
        family = StringVectors.summed(basis.size, vector.length, vector.codes, column, values, 1)
        residual = float(commuted(density.table, family).norms[0] / family.norms[0])
        weights = []
        for word, changes in conserved:
            totals = changes[digits].sum(axis=1)
            if np.all(totals == totals[0]):
                weights.append((word, int(totals[0])))
        side = {1: "ket", 2: "bra", 3: "ket and bra"}[vector.side] if basis.doubled else "sites"
        charges.append(
            ConservedCharge(
                density,
                vector.codes,
                vector.values,
                vector.length,
                side,
                vector.name,
                tuple(weights),
                residual,
            )
        )
    return charges


def _diagonal_charges(
    density: LocalDensity, singles: StringVectors
) -> list[tuple[str, np.ndarray]]:
    """Conserved S^z of the ket and of the bra: their change under each on-site operator."""
    basis = density.basis
    n = basis.dimension
    dimension = round(np.sqrt(n)) if basis.doubled else n
    spin = -np.arange(dimension)
    one = np.ones(dimension, dtype=np.int64)
    candidates = [("S^z", spin)]
    if basis.doubled:
        candidates = [("ket S^z", np.kron(spin, one)), ("bra S^z", np.kron(one, spin))]
    found = []
    # One non-zero entry tells how an on-site operator changes a diagonal charge.
    entries = np.abs(basis.matrices).reshape(basis.size, -1)
    for word, levels in candidates:
        diagonal = levels - levels.mean()
        wanted = basis.coefficients(np.diag(diagonal.astype(complex)))
        dense = singles.dense(np.arange(basis.size))
        rest = wanted - dense @ np.linalg.lstsq(dense, wanted, rcond=None)[0]
        if singles.columns and np.linalg.norm(rest) < 1e-8 * np.linalg.norm(wanted):
            rows, columns = np.divmod(entries.argmax(axis=1), n)
            found.append((word, levels[rows] - levels[columns]))
    return found
