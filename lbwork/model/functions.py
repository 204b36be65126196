"""Functions and constants that scalar expressions may use."""

from __future__ import annotations

import cmath
import hashlib
import math
from collections.abc import Callable, Mapping

__all__ = ["CONSTANTS", "FUNCTIONS"]


def _random(seed: complex, place: complex) -> complex:
    """Uniform number in [-1, 1], a pure function of (seed, place)."""
    if seed.imag or place.imag:
        raise ValueError("its arguments must be real")
    # Adding zero turns -0.0 into 0.0; 17 digits tell any two doubles apart.
    key = f"{seed.real + 0.0:.17g}|{place.real + 0.0:.17g}".encode()
    number = int.from_bytes(hashlib.sha256(key).digest()[:8], "big")
    return complex(2 * (number / 2**64) - 1)


FUNCTIONS: Mapping[str, tuple[int, Callable[..., complex]]] = {
    "exp": (1, cmath.exp),
    "log": (1, cmath.log),
    "sqrt": (1, cmath.sqrt),
    "sin": (1, cmath.sin),
    "cos": (1, cmath.cos),
    "tan": (1, cmath.tan),
    "sinh": (1, cmath.sinh),
    "cosh": (1, cmath.cosh),
    "tanh": (1, cmath.tanh),
    "abs": (1, lambda x: complex(abs(x))),
    "conj": (1, lambda x: x.conjugate()),
    "real": (1, lambda x: complex(x.real)),
    "imag": (1, lambda x: complex(x.imag)),
    "random": (2, _random),
}
"""Functions and how many arguments they take; ``random(seed, j)`` is reproducible disorder."""

CONSTANTS: Mapping[str, complex] = {"pi": complex(math.pi), "e": complex(math.e)}
