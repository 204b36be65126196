"""Scalar and operator expressions of model files: a small whitelisted grammar, nothing else.

::

    sum      := ["+" | "-"] product { ("+" | "-") product }
    product  := power { ["*" | "/"] power }        juxtaposed operators stand on neighbouring sites
    power    := atom [ ("**" | "^") ["-"] atom ] { "." atom }            a dot: same site
    atom     := number | name | function "(" sum { "," sum } ")" | "(" sum ")"

Products are read from left to right, so ``1/2 X X`` is half of ``X X`` and ``1/2 a`` is ``a/2``.
There is no ``eval``, no attribute access, and length, depth and operator range are bounded.
"""

from __future__ import annotations

import cmath
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from lbwork.errors import ExpressionError
from lbwork.model.functions import CONSTANTS, FUNCTIONS
from lbwork.model.operators import known_operator_names, local_operator, operator_hint
from lbwork.model.tokens import Token, tokens
from lbwork.model.words import nearest, shown

__all__ = ["LocalOperator", "evaluate"]

MAX_DEPTH = 40
MAX_RANGE = 3
MAX_POWER = 16


@dataclass(frozen=True, eq=False)
class LocalOperator:
    """An operator on ``count`` neighbouring sites: complex128 matrix (d**count, d**count)."""

    count: int
    matrix: np.ndarray


Value = complex | LocalOperator


class _Parser:
    """Evaluates while it parses; without a local dimension there are no operators."""

    def __init__(
        self, text: str, values: Mapping[str, complex], place: str, dimension: int | None
    ) -> None:
        self.text = text
        self.place = place
        self.tokens = tokens(text, place)
        self.position = 0
        self.depth = 0
        self.values = values
        self.dimension = dimension

    def fail(self, reason: str) -> ExpressionError:
        return ExpressionError(f"{self.place}: in {shown(self.text)}: {reason}")

    def peek(self) -> Token:
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
            elif kind == "number" and not isinstance(result, LocalOperator):
                raise self.fail(f"'{word}' follows a number directly; write * between them")
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
                raise self.fail("an operator cannot be an exponent; write a number there")
            base = self._raised(base, sign * exponent)
            if self.peek() in (("symbol", "**"), ("symbol", "^")):
                raise self.fail("two powers in a row; use parentheses")
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
            self._close()
            return inner
        if kind == "end":
            raise self.fail("the expression ends too early; complete it")
        if word in "+-":
            raise self.fail(f"two signs in a row at '{word}'; use parentheses")
        raise self.fail(f"unexpected '{word}'; a number, name or parenthesis belongs there")

    def _close(self) -> None:
        if not self.take(")"):
            raise self.fail("a parenthesis is not closed; add ')'")

    def _named(self, word: str) -> Value:
        if self.peek() == ("symbol", "(") and word in FUNCTIONS:
            return self._called(word)
        if word in self.values:
            return self.values[word]
        if word in CONSTANTS:
            return CONSTANTS[word]
        if self.dimension is not None:
            matrix = local_operator(word, self.dimension)
            if matrix is not None:
                return LocalOperator(1, matrix)
        raise self.fail(self._unknown(word))

    def _unknown(self, word: str) -> str:
        if word in FUNCTIONS:
            return f"{word} is a function; write {word}(...)"
        operators = () if self.dimension is None else known_operator_names(self.dimension)
        kinds = "parameter or function" if self.dimension is None else "parameter or operator"
        reason = f"{shown(word)} is not a known {kinds}"
        if word == "i":
            return f"{reason}; write 1j for the imaginary unit"
        if self.dimension is None and local_operator(word, 2) is not None:
            return f"{reason}; operators are not allowed in a number"
        hint = operator_hint(word, self.dimension) if self.dimension is not None else ""
        hint = hint or nearest(word, [*self.values, *CONSTANTS, *FUNCTIONS, *operators])
        names = ", ".join([*self.values, *operators[:12]][:24])
        return reason + (hint or f"; known are {names or 'numbers'} and functions such as exp")

    def _called(self, word: str) -> complex:
        count, function = FUNCTIONS[word]
        self.take("(")
        arguments = [self.sum()]
        while self.take(","):
            arguments.append(self.sum())
        self._close()
        if len(arguments) != count:
            raise self.fail(f"{word}() takes {count} argument(s), not {len(arguments)}; correct it")
        scalars = []
        for argument in arguments:
            if isinstance(argument, LocalOperator):
                raise self.fail(f"{word}() takes numbers, not operators; use powers of operators")
            scalars.append(argument)
        try:
            return self._finite(function(*scalars))
        except (ValueError, OverflowError, ZeroDivisionError) as error:
            raise self.fail(
                f"{word}() has no finite value there ({error}); check its argument"
            ) from None

    def _finite(self, value: complex) -> complex:
        if not cmath.isfinite(value):
            raise self.fail("a value is infinite or not a number; check the parameters")
        return value

    def _checked(self, operator: LocalOperator) -> LocalOperator:
        if not np.all(np.isfinite(operator.matrix)):
            raise self.fail("an operator has infinite entries; check the parameters")
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
        if not isinstance(left, LocalOperator):
            return self._scaled(right, left)
        if isinstance(right, LocalOperator):
            raise self.fail(
                "'*' between operators is ambiguous; write a space for the next site or a dot for "
                "the same site"
            )
        return self._scaled(left, right)

    def _divided(self, left: Value, right: Value) -> Value:
        if isinstance(right, LocalOperator):
            raise self.fail("division by an operator; multiply by its inverse as a matrix")
        if right == 0:
            raise self.fail("division by zero; check the parameters")
        try:
            if not isinstance(left, LocalOperator):
                return self._finite(left / right)
            return self._scaled(left, 1 / right)
        except (OverflowError, ZeroDivisionError):
            raise self.fail("a division overflows; rescale the units") from None

    def _beside(self, left: Value, right: Value) -> Value:
        if not isinstance(left, LocalOperator):
            return self._times(left, right)
        if not isinstance(right, LocalOperator):
            raise self.fail("a number stands after an operator; write it in front")
        count = left.count + right.count
        if count > MAX_RANGE:
            raise self.fail(
                f"an operator spans {count} sites; at most {MAX_RANGE} are allowed (a dot joins "
                "operators on the same site)"
            )
        return self._checked(LocalOperator(count, np.kron(left.matrix, right.matrix)))

    def _same_site(self, left: Value, right: Value) -> Value:
        if not (isinstance(left, LocalOperator) and isinstance(right, LocalOperator)):
            raise self.fail("a dot joins two operators on the same site; use * for numbers")
        if left.count != right.count:
            raise self.fail(
                "a dot joins operators on the same number of sites; fill the shorter one up with I"
            )
        return self._checked(LocalOperator(left.count, left.matrix @ right.matrix))

    def _raised(self, base: Value, exponent: complex) -> Value:
        if isinstance(base, LocalOperator):
            power = round(exponent.real)
            if exponent != power or not 0 <= power <= MAX_POWER:
                raise self.fail(
                    f"an operator's power {shown(exponent)} is not a whole number 0 to "
                    f"{MAX_POWER}; give one of these"
                )
            return self._checked(
                LocalOperator(base.count, np.linalg.matrix_power(base.matrix, power))
            )
        try:
            # Whole powers keep exact values exact: (-1)^j has no rounding error in it.
            if exponent.imag == 0 and exponent.real == int(exponent.real):
                return self._finite(base ** int(exponent.real))
            return self._finite(base**exponent)
        except (OverflowError, ZeroDivisionError):
            raise self.fail("a power is infinite; check the parameters") from None


def evaluate(
    text: str, values: Mapping[str, complex], *, place: str, dimension: int | None = None
) -> Value:
    """Value of an expression: complex for a scalar one, :class:`LocalOperator` otherwise.

    ``values`` maps names to numbers; the operators are those of local ``dimension``, without it
    operators are unknown names. ``place`` opens every message. Raises ExpressionError.
    """
    with np.errstate(all="ignore"):
        return _Parser(text, values, place, dimension).whole()
