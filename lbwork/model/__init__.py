"""What is simulated: operators, expressions, the frozen Model, model files, published models."""

from lbwork.model.bundled import CatalogueEntry, catalogue, catalogue_entry, load_model
from lbwork.model.files import model_from_toml, model_to_toml
from lbwork.model.model import Model
from lbwork.model.operators import local_operator
from lbwork.model.places import PlacedJump, PlacedOperator
from lbwork.model.terms import Jump, RandomOperator, Term

__all__ = [
    "CatalogueEntry",
    "Jump",
    "Model",
    "PlacedJump",
    "PlacedOperator",
    "RandomOperator",
    "Term",
    "catalogue",
    "catalogue_entry",
    "load_model",
    "local_operator",
    "model_from_toml",
    "model_to_toml",
]
