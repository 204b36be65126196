"""Settings of the whole suite: no screen, reproducible random cases, one thread per library."""

import os

os.environ.setdefault("OMP_NUM_THREADS", "1")
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
os.environ.setdefault("MPLBACKEND", "Agg")

import hypothesis

hypothesis.settings.register_profile(
    "lbwork", deadline=None, derandomize=True, max_examples=40, database=None
)
hypothesis.settings.load_profile("lbwork")
