"""How well each reference ensemble explains the averages of the per-level descriptors.

The average x of the descriptors over N reference levels is close to normal, with the mean mu of the
ensemble and the covariance C / N + S: C is the covariance per effectively independent level, so
that correlations between near levels are counted once, and S covers the shifts by smooth density
gradients. Hence log L = log normal(x; mu, C / N + S), a synthetic likelihood in the sense of
S. N. Wood, Nature 466, 1102 (2010); from memory.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import numpy.typing as npt
from scipy.linalg import cho_factor, cho_solve
from scipy.special import logsumexp
from scipy.stats import chi2

from lbwork import defaults
from lbwork.levels.descriptors import RATIO_MOMENTS
from lbwork.levels.records import SequenceStatistics
from lbwork.levels.references import Reference, reference, reference_names, systematic

__all__ = ["Evidence", "evidence", "scatter_probability"]


@dataclass(frozen=True, eq=False)
class Evidence:
    """References of one geometry against the levels of some sequences.

    log_likelihood: per reference. distance: squared Mahalanobis distance per reference.
    posterior: probability per family, equal priors for families and for references within one; when
    every level is exactly twofold, class AII-dagger has the prior weight
    :data:`lbwork.defaults.LEVEL_KRAMERS_WEIGHT`.
    closest: name of the reference of highest likelihood within the most probable family.
    fit: probability of a larger distance than the closest one's.
    contrast: distance of the closest reference over that of the best single ensemble of another
    family; superpositions are left out, since many blocks are as good as independent levels.
    ratios_only: the spacings and fields fitted no reference and were left out.
    """

    log_likelihood: dict[str, float]
    distance: dict[str, float]
    posterior: dict[str, float]
    closest: str
    fit: float
    contrast: float
    ratios_only: bool = False

    @property
    def family(self) -> str:
        """The most probable family."""
        return max(self.posterior, key=lambda name: self.posterior[name])


def _score(
    mean: npt.NDArray[np.float64],
    count: int,
    one: Reference,
    floor: npt.NDArray[np.float64],
    chosen: slice,
) -> tuple[float, float]:
    """Log-likelihood and squared distance of one reference."""
    # The table itself is an average over a finite sample.
    covariance = one.covariance[chosen, chosen] * (1.0 / count + 1.0 / one.levels) + floor
    factor = cho_factor(covariance, lower=True)
    difference = mean - one.mean[chosen]
    distance = float(difference @ cho_solve(factor, difference))
    log_determinant = 2.0 * float(np.sum(np.log(np.diag(factor[0]))))
    constant = mean.size * np.log(2.0 * np.pi)
    return -0.5 * (distance + log_determinant + constant), distance


def evidence(sequences: tuple[SequenceStatistics, ...]) -> Evidence:
    """Weigh all references of the geometry the (used, equal-geometry) `sequences` live in.

    Spacings and local fields sharpen the distinction, but need an unfolding that short sequences
    and strongly uneven densities do not allow: what is left of the gradients widens the spacings
    and imitates weaker repulsion. There, or when no reference explains all descriptors, or when
    the ratios clearly prefer another class, the scale-free complex spacing ratios decide alone
    (L. Sa, P. Ribeiro, T. Prosen, Phys. Rev. X 10, 021019 (2020)), and the class that the symmetry
    of the sectors asks for gets the prior weight :data:`lbwork.defaults.LEVEL_EXPECTED_WEIGHT`.
    """
    geometry = sequences[0].geometry
    descriptors = np.concatenate([one.descriptors for one in sequences])
    full = _weigh(sequences, descriptors, slice(None))
    counts = np.array([one.levels_used for one in sequences])
    typical = float(np.average([one.levels for one in sequences], weights=counts))
    unfolded = typical >= defaults.LEVEL_UNFOLDING_MINIMUM
    if geometry == "line":
        return full
    ratios = _weigh(sequences, descriptors, slice(RATIO_MOMENTS))
    agreed = _class_preference(full.family, ratios) <= defaults.LEVEL_CLASS_CONFLICT
    if unfolded and agreed and full.fit >= defaults.LEVEL_FIT_MINIMUM:
        return full
    return replace(ratios, ratios_only=True)


def _class_preference(family: str, ratios: Evidence) -> float:
    """By how much the ratios alone prefer another chaotic class to ``family`` (log-likelihood)."""
    classes = ("A", "AI+", "AII+")
    if family not in classes:
        return 0.0
    best = max(ratios.log_likelihood[name] for name in classes)
    return best - ratios.log_likelihood[family]


def _weigh(
    sequences: tuple[SequenceStatistics, ...],
    descriptors: npt.NDArray[np.float64],
    chosen: slice,
) -> Evidence:
    """Weigh the references by some of the descriptors."""
    geometry = sequences[0].geometry
    mean, count = np.mean(descriptors, axis=0)[chosen], len(descriptors)
    floor = systematic(geometry)[chosen, chosen]
    names = reference_names(geometry)
    scores = {name: _score(mean, count, reference(name), floor, chosen) for name in names}
    log_likelihood = {name: score for name, (score, _) in scores.items()}
    distance = {name: value for name, (_, value) in scores.items()}

    members: dict[str, list[str]] = {}
    for name in names:
        members.setdefault(reference(name).family, []).append(name)
    weight = {
        family: float(logsumexp([log_likelihood[name] for name in group]) - np.log(len(group)))
        for family, group in members.items()
    }
    if "AII+" in weight and all(one.doubled for one in sequences):
        weight["AII+"] += float(np.log(defaults.LEVEL_KRAMERS_WEIGHT))
    expected = sequences[0].expected_class
    if chosen.stop is not None and expected in weight:
        weight[expected] += float(np.log(defaults.LEVEL_EXPECTED_WEIGHT))
    total = logsumexp(list(weight.values()))
    posterior = {family: float(np.exp(value - total)) for family, value in weight.items()}
    best = max(weight, key=lambda family: weight[family])
    closest = max(members[best], key=lambda name: log_likelihood[name])
    others = [distance[name] for name in names if reference(name).family not in (best, "mixture")]
    return Evidence(
        log_likelihood=log_likelihood,
        distance=distance,
        posterior=posterior,
        closest=closest,
        fit=float(chi2.sf(distance[closest], mean.size)),
        contrast=float(np.sqrt(distance[closest] / min(others))),
    )


def scatter_probability(
    sequences: tuple[SequenceStatistics, ...], closest: str, ratios_only: bool = False
) -> float:
    """Probability of the scatter between sequences if all follow one ensemble; 1 for one sequence.

    chi^2 = sum_i N_i (x_i - x)^T C^-1 (x_i - x) with p (k - 1) degrees of freedom, C that of the
    reference `closest`; `ratios_only` leaves out what needs unfolding, as the evidence did.
    """
    if len(sequences) < 2:
        return 1.0
    counts = np.array([one.levels_used for one in sequences])
    chosen = slice(RATIO_MOMENTS) if ratios_only else slice(None)
    means = np.array([np.mean(one.descriptors, axis=0)[chosen] for one in sequences])
    centred = means - np.average(means, axis=0, weights=counts)
    whitened = np.linalg.solve(reference(closest).covariance[chosen, chosen], centred.T)
    value = float(np.sum(counts * np.einsum("ip,pi->i", centred, whitened)))
    return float(chi2.sf(value, means.shape[1] * (len(sequences) - 1)))
