"""The Lindblad generator of a model in all the forms the other rooms need."""

from lbwork.generator.certificates import GeneratorCertificate
from lbwork.generator.density import BulkDensity, bulk_two_site_density, two_site_density
from lbwork.generator.lindbladian import Lindbladian
from lbwork.generator.terms import (
    SuperTerm,
    doubled_to_vector,
    superoperator_terms,
    vector_to_doubled,
)

__all__ = [
    "BulkDensity",
    "GeneratorCertificate",
    "Lindbladian",
    "SuperTerm",
    "bulk_two_site_density",
    "doubled_to_vector",
    "superoperator_terms",
    "two_site_density",
    "vector_to_doubled",
]
