"""Quadratic chains with dephasing-like noise: when a model is one, and its matrices.

Beside the terms of :mod:`lbwork.exact.majorana` there may be jumps ``l = (i/4) sum B_mn w_m w_n``
that are Hermitian, or that come in sets which act like Hermitian ones (``S+_j S-_{j+1}`` and its
reverse at equal rates): Z on any site, X X or Y Y on a bond, symmetric incoherent hopping. Since
``l A l - {l^2, A}/2 = -[l, [l, A]]/2`` does not raise the order of A, the two-point function stays
closed.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
import scipy.sparse as sparse

from lbwork import defaults
from lbwork.errors import ModelError
from lbwork.exact.jordan_wigner import add_bilinear, monomial
from lbwork.exact.majorana import QuadraticChain, hamiltonian_form, linear_jump
from lbwork.exact.pauli import PauliString, jump_strings, require_open_spin_half
from lbwork.model import Model

__all__ = ["NoisyChain", "dephased", "noisy_chain"]


@dataclass(frozen=True, eq=False)
class NoisyChain:
    """A quadratic chain with jumps ``(i/4) sum B_mn w_m w_n`` for each B in ``noise``.

    noise: sparse real antisymmetric (2L, 2L), rates multiplied in.
    """

    chain: QuadraticChain
    noise: tuple[sparse.csr_matrix, ...]


def dephased(chain: QuadraticChain, rates: npt.NDArray[np.float64]) -> NoisyChain:
    """A quadratic chain with jumps Z_j at ``rates`` (L,) >= 0; raises ModelError."""
    values = np.asarray(rates, dtype=float)
    if values.shape != (chain.sites,) or not np.all(np.isfinite(values)) or np.any(values < 0):
        raise ModelError(f"rates are not {chain.sites} numbers >= 0; give one per site")
    noise = []
    for site in np.flatnonzero(values):
        # Z_j = -i w_{2j-1} w_{2j}.
        entry = -2 * np.sqrt(values[site])
        places = ([2 * site, 2 * site + 1], [2 * site + 1, 2 * site])
        noise.append(sparse.csr_matrix(([entry, -entry], places), shape=(2 * chain.sites,) * 2))
    return NoisyChain(chain, tuple(noise))


def noisy_chain(model: Model) -> NoisyChain:
    """The matrices of a model with a closed two-point function.

    Needs an open spin-1/2 chain with the Hamiltonian and the linear jumps of
    :func:`lbwork.exact.quadratic_chain`, and jumps that are sums of products of two fermion
    operators (and numbers) and act like Hermitian ones. Raises ModelError with the reason.
    """
    require_open_spin_half(model, "a closed two-point function")
    size = 2 * model.sites
    matrix = hamiltonian_form(model)
    linear: dict[str, list[np.ndarray]] = {"left": [], "right": []}
    noise: list[sparse.csr_matrix] = []
    crossed: dict[tuple[int, int, int, int], float] = {}
    for rate, strings in jump_strings(model):
        if any(monomial(string).degree not in (0, 2) for string in strings):
            kind, vector = linear_jump(model, strings)
            linear[kind].append(np.sqrt(rate) * vector)
            continue
        shift, form = _bilinear(strings, size)
        # l + a acts like l and the Hamiltonian (i/2) (a^* l - a l^dag).
        matrix = matrix - rate * (np.conj(shift) * form).imag
        noise += _hermitian_parts(np.sqrt(rate) * form, crossed)
    largest = max((abs(part).max() ** 2 for part in noise), default=0.0)
    if any(abs(value) > defaults.CONSERVATION_TOLERANCE * largest for value in crossed.values()):
        raise ModelError(
            f"model '{model.name}': its jumps that are products of two fermion operators do not "
            "act like Hermitian ones, so that the two-point function is not closed; give l and its "
            "adjoint equal rates"
        )
    left, right = (
        np.array(linear[kind], dtype=complex).reshape(-1, size) for kind in ("left", "right")
    )
    return NoisyChain(QuadraticChain(model.sites, matrix, left, right), tuple(noise))


def _bilinear(strings: dict[PauliString, complex], size: int) -> tuple[complex, np.ndarray]:
    """The number a and the matrix B of ``a + (i/4) sum B_mn w_m w_n``."""
    form, shift = np.zeros((size, size), dtype=complex), 0j
    for string, value in strings.items():
        if string:
            add_bilinear(form, value, monomial(string))
        else:
            shift = value
    return shift, form


def _hermitian_parts(
    form: np.ndarray, crossed: dict[tuple[int, int, int, int], float]
) -> list[sparse.csr_matrix]:
    """Re B and Im B where they do not vanish; adds ``Re B x Im B - Im B x Re B`` to ``crossed``.

    ``l = l_1 + i l_2`` with Hermitian l_1, l_2: without the crossed terms, which may cancel between
    jumps, l acts like the two jumps l_1 and l_2.
    """
    parts = [sparse.csr_matrix(part) for part in (form.real, form.imag)]
    first, second = (sparse.coo_matrix(sparse.triu(part)) for part in parts)
    for row, column, value in zip(first.row, first.col, first.data, strict=True):
        for other, last, factor in zip(second.row, second.col, second.data, strict=True):
            key, mirror = (row, column, other, last), (other, last, row, column)
            crossed[key] = crossed.get(key, 0.0) + value * factor
            crossed[mirror] = crossed.get(mirror, 0.0) - value * factor
    return [part for part in parts if part.nnz]
