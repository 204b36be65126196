"""Rings that the tests of integrability share: one place per name, plain words for the parameters.

Hamiltonian densities are in Pauli matrices, XXZ = XX + YY + delta ZZ; hopping to the right is the
jump ``S- S+``, a permutation jump exchanges neighbours.
"""

from __future__ import annotations

from lbwork.model import Jump, Model, RandomOperator, Term

__all__ = ["ring", "spin_one_ring"]

PERMUTATION = "0.5 (I I + X X + Y Y + Z Z)"


def ring(
    jx=0.0,
    jy=0.0,
    jz=0.0,
    field_x=0.0,
    field_z=0.0,
    dephasing=0.0,
    loss=0.0,
    gain=0.0,
    right=0.0,
    left=0.0,
    permutation=0.0,
    random_energy=0,
    random_jump=0,
    sites=4,
):
    """A spin-1/2 ring; what is zero is left out."""
    terms = []
    if jx or jy or jz:
        terms.append(Term(f"({jx}) X X + ({jy}) Y Y + ({jz}) Z Z", on="bonds"))
    if field_x or field_z:
        terms.append(Term(f"({field_x}) X + ({field_z}) Z", on="sites"))
    if random_energy:
        terms.append(Term(RandomOperator("hermitian", 2, random_energy), on="bonds"))
    rates = {"Z": dephasing, "S-": loss, "S+": gain}
    jumps = [Jump(word, on="sites", rate=rate) for word, rate in rates.items() if rate]
    rates = {"S- S+": right, "S+ S-": left, PERMUTATION: permutation}
    jumps += [Jump(word, on="bonds", rate=rate) for word, rate in rates.items() if rate]
    if random_jump:
        jumps.append(Jump(RandomOperator("ginibre", 2, random_jump), on="bonds", rate=0.5))
    return Model(
        name="ring",
        sites=sites,
        boundary="periodic",
        hamiltonian=tuple(terms),
        jumps=tuple(jumps),
    )


def spin_one_ring(bilinear, biquadratic):
    """``sum a S.S + b (S.S)^2`` on a closed spin-1 ring."""
    exchange = "(Sx Sx + Sy Sy + Sz Sz)"
    return Model(
        name="spin-1 ring",
        sites=3,
        local_dimension=3,
        boundary="periodic",
        hamiltonian=(Term(f"({bilinear}) {exchange} + ({biquadratic}) {exchange}^2", on="bonds"),),
    )
