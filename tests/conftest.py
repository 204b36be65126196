"""Settings of the whole suite: no screen, reproducible random cases, one thread per library."""

import os

import hypothesis

# Set before the first import of NumPy or Numba, and inherited by processes that tests start: the
# number of threads changes the last bits of a result.
for _library in ("OMP", "OPENBLAS", "MKL", "NUMBA", "NUMEXPR"):
    os.environ[f"{_library}_NUM_THREADS"] = "1"
os.environ["MPLBACKEND"] = "Agg"

hypothesis.settings.register_profile(
    "lbwork", deadline=None, derandomize=True, max_examples=40, database=None
)
hypothesis.settings.load_profile("lbwork")
