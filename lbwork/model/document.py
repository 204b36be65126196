"""The source form of a model as a JSON document with the keys of a model file."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from lbwork.model.terms import Jump, Number, RandomOperator, Term

if TYPE_CHECKING:
    from lbwork.model.model import Model

__all__ = ["model_document", "number_document"]


def number_document(value: Number) -> float | str:
    """A number for a document: floats as they are, complex ones as expression text."""
    if isinstance(value, complex):
        if value.imag == 0:
            return value.real
        return f"{value.real!r}{'+' if value.imag >= 0 else '-'}{abs(value.imag)!r}j"
    return value


def model_document(model: Model) -> dict[str, Any]:
    """Keys ``name description sites local_dimension boundary parameters hamiltonian jump``."""
    return {
        "name": model.name,
        "description": model.description,
        "sites": model.sites,
        "local_dimension": model.local_dimension,
        "boundary": model.boundary,
        "parameters": {key: number_document(value) for key, value in model.parameters.items()},
        "hamiltonian": [_term_document(term) for term in model.hamiltonian],
        "jump": [_term_document(jump) for jump in model.jumps],
    }


def _term_document(item: Term | Jump) -> dict[str, Any]:
    document: dict[str, Any] = {}
    if isinstance(item.operator, str):
        document["operator"] = item.operator
    elif isinstance(item.operator, RandomOperator):
        document["random"] = {
            "kind": item.operator.kind,
            "range": item.operator.range,
            "seed": item.operator.seed,
        }
    else:
        document["matrix"] = [[number_document(entry) for entry in row] for row in item.operator]
    document["on"] = item.on if isinstance(item.on, str) else list(item.on)
    document["coefficient"] = _listed(item.coefficient)
    if isinstance(item, Jump):
        document["rate"] = _listed(item.rate)
    return document


def _listed(value: Number | tuple[Number, ...]) -> Any:
    if isinstance(value, tuple):
        return [number_document(entry) for entry in value]
    return number_document(value)
