"""Parts, condition numbers, certificates, resuming and keeping of sector spectra."""

import dataclasses
import json

import numpy as np
import pytest
import scipy.linalg
import scipy.sparse as sparse

from lbwork.errors import CapacityError, NotCertifiedError, StoreError
from lbwork.model import Jump, Model, Term
from lbwork.spectrum import (
    SpectrumOptions,
    cost_estimate,
    full_spectrum,
    sector_from_archive,
    sector_spectrum,
    sector_to_archive,
)
from lbwork.spectrum import cost as cost_module
from lbwork.spectrum.certificate import certify_sector, failed_conditions, unreliable_share
from lbwork.spectrum.dense import dense_levels
from lbwork.spectrum.parts import block_norm, irreducible_parts
from lbwork.symmetry import plan_sectors
from tests.chains import driven_chain, open_exclusion
from tests.matching import assert_same_spectrum


@pytest.fixture(scope="module")
def plan():
    return plan_sectors(driven_chain(4, delta=0.7, bias=0.4, dephasing=0.3))


def random_matrix(size, complex_entries, seed=2):
    generator = np.random.default_rng(seed)
    matrix = generator.normal(size=(size, size))
    return matrix + 1j * generator.normal(size=(size, size)) if complex_entries else matrix


@pytest.mark.parametrize("complex_entries", [False, True], ids=["real", "complex"])
@pytest.mark.parametrize("size", [1, 2, 7, 130])
def test_condition_numbers_agree_with_eigenvectors(size, complex_entries):
    """``kappa = 1 / |y^dag x|`` from the left and right vectors of a dense solver."""
    matrix = random_matrix(size, complex_entries)
    levels, left, right = scipy.linalg.eig(matrix, left=True, right=True)
    expected = 1 / np.abs(np.sum(left.conj() * right, axis=0))
    found, conditions = dense_levels(np.asfortranarray(matrix.copy()), 1)
    assert_same_spectrum(found, levels, 1e-10)
    nearest = np.argmin(np.abs(found[:, None] - levels), axis=1)
    assert np.allclose(conditions, expected[nearest], rtol=1e-8)


def test_real_matrices_have_exact_conjugate_pairs():
    levels, conditions = dense_levels(np.asfortranarray(random_matrix(60, False)), 1)
    upper = np.flatnonzero(levels.imag > 0)
    assert np.array_equal(levels[upper + 1], levels[upper].conj())
    assert np.allclose(conditions[upper + 1], conditions[upper], rtol=1e-9)


@pytest.mark.parametrize("size", [2, 12, 200])
def test_jordan_chains_have_huge_condition_numbers(size):
    chain = np.asfortranarray(np.diag(np.ones(size - 1), 1) - np.eye(size))
    conditions = dense_levels(chain, 1)[1]
    assert np.all(conditions > 1e14)
    assert not np.any(np.isnan(conditions))


@pytest.mark.parametrize("matrix", [np.zeros((3, 3)), np.eye(4), np.diag([1.0, 1.0, 2.0])])
def test_normal_matrices_have_condition_one(matrix):
    levels, conditions = dense_levels(np.asfortranarray(matrix), 1)
    assert_same_spectrum(levels, np.diagonal(matrix), 0)
    assert np.array_equal(conditions, np.ones(len(matrix)))


def test_irreducible_parts_of_a_shuffled_triangular_matrix():
    """Blocks of sizes 3, 1, 2, 1 with couplings one way only, rows and columns permuted alike."""
    generator = np.random.default_rng(5)
    sizes = [3, 1, 2, 1]
    matrix = np.triu(generator.normal(size=(7, 7)))
    start = 0
    for size in sizes:
        inside = slice(start, start + size)
        matrix[inside, inside] = generator.normal(size=(size, size))
        start += size
    shuffle = generator.permutation(7)
    shuffled = sparse.csr_matrix(matrix[np.ix_(shuffle, shuffle)])
    parts = irreducible_parts(shuffled, block_norm(shuffled))
    assert sorted(parts.sizes.tolist()) == sorted(sizes)
    levels = np.concatenate([np.linalg.eigvals(parts.dense(index)) for index in parts])
    assert_same_spectrum(levels, np.linalg.eigvals(matrix), 1e-12)
    assert np.array_equal(np.sort(parts.order), np.arange(7))
    ones = [parts.dense(index)[0, 0] for index in parts if parts.sizes[index] == 1]
    assert np.array_equal(parts.singles(), ones)


def test_pure_loss_falls_into_parts():
    """Loss only lowers: each sector is block-triangular in the number of particles."""
    model = Model(
        name="loss",
        sites=4,
        hamiltonian=(Term("X X + Y Y"), Term("Z", coefficient="0.1*j")),
        jumps=(Jump("S-", rate="0.2 + 0.1*j"),),
    )
    largest = max(full_spectrum(model).sectors, key=lambda item: item.sector.dimension)
    assert max(largest.parts) < largest.sector.dimension / 1.5
    assert sum(largest.parts) == largest.sector.dimension


def test_same_bits_in_any_order_and_after_resuming(plan):
    whole = full_spectrum(plan)
    backwards = [sector_spectrum(plan, sector) for sector in reversed(plan.sectors)][::-1]
    kept = {item.sector.index: item for item in whole.sectors[:2]}
    seen = []
    resumed = full_spectrum(plan, finished=kept, on_sector=seen.append)
    for one, other, third in zip(whole.sectors, backwards, resumed.sectors, strict=True):
        assert np.array_equal(one.eigenvalues, other.eigenvalues)
        assert np.array_equal(one.eigenvalues, third.eigenvalues)
        assert np.array_equal(one.error_bounds, other.error_bounds)
        assert one.certificate == other.certificate
    assert [item.sector.index for item in seen] == [
        sector.index for sector in plan.sectors if sector.index not in kept
    ]


def test_progress_is_reported_before_each_sector(plan):
    calls = []
    full_spectrum(plan, progress=lambda done, total, sector: calls.append((done, total, sector)))
    total = len(plan.sectors)
    assert [(done, count) for done, count, _ in calls] == [(done, total) for done in range(total)]
    assert [sector for *_, sector in calls] == list(plan.sectors)


def test_archive_round_trip(plan):
    for sector in plan.sectors:
        spectrum = sector_spectrum(plan, sector)
        document, arrays = sector_to_archive(spectrum)
        again = sector_from_archive(plan, json.loads(json.dumps(document)), arrays)
        assert np.array_equal(again.eigenvalues, spectrum.eigenvalues)
        assert np.array_equal(again.error_bounds, spectrum.error_bounds)
        assert again.to_dict() == spectrum.to_dict()


def test_archive_of_another_model_is_refused(plan):
    spectrum = full_spectrum(open_exclusion(2, 1.0, 1.0)).sectors[0]
    document, arrays = sector_to_archive(spectrum)
    with pytest.raises(StoreError, match="not in the plan"):
        sector_from_archive(plan, document, arrays)
    document, arrays = sector_to_archive(sector_spectrum(plan, plan.sectors[0]))
    arrays["eigenvalues"] = arrays["eigenvalues"][:-1]
    with pytest.raises(StoreError, match="levels"):
        sector_from_archive(plan, document, arrays)


@pytest.mark.parametrize("damage", ["moved", "doubled", "unstable"])
def test_certificate_notices_wrong_levels(plan, damage):
    """A negative control: the evidence must fail when one level is not an eigenvalue."""
    sector = plan.sectors[0]
    matrix = plan.block(sector).matrix
    norm = block_norm(matrix)
    parts = irreducible_parts(matrix, norm)
    spectrum = sector_spectrum(plan, sector)
    levels = spectrum.eigenvalues.copy()
    if damage == "moved":
        levels[3] += 1e-6
    elif damage == "doubled":
        levels[3] = levels[4]
    else:
        levels[np.argmin(np.abs(levels))] += 1e-4
    conditions = np.ones(levels.size)
    certificate = certify_sector(
        matrix, parts, (levels, spectrum.error_bounds, conditions), (0.0, 0), norm, 1
    )
    failures = failed_conditions(certificate, levels, spectrum.error_bounds, norm)
    assert failures
    assert any("identity" in text for text in failures)
    if damage == "unstable":
        assert any("positive real part" in text for text in failures)


def test_failed_certificate_carries_the_spectrum(plan, monkeypatch):
    monkeypatch.setattr("lbwork.defaults.TRACE_TOLERANCE", 0.0)
    with pytest.raises(NotCertifiedError, match="trace") as caught:
        sector_spectrum(plan, plan.sectors[0])
    assert caught.value.partial.eigenvalues.size == plan.sectors[0].dimension


def test_sampled_residuals_are_small(plan):
    options = SpectrumOptions(samples=10, seed=3)
    for sector in plan.sectors:
        certificate = sector_spectrum(plan, sector, options).certificate
        assert certificate.sampled_levels == (
            min(10, sector.dimension) if sector.dimension > 1 else 0
        )
        assert certificate.residual < 1e-13


def test_degenerate_levels_are_not_unreliable():
    """Levels that coincide are one level; two that are closer than their error are unreliable."""
    levels = np.array([0, 0, 0, 1, 2], dtype=complex)
    assert unreliable_share(levels, np.full(5, 1e-12), [5]) == 0
    close = np.array([0, 1e-6, 1, 2, 3], dtype=complex)
    assert unreliable_share(close, np.full(5, 1e-6), [5]) == pytest.approx(0.4)
    assert unreliable_share(close, np.full(5, 1e-6), [1] * 5) == 0


def test_what_does_not_fit_is_refused(plan, monkeypatch):
    monkeypatch.setattr(cost_module, "usable_memory", lambda: 1000)
    with pytest.raises(CapacityError, match="GB"):
        sector_spectrum(plan, plan.sectors[0])


def test_costs_come_in_the_order_of_the_plan(plan):
    costs = cost_estimate(plan)
    assert [cost.label for cost in costs] == [sector.label for sector in plan.sectors]
    assert all(cost.seconds > 0 and cost.memory_bytes > 16 * cost.dimension**2 for cost in costs)


def test_document_and_tables(plan):
    spectrum = full_spectrum(plan)
    document = json.loads(json.dumps(spectrum.to_dict(), allow_nan=False))
    first = document["sectors"][0]
    for key in ("label", "dimension", "multiplicity", "conjugates", "parts", "expected_class"):
        assert key in first
    assert len(first["eigenvalues"]) == first["dimension"] == len(first["error_bounds"])
    assert set(first["certificate"]) == {
        field.name for field in dataclasses.fields(spectrum.sectors[0].certificate)
    }
    assert len(str(spectrum).splitlines()) == 2 + len(plan.sectors)
    assert spectrum._repr_html_().count("<tr>") == 1 + len(plan.sectors)
    total = sum(item["dimension"] * item["multiplicity"] for item in document["sectors"])
    assert total == document["total_dimension"] == spectrum.eigenvalues().size
