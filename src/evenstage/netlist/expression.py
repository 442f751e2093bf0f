"""Parameter expressions: parsed by their own grammar, evaluated over a small tree.

Nothing here ever runs Python's own evaluation on a user's text.
"""

from __future__ import annotations

import math
import operator
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Protocol, Self

from lark import Token, Transformer
from lark.exceptions import UnexpectedEOF, UnexpectedInput, VisitError

from evenstage.netlist.grammar import ENCODING, parser
from evenstage.units import parse_number

if TYPE_CHECKING:
    from collections.abc import Callable


class FormulaError(ValueError):
    """An expression cannot be read or has no value.

    Parameters
    ----------
    message : str
        What is wrong, lower case.
    offset : int, optional
        Where in the expression's text.
    """

    def __init__(self, message: str, offset: int | None = None) -> None:
        super().__init__(message)
        self.offset = offset


class Node(Protocol):
    """A part of an expression that has a value."""

    def value(self, lookup: Callable[[str], float]) -> float:
        """Return the value; ``lookup`` gives that of a parameter by lower-case name."""
        ...


@dataclass(frozen=True, slots=True)
class Number:
    """A number, suffix applied."""

    number: float

    def value(self, lookup: Callable[[str], float]) -> float:  # noqa: ARG002 - one signature for all nodes
        """Return the number."""
        return self.number


@dataclass(frozen=True, slots=True)
class Name:
    """A parameter."""

    name: str

    def value(self, lookup: Callable[[str], float]) -> float:
        """Return the parameter's value."""
        return lookup(self.name)


@dataclass(frozen=True, slots=True)
class Call:
    """A function of its arguments."""

    function: Callable[..., float]
    arguments: tuple[Node, ...]

    def value(self, lookup: Callable[[str], float]) -> float:
        """Return the function's value."""
        return self.function(*(a.value(lookup) for a in self.arguments))


class Application(str):
    """The name of a function the netlist defines, and the values of its arguments.

    It is looked up like a parameter; ``()`` behind its name tells it from one.
    """

    __slots__ = ("arguments",)
    arguments: tuple[float, ...]

    def __new__(cls, name: str, arguments: tuple[float, ...]) -> Self:
        """Return the name as a key with its arguments."""
        self = super().__new__(cls, f"{name}()")
        self.arguments = arguments
        return self

    @property
    def name(self) -> str:
        """The function's lower-case name."""
        return self.removesuffix("()")


@dataclass(frozen=True, slots=True)
class OwnCall:
    """A function that the netlist may define."""

    name: str
    arguments: tuple[Node, ...]

    def value(self, lookup: Callable[[str], float]) -> float:
        """Return the function's value, which ``lookup`` gives."""
        return lookup(Application(self.name, tuple(a.value(lookup) for a in self.arguments)))


@dataclass(frozen=True, slots=True)
class Chain:
    """Operators of one rank, applied from the left."""

    first: Node
    rest: tuple[tuple[Callable[[float, float], float], Node], ...]

    def value(self, lookup: Callable[[str], float]) -> float:
        """Return the value of the chain."""
        total = self.first.value(lookup)
        for operation, node in self.rest:
            total = operation(total, node.value(lookup))
        return total


@dataclass(frozen=True, slots=True)
class Logic:
    """``||`` (``decisive`` True) or ``&&``: stops at the first operand that decides."""

    operands: tuple[Node, ...]
    decisive: bool

    def value(self, lookup: Callable[[str], float]) -> float:
        """Return 1 or 0."""
        for node in self.operands:
            if (node.value(lookup) != 0) is self.decisive:
                return float(self.decisive)
        return float(not self.decisive)


@dataclass(frozen=True, slots=True)
class Choice:
    """``condition ? yes : no``; only the part that counts is evaluated."""

    condition: Node
    yes: Node
    no: Node

    def value(self, lookup: Callable[[str], float]) -> float:
        """Return the value of the part that counts."""
        return (self.yes if self.condition.value(lookup) else self.no).value(lookup)


@dataclass(frozen=True, slots=True)
class Formula:
    """A parsed expression and the lower-case names of the parameters it uses.

    Of functions that only the netlist can define the names stand among them, with ``()`` behind.
    """

    root: Node
    names: frozenset[str]

    def value(self, lookup: Callable[[str], float]) -> float:
        """Return the value.

        Parameters
        ----------
        lookup : callable
            Gives the value of a parameter by lower-case name.

        Raises
        ------
        FormulaError
            If there is no finite value.
        """
        try:
            result = self.root.value(lookup)
        except ZeroDivisionError:
            raise FormulaError("divides by zero") from None
        except OverflowError:
            raise FormulaError("is too large") from None
        except RecursionError:
            raise FormulaError("is nested too deeply") from None
        except (ValueError, TypeError) as error:
            if isinstance(error, FormulaError):
                raise
            raise FormulaError(
                "has no value: a function got an argument it is not defined for"
            ) from None
        if not math.isfinite(result):
            raise FormulaError("has no finite value")
        return result


def _power(base: float, exponent: float) -> float:
    return math.pow(base, exponent)


def _nominal(value: float, *_spread: float) -> float:
    """Return the middle of a statistical distribution."""
    return value


def _choose(condition: float, yes: float, no: float) -> float:
    return yes if condition else no


def _clip(value: float, low: float, high: float) -> float:
    return min(max(value, low), high)


FUNCTIONS: dict[str, tuple[Callable[..., float], int, int | None]] = {
    # name: function, least and greatest number of arguments
    **{
        name: (getattr(math, name), 1, 1)
        for name in (
            *("sqrt", "exp", "log10", "sin", "cos", "tan", "asin", "acos", "atan"),
            *("sinh", "cosh", "tanh", "asinh", "acosh", "atanh"),
        )
    },
    "ln": (math.log, 1, 1),
    "log": (math.log, 1, 1),
    "abs": (abs, 1, 1),
    "min": (min, 2, None),
    "max": (max, 2, None),
    "pow": (_power, 2, 2),
    "pwr": (lambda x, y: math.copysign(abs(x) ** y, x), 2, 2),
    "atan2": (math.atan2, 2, 2),
    "sgn": (lambda x: float((x > 0) - (x < 0)), 1, 1),
    "sign": (lambda x, y: math.copysign(abs(x), y), 2, 2),
    "int": (lambda x: float(math.trunc(x)), 1, 1),
    "trunc": (lambda x: float(math.trunc(x)), 1, 1),
    "nint": (lambda x: float(math.floor(x + 0.5)), 1, 1),
    "round": (lambda x: float(math.floor(x + 0.5)), 1, 1),
    "floor": (lambda x: float(math.floor(x)), 1, 1),
    "ceil": (lambda x: float(math.ceil(x)), 1, 1),
    "limit": (_clip, 3, 3),
    "if": (_choose, 3, 3),
    # A nominal analysis takes the middle of every distribution.
    "gauss": (_nominal, 2, 4),
    "agauss": (_nominal, 2, 4),
    "unif": (_nominal, 2, 3),
    "aunif": (_nominal, 2, 3),
}

OPERATORS: dict[str, Callable[[float, float], float]] = {
    "+": operator.add,
    "-": operator.sub,
    "*": operator.mul,
    "/": operator.truediv,
    "%": math.fmod,
    "<": lambda a, b: float(a < b),
    "<=": lambda a, b: float(a <= b),
    ">": lambda a, b: float(a > b),
    ">=": lambda a, b: float(a >= b),
    "==": lambda a, b: float(a == b),
    "!=": lambda a, b: float(a != b),
}


class _Builder(Transformer[Token, Node]):
    """Lark tree to expression tree; notes the names met."""

    def __init__(self) -> None:
        super().__init__()
        self.names: set[str] = set()

    def expression(self, children: list[Node]) -> Node:
        """Return what the only rule gave."""
        return children[0]

    def number(self, children: list[Token]) -> Node:
        """Return a number, its suffix applied."""
        try:
            return Number(parse_number(children[0]))
        except ValueError:
            raise FormulaError("holds a number that is too large", children[0].start_pos) from None

    def name(self, children: list[Token]) -> Node:
        """Return a parameter and note its name."""
        name = children[0].lower()
        self.names.add(name)
        return Name(name)

    def call(self, children: list[Token | Node]) -> Node:
        """Return a call of a function."""
        name, *arguments = children
        assert isinstance(name, Token)
        known = FUNCTIONS.get(name.lower())
        if known is None:
            self.names.add(f"{name.lower()}()")
            return OwnCall(name.lower(), tuple(arguments))
        function, least, most = known
        if len(arguments) < least or (most is not None and len(arguments) > most):
            wanted = (
                str(least)
                if least == most
                else f"{least} to {most}"
                if most
                else f"at least {least}"
            )
            raise FormulaError(
                f"gives {len(arguments)} arguments to '{name}', which takes {wanted}",
                name.start_pos,
            )
        return Call(function, tuple(arguments))

    def _chain(self, children: list[Token | Node]) -> Node:
        steps = zip(children[1::2], children[2::2], strict=True)
        return Chain(children[0], tuple((OPERATORS[str(t)], node) for t, node in steps))

    equality = order = sum = product = _chain

    def power(self, children: list[Node]) -> Node:
        """Return base POWER exponent."""
        return Call(_power, (children[0], children[2]))

    def sign(self, children: list[Node]) -> Node:
        """Return a signed value."""
        return children[1] if str(children[0]) == "+" else Call(operator.neg, (children[1],))

    def negation(self, children: list[Node]) -> Node:
        """Return a negation."""
        return Call(lambda x: float(not x), (children[1],))

    def either(self, children: list[Node]) -> Node:
        """Return operands of ``||``."""
        return Logic(tuple(children), decisive=True)

    def both(self, children: list[Node]) -> Node:
        """Return operands of ``&&``."""
        return Logic(tuple(children), decisive=False)

    def choice(self, children: list[Node]) -> Node:
        """Return condition, yes and no."""
        return Choice(*children)


@lru_cache(maxsize=65536)
def parse_formula(text: str) -> Formula:
    """Parse an expression, given without its quotes or braces.

    Raises
    ------
    FormulaError
        If it is no expression.

    Examples
    --------
    >>> parse_formula("2*wn + 0.1u").value({"wn": 1e-6}.__getitem__)
    2.1e-06
    """
    plain = text.encode("utf-8", "surrogateescape").decode(ENCODING)
    builder = _Builder()
    try:
        root = builder.transform(parser("expression").parse(plain))
    except VisitError as error:
        if isinstance(error.orig_exc, RecursionError):
            raise FormulaError("is nested too deeply") from None
        raise error.orig_exc from None
    except UnexpectedEOF:
        raise FormulaError("ends too early", len(plain)) from None
    except UnexpectedInput as error:
        offset = error.pos_in_stream
        if offset is None or not 0 <= offset < len(plain.rstrip()) or _at_end(error):
            raise FormulaError("ends too early", len(plain.rstrip())) from None
        raise FormulaError(
            f"cannot be read from '{plain[offset : offset + 12]}' on", offset
        ) from None
    except RecursionError:
        raise FormulaError("is nested too deeply") from None
    return Formula(root, frozenset(builder.names))


def _at_end(error: UnexpectedInput) -> bool:
    token = getattr(error, "token", None)
    return isinstance(token, Token) and token.type == "$END"
