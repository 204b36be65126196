"""Open spin-1/2 chains that are quadratic in fermions: when a model is one, and its matrices.

Jordan-Wigner, sites j = 1..L: ``w_{2j-1} = (Z_1 ... Z_{j-1}) X_j``,
``w_{2j} = (Z_1 ... Z_{j-1}) Y_j``, so that ``w_m w_n + w_n w_m = 2 delta_mn`` and
``Z_j = -i w_{2j-1} w_{2j}``. T. Prosen, New J. Phys. 10, 043026 (2008). Three kinds of terms keep
even observables Gaussian:

- Hamiltonian strings that are products of two w: Z, XX, YY, XY and YX of neighbours, and longer
  ones with Z between (X Z X, ...);
- jumps linear in w, which are strings that start at site 1: S+ and S- at the first site,
  ``Z_1 S-_2``;
- jumps linear in w times the parity ``P = Z_1 ... Z_L``, which are strings that end at site L: S+
  and S- at the last site. P drops out of ``l^dag A l`` for even A, so that they act as linear ones
  there.

S- inside the chain is not quadratic: its string Z_1 ... Z_{j-1} changes the sign of ``w_m w_n``
with m to the left and n to the right of site j, which makes ``l^dag w_m w_n l`` of fourth order.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from lbwork.errors import ModelError
from lbwork.exact.arguments import checked_count, checked_rate
from lbwork.exact.jordan_wigner import Monomial, add_bilinear, monomial, parity
from lbwork.exact.pauli import (
    PauliString,
    hamiltonian_strings,
    jump_strings,
    require_open_spin_half,
    shown_string,
)
from lbwork.model import Model

__all__ = [
    "QuadraticChain",
    "boundary_driven_chain",
    "hamiltonian_form",
    "linear_jump",
    "quadratic_chain",
]

MAX_SITES = 4000


@dataclass(frozen=True, eq=False)
class QuadraticChain:
    """``H = (i/4) sum A_mn w_m w_n`` and jumps ``sum_m l_m w_m``, without or with the parity P.

    hamiltonian: real antisymmetric A (2L, 2L). left: complex (k, 2L), jumps linear in w; right:
    complex (k, 2L), linear in w times P. Rates are multiplied in.
    """

    sites: int
    hamiltonian: npt.NDArray[np.float64]
    left: npt.NDArray[np.complex128]
    right: npt.NDArray[np.complex128]

    def bath(self) -> npt.NDArray[np.complex128]:
        """``N_mn = sum_k l_km^* l_kn`` over all jumps, complex Hermitian (2L, 2L)."""
        jumps = np.concatenate([self.left, self.right])
        return np.asarray(jumps.conj().T @ jumps)

    def drift(self) -> npt.NDArray[np.float64]:
        """X of ``d Gamma/dt = X Gamma + Gamma X^T + Y``: ``A - 2 Re N``, float64 (2L, 2L)."""
        return np.asarray(self.hamiltonian - 2 * self.bath().real)

    def source(self) -> npt.NDArray[np.float64]:
        """Y of the same equation: ``4 Im N``, real antisymmetric (2L, 2L)."""
        return np.asarray(4 * self.bath().imag)


def quadratic_chain(model: Model) -> QuadraticChain:
    """The matrices of a quadratic model.

    Needs an open spin-1/2 chain whose terms are those of the module's list. Raises ModelError that
    says in words which term is not quadratic and why.
    """
    require_open_spin_half(model, "a quadratic chain")
    count = model.sites
    matrix = hamiltonian_form(model)
    jumps: dict[str, list[np.ndarray]] = {"left": [], "right": []}
    for rate, strings in jump_strings(model):
        kind, vector = linear_jump(model, strings)
        jumps[kind].append(np.sqrt(rate) * vector)
    left, right = (
        np.array(jumps[kind], dtype=complex).reshape(-1, 2 * count) for kind in ("left", "right")
    )
    return QuadraticChain(count, matrix, left, right)


def hamiltonian_form(model: Model) -> npt.NDArray[np.float64]:
    """A of ``H = (i/4) sum A_mn w_m w_n``, real antisymmetric (2L, 2L).

    Raises ModelError for a term that is not a product of two fermion operators.
    """
    matrix = np.zeros((2 * model.sites,) * 2, dtype=complex)
    for string, value in hamiltonian_strings(model).items():
        product = monomial(string)
        if product.degree != 2:
            raise ModelError(
                f"model '{model.name}' is not quadratic: the Hamiltonian term "
                f"{shown_string(string)} is a product of {product.degree} fermion operators"
            )
        add_bilinear(matrix, value, product)
    return np.asarray(matrix.real)


def linear_jump(model: Model, strings: dict[PauliString, complex]) -> tuple[str, np.ndarray]:
    """``left`` or ``right`` and the coefficients l_m of one jump, complex (2L,).

    Raises ModelError with the reason when the jump is not linear.
    """
    count = model.sites
    whole = parity(count)
    vectors = {"left": np.zeros(2 * count, complex), "right": np.zeros(2 * count, complex)}
    for string, value in strings.items():
        product = monomial(string)
        if product.degree == 1:
            place = product.mask.bit_length() - 1
            vectors["left"][place] += value * product.phase
        elif product.degree == 2 * count - 1:
            place = (product.mask ^ whole.mask).bit_length() - 1
            single = Monomial(1 << place, 1).times(whole)
            vectors["right"][place] += value * product.phase / single.phase
        else:
            reason = _jump_reason(string, product.degree, count)
            raise ModelError(f"model '{model.name}' is not quadratic: {reason}")
    used = [kind for kind, vector in vectors.items() if vector.any()]
    if len(used) > 1:
        raise ModelError(
            f"model '{model.name}' is not quadratic: one jump adds terms at the first and at the "
            "last site, which differ by the parity of the chain; make two jumps of it"
        )
    return used[0], vectors[used[0]]


def _jump_reason(string: PauliString, degree: int, count: int) -> str:
    what = f"the jump with {shown_string(string)}"
    if degree == 0:
        return f"{what} adds a number to an operator; leave it out or put it into the Hamiltonian"
    if degree % 2 == 0:
        return (
            f"{what} is a product of {degree} fermion operators, not a single one (for dephasing "
            "the two-point function alone is closed)"
        )
    return (
        f"{what} inside a chain of {count} sites carries the string of Z over all sites to its "
        "left, which makes correlations across it of fourth order; linear jumps act at the first "
        "or at the last site"
    )


def boundary_driven_chain(
    xx: npt.NDArray[np.float64],
    yy: npt.NDArray[np.float64],
    field: npt.NDArray[np.float64],
    first: tuple[float, float],
    last: tuple[float, float],
) -> QuadraticChain:
    """``H = sum xx_j X_j X_{j+1} + yy_j Y_j Y_{j+1} + field_j Z_j`` with jumps at both ends.

    For chains longer than a model may be, up to 4000 sites. xx, yy: (L-1,); field: (L,). first and
    last: rates (>= 0) of S+ and S- there. Raises ModelError, CapacityError.
    """
    field = np.asarray(field, dtype=float)
    count = checked_count("sites", field.size, 2, MAX_SITES)
    matrix = np.zeros((2 * count, 2 * count))
    bonds = np.arange(count - 1)
    for name, values, row, column, sign in (
        ("xx", xx, 2 * bonds + 1, 2 * bonds + 2, -2),
        ("yy", yy, 2 * bonds, 2 * bonds + 3, 2),
        ("field", field, 2 * np.arange(count), 2 * np.arange(count) + 1, -2),
    ):
        entries = np.asarray(values, dtype=float)
        if entries.shape != row.shape or not np.all(np.isfinite(entries)):
            raise ModelError(
                f"{name} has shape {entries.shape} or is not finite; give {row.size} real numbers"
            )
        matrix[row, column] = sign * entries
        matrix[column, row] = -sign * entries
    ends = []
    for site, rates in ((0, first), (count - 1, last)):
        jumps = np.zeros((2, 2 * count), dtype=complex)
        for index, (rate, phase) in enumerate(zip(rates, (1j, -1j), strict=True)):
            strength = np.sqrt(checked_rate("rate", rate, zero=True)) / 2
            jumps[index, 2 * site : 2 * site + 2] = strength * np.array([1, phase])
        ends.append(jumps)
    return QuadraticChain(count, matrix, ends[0], ends[1])
