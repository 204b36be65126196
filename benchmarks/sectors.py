"""What symmetry sectors save: assembly and spectra against what a script would do, in one run.

    python benchmarks/sectors.py [--skip-dense]

1. The sector of 10 sites, ket and bra half filled, momentum 0 (XX ring with dephasing) against the
   full sparse superoperator of 8 sites from SciPy Kronecker products.
2. All sector spectra of the 8-site ring against the dense eigenvalues of its largest U(1) x U(1)
   sector, dimension 4900, without momentum and conjugate pairs (several minutes).
"""

from __future__ import annotations

import argparse
import time

import numpy as np
import scipy.linalg
import scipy.sparse as sparse

from lbwork import find_symmetries, full_spectrum, load_model
from lbwork.symmetry import SymmetryReport
from lbwork.symmetry.block import OrbitBasis, assemble_block
from lbwork.symmetry.characters import GroupGenerator
from lbwork.symmetry.sector_basis import build_basis


def kronecker_superoperator(sites: int, rate: float) -> sparse.csr_matrix:
    """XX ring with dephasing from SciPy Kronecker products, as one would write it in a script."""
    x = sparse.csr_matrix(np.array([[0, 1], [1, 0]], dtype=complex))
    y = sparse.csr_matrix(np.array([[0, -1j], [1j, 0]]))
    z = sparse.csr_matrix(np.diag([1.0 + 0j, -1.0]))

    def at(matrix: sparse.csr_matrix, site: int) -> sparse.csr_matrix:
        left, right = sparse.identity(2**site), sparse.identity(2 ** (sites - site - 1))
        return sparse.kron(sparse.kron(left, matrix), right, format="csr")

    hamiltonian = sparse.csr_matrix((2**sites, 2**sites), dtype=complex)
    for site in range(sites):
        after = (site + 1) % sites
        hamiltonian = hamiltonian + at(x, site) @ at(x, after) + at(y, site) @ at(y, after)
    one = sparse.identity(2**sites)
    total = -1j * (sparse.kron(hamiltonian, one) - sparse.kron(one, hamiltonian.T))
    for site in range(sites):
        jump = at(z, site)
        total = total + rate * (sparse.kron(jump, jump.conj()) - sparse.identity(4**sites))
    return total.tocsr()


def half_filled(report: SymmetryReport, translate: bool) -> sparse.csr_matrix:
    """Block of ket and bra half filled, with momentum 0 or without momentum."""
    sites = report.model.sites
    label = (-(sites // 2), -(sites // 2))
    generators = []
    if translate and report.translation is not None:
        generators = [GroupGenerator("translation", report.translation.operation, sites)]
    basis = build_basis(report.charges, label, generators, [0] * len(generators), sites, 4, 6400)
    return assemble_block(
        report.rows, report.constant, OrbitBasis(basis, bool(generators), sites, 4)
    )


def timed(task, *arguments):
    """(result, seconds)."""
    started = time.perf_counter()
    result = task(*arguments)
    return result, time.perf_counter() - started


def main() -> None:
    """Print both comparisons."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--skip-dense", action="store_true", help="leave out the second part")
    options = parser.parse_args()
    half_filled(find_symmetries(load_model("xx-dephasing", sites=4)), True)  # compiles
    report, search = timed(lambda: find_symmetries(load_model("xx-dephasing", sites=10)))
    print(f"symmetry search of 10 sites, once per model: {search:.2f} s")
    for _ in range(3):
        reference, slow = timed(kronecker_superoperator, 8, 0.5)
        block, fast = timed(half_filled, report, True)
        print(
            f"assembly: 8 sites full {reference.shape[0]} states {slow:.3f} s; 10 sites sector "
            f"{block.shape[0]} states, {block.nnz} non-zeros {fast:.3f} s; ratio {slow / fast:.2f}"
        )
    spectrum, sectors = timed(lambda: full_spectrum(load_model("xx-dephasing", sites=8)))
    count = spectrum.eigenvalues().size
    print(
        f"spectra: all {count} levels of 8 sites in {len(spectrum.sectors)} sectors {sectors:.1f} s"
    )
    if options.skip_dense:
        return
    largest = half_filled(find_symmetries(load_model("xx-dephasing", sites=8)), False).toarray()
    _, dense = timed(lambda: scipy.linalg.eigvals(largest, overwrite_a=True, check_finite=False))
    print(
        f"dense eigenvalues of the {largest.shape[0]}-state U(1) x U(1) sector {dense:.1f} s; "
        f"ratio {dense / sectors:.1f}"
    )


if __name__ == "__main__":
    main()
