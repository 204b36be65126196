"""Scalar and operator expressions of model files: a small whitelisted grammar, nothing else.

::

    sum      := ["+" | "-"] product { ("+" | "-") product }
    product  := power { ["*" | "/"] power }        juxtaposed operators stand on neighbouring sites
    power    := atom [ ("**" | "^") whole number or scalar ] { "." atom }    a dot: same site
    atom     := number | name | function "(" sum { "," sum } ")" | "(" sum ")"

There is no ``eval``, no attribute access, and length, depth and operator range are bounded.
"""

from __future__ import annotations

import cmath
import difflib
import hashlib
import math
import re
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass

import numpy as np

from lbwork.errors import ExpressionError

__all__ = ["FUNCTIONS", "LocalOperator", "evaluate", "names_in", "nearest"]

MAX_LENGTH = 2000
MAX_DEPTH = 40
MAX_RANGE = 3
MAX_POWER = 16

_TOKEN = re.compile(
    r"\s*(?:(?P<number>(?:\d+\.\d*|\.\d+|\d+)(?:[eE][+-]?\d+)?j?(?![A-Za-z_0-9]))"
    r"|(?P<name>S[+-]|[A-Za-z_][A-Za-z_0-9]*)"
    r"|(?P<symbol>\*\*|[-+*/^().,])|(?P<bad>\S))"
)


@dataclass(frozen=True, eq=False)
class LocalOperator:
    """An operator on ``count`` neighbouring sites: complex128 matrix (d**count, d**count)."""

    count: int
    matrix: np.ndarray


Value = complex | LocalOperator


def _random(seed: complex, place: complex = 0) -> complex:
    """Uniform number in [-1, 1], a pure function of (seed, place)."""
    key = f"{seed.real:.12g}|{place.real:.12g}".encode()
    number = int.from_bytes(hashlib.sha256(key).digest()[:8], "big")
    return complex(2 * (number / 2**64) - 1)


FUNCTIONS: Mapping[str, tuple[int, Callable[..., complex]]] = {
    "exp": (1, cmath.exp),
    "log": (1, cmath.log),
    "sqrt": (1, cmath.sqrt),
    "sin": (1, cmath.sin),
    "cos": (1, cmath.cos),
    "tan": (1, cmath.tan),
    "sinh": (1, cmath.sinh),
    "cosh": (1, cmath.cosh),
    "tanh": (1, cmath.tanh),
    "abs": (1, lambda x: complex(abs(x))),
    "conj": (1, lambda x: x.conjugate()),
    "real": (1, lambda x: complex(x.real)),
    "imag": (1, lambda x: complex(x.imag)),
    "random": (2, _random),
}
"""Functions and how many arguments they take; ``random(seed, j)`` is reproducible disorder."""

CONSTANTS: Mapping[str, complex] = {"pi": complex(math.pi)}


def nearest(word: str, known: Iterable[str]) -> str:
    """`` (did you mean 'x'?)`` for the known word closest to ``word``, else an empty string."""
    close = difflib.get_close_matches(word, sorted(known), n=1, cutoff=0.5)
    return f" (did you mean '{close[0]}'?)" if close else ""


def _tokens(text: str, place: str) -> list[tuple[str, str]]:
    if len(text) > MAX_LENGTH:
        raise ExpressionError(
            f"{place}: expression of {len(text)} characters is longer than {MAX_LENGTH}; split it "
            "into several terms"
        )
    found = []
    position = 0
    while position < len(text):
        match = _TOKEN.match(text, position)
        if match is None:
            break
        kind = match.lastgroup or "bad"
        if kind == "bad":
            raise ExpressionError(
                f"{place}: character {match.group(kind)!r} is not allowed in '{_short(text)}'; "
                "use numbers, names, + - * / ^ . and parentheses"
            )
        found.append((kind, match.group(kind)))
        position = match.end()
    if not found:
        raise ExpressionError(f"{place}: empty expression; write e.g. 0.5 or X X")
    return found


def _short(text: str) -> str:
    flat = " ".join(text.split())
    return flat if len(flat) <= 60 else flat[:57] + "..."


def names_in(text: str, place: str) -> set[str]:
    """All names that an expression mentions (parameters, operators, functions)."""
    return {word for kind, word in _tokens(text, place) if kind == "name"}


class _Parser:
    """Evaluates while it parses; ``values`` are scalars, ``operators`` makes on-site matrices."""

    def __init__(
        self,
        text: str,
        values: Mapping[str, complex],
        operators: Callable[[str], np.ndarray | None] | None,
        known_operators: Iterable[str],
        place: str,
    ) -> None:
        self.text = text
        self.place = place
        self.tokens = _tokens(text, place)
        self.position = 0
        self.depth = 0
        self.values = values
        self.operators = operators
        self.known_operators = tuple(known_operators)

    def fail(self, reason: str) -> ExpressionError:
        return ExpressionError(f"{self.place}: {reason} in '{_short(self.text)}'")

    def peek(self) -> tuple[str, str]:
        if self.position < len(self.tokens):
            return self.tokens[self.position]
        return "end", ""

    def take(self, symbol: str) -> bool:
        if self.peek() == ("symbol", symbol):
            self.position += 1
            return True
        return False

    def whole(self) -> Value:
        result = self.sum()
        if self.peek()[0] != "end":
            raise self.fail(f"unexpected '{self.peek()[1]}'; check the parentheses")
        return result

    def sum(self) -> Value:
        self.depth += 1
        if self.depth > MAX_DEPTH:
            raise self.fail(f"parentheses deeper than {MAX_DEPTH}; simplify")
        sign = -1.0 if self.take("-") else 1.0
        if sign > 0:
            self.take("+")
        total = self._scaled(self.product(), sign)
        while True:
            if self.take("+"):
                total = self._added(total, self.product())
            elif self.take("-"):
                total = self._added(total, self._scaled(self.product(), -1.0))
            else:
                self.depth -= 1
                return total

    def product(self) -> Value:
        result = self.power()
        while True:
            kind, word = self.peek()
            if self.take("*"):
                result = self._times(result, self.power())
            elif self.take("/"):
                result = self._divided(result, self.power())
            elif kind in ("number", "name") or word == "(":
                result = self._beside(result, self.power())
            else:
                return result

    def power(self) -> Value:
        base = self.atom()
        if self.take("**") or self.take("^"):
            sign = -1.0 if self.take("-") else 1.0
            exponent = self.atom()
            if isinstance(exponent, LocalOperator):
                raise self.fail("an operator cannot be an exponent")
            base = self._raised(base, sign * exponent)
        while self.take("."):
            base = self._same_site(base, self.atom())
        return base

    def atom(self) -> Value:
        kind, word = self.peek()
        self.position += 1
        if kind == "number":
            return self._finite(complex(word))
        if kind == "name":
            return self._named(word)
        if word == "(":
            inner = self.sum()
            if not self.take(")"):
                raise self.fail("a parenthesis is not closed")
            return inner
        if kind == "end":
            raise self.fail("the expression ends too early")
        if word in "+-":
            raise self.fail(f"two signs in a row at '{word}'; use parentheses")
        raise self.fail(f"unexpected '{word}'")

    def _named(self, word: str) -> Value:
        if self.peek() == ("symbol", "(") and word in FUNCTIONS:
            return self._called(word)
        if word in self.values:
            return self.values[word]
        if word in CONSTANTS:
            return CONSTANTS[word]
        if self.operators is not None:
            matrix = self.operators(word)
            if matrix is not None:
                return LocalOperator(1, matrix)
        known = [*self.values, *CONSTANTS, *FUNCTIONS, *self.known_operators]
        kinds = (
            "parameter, function or operator" if self.known_operators else "parameter or function"
        )
        raise self.fail(f"'{word}' is not a known {kinds}{nearest(word, known)}")

    def _called(self, word: str) -> complex:
        count, function = FUNCTIONS[word]
        self.take("(")
        arguments = [self.sum()]
        while self.take(","):
            arguments.append(self.sum())
        if not self.take(")"):
            raise self.fail("a parenthesis is not closed")
        if len(arguments) != count:
            raise self.fail(f"{word}() takes {count} argument(s), got {len(arguments)}")
        scalars = []
        for argument in arguments:
            if isinstance(argument, LocalOperator):
                raise self.fail(f"{word}() takes numbers, not operators")
            scalars.append(argument)
        try:
            return self._finite(function(*scalars))
        except (ValueError, OverflowError, ZeroDivisionError) as error:
            raise self.fail(f"{word}() has no finite value there ({error})") from None

    def _finite(self, value: complex) -> complex:
        if not cmath.isfinite(value):
            raise self.fail("a value is infinite or not a number")
        return value

    def _checked(self, operator: LocalOperator) -> LocalOperator:
        if not np.all(np.isfinite(operator.matrix)):
            raise self.fail("an operator has infinite entries")
        return operator

    def _scaled(self, value: Value, factor: complex) -> Value:
        if isinstance(value, LocalOperator):
            return self._checked(LocalOperator(value.count, factor * value.matrix))
        return self._finite(value * factor)

    def _added(self, left: Value, right: Value) -> Value:
        if isinstance(left, LocalOperator) and isinstance(right, LocalOperator):
            if left.count != right.count:
                raise self.fail(
                    f"a sum mixes operators on {left.count} and {right.count} sites; fill up with I"
                )
            return self._checked(LocalOperator(left.count, left.matrix + right.matrix))
        if isinstance(left, LocalOperator) or isinstance(right, LocalOperator):
            raise self.fail("a number is added to an operator; multiply the number with I")
        return self._finite(left + right)

    def _times(self, left: Value, right: Value) -> Value:
        if isinstance(left, LocalOperator) and isinstance(right, LocalOperator):
            raise self.fail(
                "'*' between operators is ambiguous; write a space for the next site or a dot for "
                "the same site"
            )
        if isinstance(right, LocalOperator):
            return self._scaled(right, _scalar(left))
        return self._scaled(left, right)

    def _divided(self, left: Value, right: Value) -> Value:
        if isinstance(right, LocalOperator):
            raise self.fail("division by an operator")
        if right == 0:
            raise self.fail("division by zero")
        try:
            return self._scaled(left, 1 / right)
        except (OverflowError, ZeroDivisionError):
            raise self.fail("division overflows") from None

    def _beside(self, left: Value, right: Value) -> Value:
        if not isinstance(left, LocalOperator):
            return self._times(left, right)
        if not isinstance(right, LocalOperator):
            raise self.fail("a number stands after an operator; write it in front")
        count = left.count + right.count
        if count > MAX_RANGE:
            raise self.fail(f"an operator spans {count} sites; at most {MAX_RANGE} are allowed")
        return self._checked(LocalOperator(count, np.kron(left.matrix, right.matrix)))

    def _same_site(self, left: Value, right: Value) -> Value:
        if not (isinstance(left, LocalOperator) and isinstance(right, LocalOperator)):
            raise self.fail("a dot joins two operators on the same site")
        if left.count != right.count:
            raise self.fail("a dot joins operators on the same number of sites")
        return self._checked(LocalOperator(left.count, left.matrix @ right.matrix))

    def _raised(self, base: Value, exponent: complex) -> Value:
        if isinstance(base, LocalOperator):
            power = round(exponent.real)
            if exponent != power or not 0 <= power <= MAX_POWER:
                raise self.fail(f"an operator's power must be a whole number 0..{MAX_POWER}")
            return self._checked(
                LocalOperator(base.count, np.linalg.matrix_power(base.matrix, power))
            )
        try:
            if exponent.imag == 0 and exponent.real == int(exponent.real):
                return self._finite(base ** int(exponent.real))
            return self._finite(base**exponent)
        except (OverflowError, ZeroDivisionError):
            raise self.fail("a power is infinite") from None


def _scalar(value: Value) -> complex:
    return complex("nan") if isinstance(value, LocalOperator) else value


def evaluate(
    text: str,
    values: Mapping[str, complex],
    *,
    place: str,
    operators: Callable[[str], np.ndarray | None] | None = None,
    known_operators: Iterable[str] = (),
) -> Value:
    """Value of an expression: complex for a scalar one, :class:`LocalOperator` otherwise.

    ``values`` maps names to numbers, ``operators`` a name to its on-site matrix (None when there is
    no such operator); without it operators are unknown names. ``place`` opens every message. Raises
    ExpressionError.
    """
    with np.errstate(all="ignore"):
        return _Parser(text, values, operators, known_operators, place).whole()
