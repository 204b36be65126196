"""Dissipative spectral form factor of levels in the complex plane."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import numpy.typing as npt

from lbwork.errors import UsageError

__all__ = ["dissipative_form_factor"]


def dissipative_form_factor(
    spectra: Sequence[npt.NDArray[np.complex128]],
    times: npt.ArrayLike,
    angle: float = 0.0,
) -> npt.NDArray[np.float64]:
    """K(tau, phi) = < |sum_n exp(i tau (x_n cos phi + y_n sin phi))|^2 > / <n>, float64 (t,).

    spectra: levels x + i y of each sample of the average, (n_k,) each. times: (t,) values of tau,
    in the inverse unit of the levels. angle: phi in radians. K tends to 1 for late times; for
    class A it rises quadratically before, for independent levels there is no rise.
    Raises UsageError if there is no level.
    Source: J. Li, T. Prosen, A. Chan, Phys. Rev. Lett. 127, 170602 (2021); from memory.
    """
    tau = np.atleast_1d(np.asarray(times, dtype=np.float64))
    levels = sum(len(spectrum) for spectrum in spectra)
    if levels == 0:
        raise UsageError("the form factor needs at least one level")
    total = np.zeros(tau.size)
    for spectrum in spectra:
        projected = np.real(np.asarray(spectrum) * np.exp(-1j * angle))
        total += np.abs(np.sum(np.exp(1j * np.outer(tau, projected)), axis=1)) ** 2
    return total / levels
