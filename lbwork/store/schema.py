"""Names and numbers of the run-file format; DEVELOPERS.md describes every field.

``SCHEMA`` counts layouts: it grows by one whenever a reader of the old number could misread a new
file, and each growth comes with a named step in :mod:`lbwork.store.migration` and a golden file.
"""

from __future__ import annotations

import re
from typing import Final

from lbwork.errors import StoreError

__all__ = [
    "CLOSING_STATUSES",
    "DOCUMENT",
    "FAMILIES",
    "FORMAT",
    "SCHEMA",
    "SUFFIX",
    "checked_kind",
    "checked_name",
    "checked_text",
    "file_words",
    "sector_name",
]

SCHEMA: Final = 2
"""Schema number written by this version."""

FORMAT: Final = "lbwork run"
"""Root attribute ``format`` of every file of the store."""

SUFFIX: Final = ".h5"

DOCUMENT: Final = "document"
"""Dataset of a record that holds its JSON document."""

FAMILIES: Final = ("sectors", "results", "figures", "resumptions")
"""Groups of records below the root: what is computed sector by sector, named results, pictures,
and one record for each time the run was taken up again."""

CLOSING_STATUSES: Final = ("complete", "uncertified", "failed")
"""How a run can end: everything done; done, but a certificate failed; given up for good."""

_KIND = re.compile(r"[a-z][a-z0-9-]{0,31}")
_NAME = re.compile(r"[a-z0-9][a-z0-9_.+-]{0,99}")
_UNSAFE = re.compile(r"[^A-Za-z0-9_+.]+")


def checked_kind(kind: str) -> str:
    """``kind`` itself when it is a lower-case word such as ``spectrum``; StoreError otherwise."""
    if not _KIND.fullmatch(kind):
        raise StoreError(
            f"run kind '{kind}' is not a lower-case word of letters, digits and '-'; "
            "write e.g. spectrum"
        )
    return kind


def checked_name(name: str, what: str = "result") -> str:
    """``name`` itself when it can be an HDF5 group and a file name anywhere; StoreError otherwise.

    Lower case only, since two names that differ by case are one file on some file systems.
    """
    if not _NAME.fullmatch(name):
        raise StoreError(
            f"{what} name '{name}' must be lower-case letters, digits and _ . + - only; "
            "write e.g. level-statistics"
        )
    return name


def checked_text(text: str, what: str) -> str:
    """``text`` itself when HDF5 keeps it exactly as UTF-8; StoreError otherwise."""
    if "\0" in text:
        raise StoreError(f"{what} holds a NUL character; remove it")
    try:
        text.encode("utf-8")
    except UnicodeEncodeError as error:
        raise StoreError(
            f"{what} is not valid UTF-8 at character {error.start + 1}; remove this character"
        ) from None
    return text


def file_words(text: str) -> str:
    """A model name as part of a file name: at most 40 plain characters, never empty."""
    return _UNSAFE.sub("-", text)[:40].strip("-.") or "model"


def sector_name(index: int) -> str:
    """Group name of sector ``index`` (0-based): six digits, so that names sort as numbers do."""
    if isinstance(index, bool) or not 0 <= index <= 999_999:
        raise StoreError(f"sector index {index} is not in 0..999999")
    return f"{index:06d}"
