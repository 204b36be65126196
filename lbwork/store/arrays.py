"""Arrays as HDF5 datasets that any tool can read, and back bit by bit.

Complex numbers are kept as a real dataset with a last axis [re, im] and booleans as bytes: both
would otherwise become compound or enumeration types made up on the fly, which other readers refuse.
The attribute ``meaning`` ("complex" or "boolean") tells which; plain numbers carry none.
"""

from __future__ import annotations

from typing import Any, Final

import h5py
import numpy as np

from lbwork.errors import StoreError

__all__ = ["MEANING", "checked_array", "read_array", "write_array"]

MEANING: Final = "meaning"

_HALVES: Final = {"complex64": np.float32, "complex128": np.float64}
_PLAIN: Final = frozenset(
    ("float32", "float64", "int8", "int16", "int32", "int64", "uint8", "uint16", "uint32", "uint64")
)


def checked_array(array: Any, place: str) -> np.ndarray:
    """A contiguous array in native byte order of a type the store keeps; StoreError otherwise.

    Kept are booleans, integers of 8 to 64 bits, float32 and float64, complex64 and complex128.
    """
    try:
        plain = np.asarray(array)
    except ValueError as error:
        raise StoreError(f"array {place} has rows of different lengths ({error})") from None
    native = np.array(plain, dtype=plain.dtype.newbyteorder("="), order="C", copy=None)
    kind = native.dtype.name
    if kind != "bool" and kind not in _PLAIN and kind not in _HALVES:
        raise StoreError(
            f"array {place} is of type {kind}, which the store does not keep; "
            "pass real, complex or integer numbers, and texts in the document"
        )
    return native


def write_array(group: h5py.Group, name: str, array: np.ndarray) -> None:
    """Write an array that :func:`checked_array` has passed as dataset ``name`` of ``group``."""
    kind = array.dtype.name
    if kind in _HALVES:
        # The view keeps every bit, signed zeros and NaN payloads included.
        pairs = array.reshape(*array.shape, 1).view(_HALVES[kind])
        group.create_dataset(name, data=pairs).attrs[MEANING] = "complex"
    elif kind == "bool":
        group.create_dataset(name, data=array.astype(np.uint8)).attrs[MEANING] = "boolean"
    else:
        group.create_dataset(name, data=array)


def read_array(dataset: h5py.Dataset) -> np.ndarray:
    """The array as it was handed to :func:`write_array`; StoreError when its form is not ours."""
    stored = np.asarray(dataset[()])
    meaning = dataset.attrs.get(MEANING)
    if meaning is None:
        return stored
    if meaning == "boolean" and stored.dtype == np.uint8:
        return stored.astype(np.bool_)
    widths = {np.dtype(half): np.dtype(whole) for whole, half in _HALVES.items()}
    if meaning == "complex" and stored.dtype in widths and stored.shape[-1:] == (2,):
        return np.ascontiguousarray(stored).view(widths[stored.dtype])[..., 0]
    raise StoreError(
        f"dataset {dataset.name} is marked '{meaning}' but holds {stored.dtype} {stored.shape}"
    )
