"""The verdict in words."""

from __future__ import annotations

__all__ = ["class_name", "finding", "reason_undecided"]

_NAMES = {"A": "A", "AI+": "AI-dagger", "AII+": "AII-dagger"}
_SIGNS = {
    "A": "the absence of a transposition symmetry",
    "AI+": "its symmetry under transposition",
    "AII+": "its transposition symmetry of square -1",
}


def class_name(symbol: str) -> str:
    """A, AI-dagger or AII-dagger."""
    return _NAMES[symbol]


def _chaotic(family: str, expected: str) -> str:
    if family == expected:
        return f"chaotic, class {_NAMES[family]}, as {_SIGNS[expected]} requires"
    return (
        f"statistics of class {_NAMES[family]} although class {_NAMES[expected]} is expected from "
        f"{_SIGNS[expected]}: look for a further antiunitary or transposition symmetry of the "
        "sector, or for one assumed and broken"
    )


def finding(family: str, closest: str, expected: str) -> str:
    """What a decided verdict means; `closest` is the reference of highest likelihood."""
    if family == "poisson":
        return (
            "independent levels (2D Poisson), as regular or integrable generators have; many "
            "unresolved symmetry blocks look the same"
        )
    if family == "1d-poisson":
        return (
            "levels on a line without correlations (Poisson), as integrable systems or many "
            "unresolved symmetry blocks have"
        )
    if family == "mixture":
        name, _, blocks = closest.partition(" x")
        return (
            f"a superposition of independent chaotic blocks, closest to {blocks} of class "
            f"{_NAMES.get(name, name.removeprefix('1d-'))}: an unresolved symmetry is likely, "
            "resolve it before judging; a crossover between regular and chaotic looks similar"
        )
    if family.startswith("1d-"):
        return f"levels on a line with the repulsion of the {family.removeprefix('1d-')}: chaotic"
    return _chaotic(family, expected)


def reason_undecided(
    levels: int, minimum: int, ranked: tuple[str, str], confidence: float, fits: bool
) -> str:
    """Why there is no verdict; `ranked` are the two most probable families."""
    if levels < minimum:
        return (
            f"undecided: {levels} reference levels, at least {minimum} are needed; take a larger "
            "chain or more sectors"
        )
    if not fits:
        return (
            f"undecided: no reference describes the levels, {ranked[0]} comes closest; partly "
            "integrable spectra, blocks of unequal size or steep density gradients do this"
        )
    return (
        f"undecided between {ranked[0]} and {ranked[1]} (probability of the former "
        f"{confidence:.2f}); more levels are needed"
    )
