"""Every tolerance and default value of lbwork, in one place and nowhere else.

Rates and energies are in units of the coupling, hbar = 1; tolerances are relative unless said.
"""

from __future__ import annotations

from typing import Final

# ground
MEMORY_SHARE: Final = 0.8
"""Share of the available memory a task may plan to use."""

# symmetry
SYMMETRY_TOLERANCE: Final = 1e-10
"""A symmetry is accepted when its commutator norm over the generator norm is below this."""

# zero modes
ZERO_MODE_TOLERANCE: Final = 1e-10
"""An eigenvalue below this times the norm of the generator counts as a zero mode."""
