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

# levels
LEVEL_DEGENERACY_TOLERANCE: Final = 1e-9
"""Levels closer than this times the radius of their spectrum are one degenerate level."""

LEVEL_AXIS_TOLERANCE: Final = 1e-9
"""A level whose distance from the real axis is below this times the radius of the spectrum is real;
a spectrum whose width is below it lies on a line."""

LEVEL_CONJUGATION_TOLERANCE: Final = 1e-7
"""A spectrum is closed under conjugation when every mirror level is found within this times the
radius; wider than the degeneracy tolerance, since generators are non-normal."""

LEVEL_ERROR_SHARE: Final = 0.1
"""A level is used only if its error bound is below this share of its nearest-neighbour distance."""

LEVEL_REFUSED_SHARE: Final = 0.2
"""A sequence with a larger share of unreliable levels is refused as a whole."""

LEVEL_EDGE_NEIGHBOURS: Final = 24
"""Neighbours that measure the local density and how one-sided the surroundings of a level are."""

LEVEL_EDGE_OFFSET: Final = 0.28
"""Bulk cut: a level is at the edge when the centroid of its neighbours is farther from it than this
times the radius they reach; in a flat disc this cuts a rim 1.2 mean spacings deep."""

LEVEL_REAL_BAND: Final = 2.0
"""Reference levels of a real matrix lie this many local mean spacings or more off the real axis."""

LEVEL_LINE_CUT: Final = 0.05
"""Share of the levels dropped at each end of a spectrum on a line."""

LEVEL_SEQUENCE_MINIMUM: Final = 60
"""Distinct levels below which a sequence is left out."""

LEVEL_VERDICT_MINIMUM: Final = 100
"""Reference levels below which the verdict is undecided."""

LEVEL_CONFIDENCE_MINIMUM: Final = 0.6
"""Posterior probability below which the verdict is undecided."""

LEVEL_KRAMERS_WEIGHT: Final = 2.0
"""Prior weight of class AII-dagger, relative to every other family, when all levels are exactly
twofold: it forces the doublets, the others need two sectors that share one spectrum."""

LEVEL_UNFOLDING_MINIMUM: Final = 300
"""Shorter sequences (mean over reference levels) are judged by spacing ratios alone."""

LEVEL_CLASS_CONFLICT: Final = 2.0
"""Log-likelihood by which ratios may prefer another class before they decide alone."""

LEVEL_CONFLICT_SHARE: Final = 0.1
"""Share of levels with another sure verdict above which sequences are not pooled."""

LEVEL_EXPECTED_WEIGHT: Final = 4.0
"""Prior weight of the class that symmetry asks for, where ratios alone decide."""

LEVEL_FIT_MINIMUM: Final = 1e-3
"""Goodness-of-fit probability below which a reference does not describe the levels."""

LEVEL_DISTANCE_RATIO: Final = 0.4
"""A reference that fails the fit in detail is still named when it is closer than this share of the
distance of the next single ensemble: finite spectra are never exactly in the limit of large
matrices."""

LEVEL_SURE_CONFIDENCE: Final = 0.95
"""Probability from which the verdict on one sequence is held against that of the others."""

LEVEL_SCATTER_MINIMUM: Final = 1e-6
"""Probability of the scatter between sequences below which differing sure verdicts conflict."""

LEVEL_BOOTSTRAP_SAMPLES: Final = 1000
"""Block-bootstrap samples behind each interval."""

LEVEL_BOOTSTRAP_BLOCK: Final = 16
"""Neighbouring levels that are redrawn together, since they share neighbours."""

# generator
GENERATOR_TOLERANCE: Final = 1e-12
"""Relative defect of trace, Hermiticity and positivity above which a generator is not certified."""

# spectrum
PART_DROP_TOLERANCE: Final = 1e-14
"""Entries of a sector block below this times its norm are zero when it is split into parts."""

DENSE_THREADS: Final = 1
"""BLAS threads of a dense solve; fixed, since the number changes the last bits, and one is fastest
on a loaded machine."""

TRACE_TOLERANCE: Final = 1e-11
"""Trace identities of a sector: error over sqrt(n) times the Frobenius norm (its square)."""

LEVEL_RESIDUAL_TOLERANCE: Final = 1e-11
"""Smallest singular value of B - lambda over the norm of B at sampled levels."""

LEVEL_SAMPLES: Final = 3
"""Levels of a sector whose residual is recomputed; one only where a sample costs seconds."""

LEVEL_SAMPLES_CHEAP_DIMENSION: Final = 800
"""Part size up to which all samples are drawn."""

IDENTICAL_PART_DIMENSION: Final = 64
"""Parts up to this size are compared byte by byte, so that identical ones are solved once."""

DENSE_SECONDS_REAL: Final = 8e-10
DENSE_SECONDS_COMPLEX: Final = 1.7e-9
"""Seconds of a dense sector over the cube of its dimension, one core at about 10 Gflop/s."""

DENSE_BYTES_REAL: Final = 48
DENSE_BYTES_COMPLEX: Final = 52
DENSE_BYTES_LINEAR: Final = 60_000
"""Peak bytes of a dense sector: times the square, and times the dimension."""

# gap
GAP_DENSE_DIMENSION: Final = 1500
"""Irreducible parts up to this size are diagonalised densely when the gap is sought."""

GAP_ITERATIVE_DIMENSION: Final = 400_000
"""Largest part that the filtered Krylov search of the slowest levels takes."""

GAP_LEVELS: Final = 6
"""Slowest levels sought in each large part."""

GAP_RESIDUAL_TOLERANCE: Final = 1e-9
"""Largest ||L v - lambda v|| / ||L|| of a certified gap."""

GAP_AGREEMENT_TOLERANCE: Final = 1e-7
"""Two independent starts agree when their gaps differ by less than this share."""

GAP_EXHAUSTIVE_SPACE: Final = 16384
"""Largest d**(2L) whose gap is sought exhaustively in all sectors."""

GAP_FALLBACK_SPACE: Final = 65536
"""Largest d**(2L) that is searched exhaustively after the search near zero failed."""

GAP_NEAREST_TOLERANCE: Final = 2e-11
"""Residual over the norm of the generator at which a level nearest to zero has converged."""

DAVIDSON_CAPACITY: Final = 24
DAVIDSON_KEPT: Final = 9
DAVIDSON_STARTS: Final = 4
"""Search space of the levels nearest to zero: largest, kept at a restart, random start vectors."""

GAP_ORDERED: Final = 2
"""Levels after the nearest that are followed until their order is certain."""

FILTER_DEGREE: Final = 24
FILTER_STEP: Final = 8.0
FILTER_TIME: Final = 64.0
"""Taylor polynomial of exp(t L): degree and time of one step and total time, times 1/||L||."""

# steady
STEADY_DENSE_DIMENSION: Final = 1500
"""Sectors up to this size are factorised densely when zero modes are sought."""

STEADY_SPACE_DIMENSION: Final = 40_000_000
"""Largest number of entries d**(2L) of a density matrix that is built."""

STEADY_SECTOR_SPACE: Final = 4096
"""Largest d**(2L) that is solved sector by sector rather than matrix-free."""

STEADY_DEGENERATE_SPACE: Final = 1_100_000
"""Largest d**(2L) for which several steady states are told apart."""

STEADY_RESIDUAL_TOLERANCE: Final = 1e-9
"""Largest ||L rho|| / (||L|| ||rho||) of a certified steady state."""

STEADY_ACCURACY: Final = 1e-6
"""Largest residual over the separation from the next mode: the error of the state itself."""

STEADY_NEGATIVITY: Final = 1e-8
"""Smallest eigenvalue of a certified density matrix is above minus this."""

STEADY_POSITIVE: Final = 1e-10
"""A state with all eigenvalues above this is taken as having full rank."""

STEADY_NEAR_DEGENERATE: Final = 1e-5
"""Separation over the generator norm below which a steady state is called nearly degenerate."""

ITERATIVE_SHIFT: Final = 0.6
"""Shift of the split preconditioner over the mean decay rate; the count of applications is flat
between 0.5 and 0.8 for boundary drives of 6 to 12 sites."""

ITERATIVE_DARK_SHIFT: Final = 1e-8
"""Shift of the Sylvester preconditioner over the mean decay rate: dark states stay finite."""

ITERATIVE_TOLERANCE: Final = 1e-10
"""||L rho|| / ||rho|| that the linear solver aims at."""

ITERATIVE_RESTART: Final = 80
"""Basis vectors of a Krylov cycle where memory does not ask for fewer."""

ITERATIVE_LIMIT: Final = 400
"""Applications after which a linear equation is given up."""

ITERATIVE_BASIS_BYTES: Final = 700_000_000
"""A double-precision basis above this is replaced by one in single precision."""

ITERATIVE_TRIAL_DIMENSIONS: Final = (64, 256)
"""Largest d**L of the two shorter chains that the choice of the splitting is tried on."""

ITERATIVE_TRIAL_LIMIT: Final = 150
"""Applications after which a trial counts as lost."""

ITERATIVE_COUNT_DIMENSION: Final = 1100
"""d**L up to which the lower count of applications decides, above it the lower time."""

ITERATIVE_DENSE_SIZE: Final = 600
"""Components up to this size are solved densely."""

PROCESS_BYTES: Final = 190_000_000
SECTOR_PROCESS_BYTES: Final = 240_000_000
"""Resident size of a process that has loaded the package, without and with sector bases."""

PLAN_SECONDS: Final = 0.5
"""Finding the symmetries, trying splittings on short chains, loading compiled loops."""

SECTOR_SECONDS: Final = 0.03
SEARCH_SECONDS: Final = 1e-3
SEARCH_BYTES: Final = 5000
"""Exhaustive gap: assembling a sector, and per state of a large sector the Krylov search."""

LOCAL_SECONDS: Final = 1.6e-9
PASS_SECONDS: Final = 1.2e-8
ORTHOGONAL_SECONDS: Final = 1e-9
"""Seconds per entry of a vector: for each non-zero of the local terms, for the passes over the
vector in one application, and for each basis vector in the orthogonalisation; two cores."""

EIGEN_OPERATIONS: Final = 25.0
"""Operations of a Hermitian eigen-decomposition over the cube of its dimension, counted at the rate
of matrix products (it runs at a third of it)."""

EIGEN_SECONDS: Final = 3e-11
"""Seconds per operation of the eigenvalues of a complex Hermitian block."""

CERTIFICATE_SECONDS: Final = 1.2e-8
"""Seconds per byte of a density matrix for residual, observables and continuity."""

COUNTING_TOLERANCE: Final = 1e-11
"""Relative residual of the equations behind the cumulants."""

SCHMIDT_TOLERANCE: Final = 1e-12
"""Schmidt weights of a normalised operator below this are not counted in its rank."""

RELAXATION_ORDER: Final = 24
"""Krylov vectors of one time step."""

RELAXATION_TOLERANCE: Final = 1e-11
"""Frobenius error per unit of time over the length of the initial operator."""

CONSERVATION_TOLERANCE: Final = 1e-12
"""A term conserves the magnetisation when it changes it by less than this times its norm."""

FILTER_SMALLEST_DIMENSION: Final = 60
"""Blocks up to this size are always solved directly instead of by a Krylov search."""

# integrability
RESHETIKHIN_TOLERANCE: Final = 1e-9
"""Relative residual below which a Reshetikhin-type condition is satisfied."""

RESHETIKHIN_COMMUTING: Final = 1e-12
"""||C|| / ||q||^3 below which neighbouring densities commute."""

CHARGES_TOLERANCE: Final = 1e-9
"""Singular values below this times the largest belong to conserved operators."""

CHARGES_ENTRIES: Final = 60_000_000
"""Largest number of entries of a sparse commutator map."""

CHARGES_DENSE_ENTRIES: Final = 60_000_000
"""Largest number of entries of a part that does not decouple and is solved densely."""

CHARGES_RANGE: Final = 4
"""Range of conserved charges that is searched unless another is asked for."""

CHARGES_STRINGS: Final = 1_100_000
"""Largest number of strings that elimination takes."""

CHARGES_LISTED: Final = 64
"""Spaces of conserved operators up to this dimension are given a readable basis."""

CHARGES_TERMS: Final = 500_000
"""Coefficients, all operators together, up to which a space is given a readable basis."""

CHARGES_RESIDUAL: Final = 1e-9
"""Largest ||[Q, A]|| / (||q|| ||A||) of a conserved operator."""

CHARGES_FINITE_DIMENSION: Final = 70_000
"""Largest number of states of a chain on which a charge is checked."""

CHARGES_NEAR_STRINGS: Final = 70_000
"""Largest number of strings among which nearly conserved operators are sought."""

CHARGES_NEAR_PART: Final = 4500
"""Largest decoupled part among which nearly conserved operators are sought."""

SUBCHAIN_TOLERANCE: Final = 1e-9
"""Leakage out of diagonal density matrices, and error of rates, relative to the generator."""

SUBCHAIN_STATES: Final = 1_100_000
"""Largest number of states of a classical process that is solved."""

SUBCHAIN_DENSE: Final = 400
"""Classical processes up to this size are solved densely."""

SUBCHAIN_LISTED: Final = 8
"""Stationary states of a large process up to which its gap is sought."""

SUBCHAIN_RESIDUAL: Final = 1e-9
"""Largest residual of a stationary distribution and of the slowest level."""

YANG_BAXTER_TOLERANCE: Final = 1e-9
"""Largest relative residual of a relation of an R-matrix that holds."""

FLOW_ORDERS: Final = 20
"""Orders of the power series of an R-matrix that is integrated from a density."""

FLOW_DIMENSION: Final = 6
"""States per site up to which an R-matrix is integrated from a density."""

FLOW_TOLERANCE: Final = 1e-9
"""Largest relative residual of each order, and of the Yang-Baxter relation of the result."""
