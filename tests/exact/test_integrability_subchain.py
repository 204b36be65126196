"""The classical process inside a generator: found, named, judged and solved."""

import numpy as np
import pytest

from lbwork.errors import CapacityError, UsageError
from lbwork.exact.exclusion import exclusion_current, exclusion_profile
from lbwork.exact.exclusion_ring import asymmetric_ring_eigenvalue
from lbwork.exact.exclusion_symmetric import symmetric_ring_gap
from lbwork.generator import Lindbladian
from lbwork.integrability import classical_subchain, hamiltonian_density, local_density
from lbwork.model import Jump, Model, Term, load_model
from tests.integrability_chains import ring


def flips(*jumps):
    return Model(
        name="flips",
        sites=4,
        boundary="periodic",
        jumps=tuple(Jump(word, on="bonds", rate=rate) for word, rate in jumps),
    )


# n = |1><1| projects on the occupied state; I - n on the empty one.
NAMES = {
    "symmetric exclusion process": ring(right=0.7, left=0.7),
    "asymmetric exclusion process": ring(right=0.7, left=0.2, dephasing=0.3),
    "totally asymmetric exclusion process": ring(left=0.4),
    "independent spin flips": ring(loss=0.3, gain=0.2),
    "frozen": ring(jz=1.0, dephasing=0.5),
    "reaction-diffusion process: diffusion, pair annihilation": flips(
        ("S- S+", 1.0), ("S+ S-", 1.0), ("S- S-", 1.0)
    ),
    "reaction-diffusion process: diffusion, coagulation": flips(
        ("S- S+", 1.0), ("S+ S-", 1.0), ("n S-", 0.5), ("S- n", 0.5)
    ),
    "reaction process: branching": flips(("n S+", 1.0), ("S+ n", 1.0)),
    "Glauber-type process at zero temperature (voter model)": flips(
        ("n S+", 1.0), ("S+ n", 1.0), ("(I - n) S-", 1.0), ("S- (I - n)", 1.0)
    ),
    "Glauber-type process": flips(
        *[(word, 1.0) for word in ("n S+", "S+ n", "(I - n) S-", "S- (I - n)")],
        *[(word, 0.3) for word in ("(I - n) S+", "S+ (I - n)", "n S-", "S- n")],
    ),
}


@pytest.mark.parametrize("name", NAMES)
def test_processes_are_named(name):
    result = classical_subchain(NAMES[name])
    assert result.preserved and result.stochastic
    assert result.name == name
    assert result.leakage < 1e-12 and result.probability_error < 1e-12


@pytest.mark.parametrize("parameters", [{"right": 1.0, "left": 0.3}, {"right": 1.0, "left": 1.0}])
def test_sub_chain_may_be_integrable_alone(parameters):
    """Exclusion is an XXZ chain with a twist: L.-H. Gwa, H. Spohn, Phys. Rev. A 46, 844 (1992)."""
    result = classical_subchain(ring(**parameters))
    assert result.reshetikhin.form == "difference"
    assert result.rates[((1, 0), (0, 1))] == pytest.approx(1.0)


def test_generic_process_is_not_integrable():
    process = flips(("S- S+", 1.0), ("S+ S-", 0.3), ("n S-", 0.7), ("S- S-", 0.4))
    assert classical_subchain(process).reshetikhin.form == "none"


@pytest.mark.parametrize(
    "parameters", [{"jx": 1.0, "jy": 1.0, "dephasing": 0.5}, {"random_energy": 2, "random_jump": 3}]
)
def test_coherent_motion_has_no_classical_process(parameters):
    result = classical_subchain(ring(**parameters))
    assert not result.preserved and result.leakage > 0.05
    assert "no product basis" in result.sentence
    with pytest.raises(UsageError, match="no classical process"):
        result.solve(4)


def test_hidden_basis_is_found_by_search():
    generator = np.random.default_rng(11)
    mixed = generator.normal(size=(2, 2)) + 1j * generator.normal(size=(2, 2))
    unitary = np.linalg.qr(mixed)[0]
    pair = np.kron(np.kron(unitary, unitary.conj()), np.kron(unitary, unitary.conj()))
    density = pair @ local_density(ring(right=1.0, left=0.3)).matrix @ pair.conj().T
    result = classical_subchain(density)
    assert result.basis == "found by search" and result.name == "asymmetric exclusion process"
    assert sorted(result.rates.values()) == pytest.approx([0.3, 1.0], abs=1e-9)
    overlap = np.abs(unitary.conj().T @ result.unitary)
    assert np.sort(overlap.ravel()) == pytest.approx([0, 0, 1, 1], abs=1e-7)
    assert not classical_subchain(density, search=False).preserved
    assert classical_subchain(density, unitary=unitary).preserved


def test_dephasing_along_x_flips_spins_in_the_basis_z():
    model = Model(
        name="x noise", sites=4, boundary="periodic", jumps=(Jump("X", on="sites", rate=0.3),)
    )
    result = classical_subchain(model)
    assert result.basis == "z" and result.name == "independent spin flips"


def test_spectrum_of_the_process_is_in_that_of_the_generator():
    """Every level of the sub-chain is a level of the generator of four sites."""
    model = ring(right=1.0, left=0.3, loss=0.2)
    result = classical_subchain(model)
    solution = result.solve(4)
    generator = Lindbladian(model).matrix().toarray()
    levels = np.linalg.eigvals(generator)
    assert np.abs(levels - solution.level).min() < 1e-9
    empty = np.zeros(16)
    empty[-1] = 1
    assert solution.probabilities == pytest.approx(empty, abs=1e-12)


@pytest.mark.parametrize("sites", [4, 6, 10, 12])
def test_gap_on_rings(sites):
    """References: Bethe equations and one-magnon gap, see lbwork.exact."""
    one_way = classical_subchain(ring(right=1.0)).solve(sites)
    expected = asymmetric_ring_eigenvalue(sites, sites // 2)
    assert one_way.gap == pytest.approx(-expected.real, abs=1e-9)
    assert one_way.current == pytest.approx(sites / 4 / (sites - 1), abs=1e-10)
    both = classical_subchain(ring(right=1.0, left=1.0)).solve(sites)
    assert both.gap == pytest.approx(symmetric_ring_gap(sites), abs=1e-9)
    assert both.current == pytest.approx(0, abs=1e-10)


@pytest.mark.parametrize(("entry", "leave"), [(1.0, 1.0), (0.3, 0.8)])
def test_open_exclusion(entry, leave):
    """B. Derrida, M. Evans, V. Hakim, V. Pasquier, J. Phys. A 26, 1493 (1993)."""
    result = classical_subchain(load_model("tasep-open", alpha=entry, beta=leave))
    for sites in (4, 10):
        solution = result.solve(sites, boundary="open")
        assert solution.particles is None
        assert solution.current == pytest.approx(exclusion_current(sites, entry, leave), abs=1e-10)
        profile = exclusion_profile(sites, entry, leave)
        assert solution.profile == pytest.approx(profile, abs=1e-10)


def test_all_particle_numbers_at_once_have_many_stationary_states():
    model = ring(right=1.0, permutation=0.5)
    solution = classical_subchain(model).solve(6, particles=2)
    assert solution.stationary_states == 1 and solution.states.size == 15
    voter = classical_subchain(NAMES["Glauber-type process at zero temperature (voter model)"])
    solution = voter.solve(6)
    assert solution.stationary_states == 2 and solution.probabilities is None
    assert solution.gap is not None and solution.gap > 0


def test_gap_can_be_left_out_on_long_chains():
    solution = classical_subchain(load_model("tasep-open")).solve(
        14, boundary="open", slowest=False
    )
    assert solution.gap is None
    assert solution.current == pytest.approx(exclusion_current(14, 1.0, 1.0), abs=1e-10)


def test_spin_one_exchange():
    swap = "0.5 (Sx Sx + Sy Sy + Sz Sz) + 0.5 (Sx Sx + Sy Sy + Sz Sz)^2 - 0.5 I I"
    model = Model(
        name="spin-1 exchange",
        sites=3,
        local_dimension=3,
        boundary="periodic",
        jumps=(Jump(f"2 ({swap})", on="bonds", rate=0.25),),
    )
    result = classical_subchain(model)
    assert result.preserved
    solution = result.solve(4)
    assert solution.stationary_states > 1


def test_closed_diagonal_chain_is_frozen():
    result = classical_subchain(
        Model(name="closed", sites=3, boundary="periodic", hamiltonian=(Term("Z Z", on="bonds"),))
    )
    assert result.name == "frozen" and result.reshetikhin is None
    assert "do not move" in result.sentence


def test_bad_requests_are_refused():
    result = classical_subchain(ring(right=1.0))
    with pytest.raises(UsageError, match="particles = 9"):
        result.solve(4, particles=9)
    with pytest.raises(UsageError, match="twisted"):
        result.solve(4, boundary="twisted")
    with pytest.raises(UsageError, match="sites = 2"):
        result.solve(2)
    with pytest.raises(CapacityError, match="fewer sites"):
        result.solve(24)
    with pytest.raises(UsageError, match="no generator"):
        classical_subchain(hamiltonian_density(ring(jx=1.0)))
    with pytest.raises(UsageError, match="not a unitary"):
        classical_subchain(ring(right=1.0), unitary=np.ones((2, 2)))


def test_record_as_text_and_document():
    result = classical_subchain(ring(right=1.0, left=0.3))
    assert "10 -> 01" in str(result) and result.to_dict()["rates"] == {
        "10 -> 01": 1.0,
        "01 -> 10": 0.3,
    }
    solution = result.solve(4)
    assert "mean current" in str(solution) and solution.to_dict()["states"] == 6
