"""By which power of a factor an expression grows when some of its names grow by the factor.

Found from the expression itself, so it holds for every factor: 1 is in proportion, 0 is constant.
"""

from __future__ import annotations

import operator
from typing import TYPE_CHECKING, Final

from evenstage.netlist.expression import (
    FUNCTIONS,
    OPERATORS,
    Call,
    Chain,
    Choice,
    Logic,
    Name,
    Number,
)

if TYPE_CHECKING:
    from collections.abc import Callable, Collection

    from evenstage.netlist.expression import Node

_SUMS: Final = (operator.add, operator.sub, OPERATORS["%"])
#: Functions that grow like their arguments, if these grow alike.
_LIKE_ALL: Final = (operator.neg, *(FUNCTIONS[name][0] for name in ("abs", "min", "max", "limit")))
#: Functions that grow like their first argument, whatever constants follow.
_LIKE_FIRST: Final = tuple(FUNCTIONS[name][0] for name in ("gauss", "unif"))
_POWERS: Final = tuple(FUNCTIONS[name][0] for name in ("pow", "pwr"))
_COMPARISONS: Final = tuple(OPERATORS[sign] for sign in ("<", "<=", ">", ">=", "==", "!="))


def degree(node: Node, scaled: Collection[str], lookup: Callable[[str], float]) -> float | None:
    """Return the power of the factor by which an expression grows; None if by no power.

    Parameters
    ----------
    node : Node
        The expression.
    scaled : collection of str
        The names that grow by the factor.
    lookup : callable
        Gives the value of each name as it is: of the parts of a choice one counts.

    Examples
    --------
    >>> from evenstage.netlist.expression import parse_formula
    >>> values = {"w": 2.0, "k": 3.0}
    >>> [degree(parse_formula(text).root, {"w"}, values.__getitem__)
    ...     for text in ("k*w", "w+1", "sqrt(w*w*k)", "max(w, k)", "k > 2 ? w : 1")]
    [1.0, None, 1.0, None, 1.0]
    """
    match node:
        case Number():
            return 0.0
        case Name(name):
            return float(name in scaled)
        case Chain(first, rest):
            return _of_chain(first, rest, scaled, lookup)
        case Choice(condition, yes, no):
            if degree(condition, scaled, lookup) != 0:
                return None
            return degree(yes if condition.value(lookup) else no, scaled, lookup)
        case Logic(operands):
            return _common([degree(one, scaled, lookup) for one in operands], only=0.0)
        case Call(function, arguments):
            return _of_call(function, arguments, scaled, lookup)
        case _:
            return None


def _of_chain(
    first: Node,
    rest: tuple[tuple[Callable[[float, float], float], Node], ...],
    scaled: Collection[str],
    lookup: Callable[[str], float],
) -> float | None:
    """Return the degree of operators of one rank."""
    total = degree(first, scaled, lookup)
    is_zero = _is_zero(first)
    for operation, node in rest:
        own = degree(node, scaled, lookup)
        if total is None or own is None:
            return None
        if operation is operator.mul:
            total += own
        elif operation is operator.truediv:
            total -= own
        elif operation in _COMPARISONS:
            total = 0.0 if total == own else None
        elif operation in _SUMS and is_zero:
            total = own
        elif not _is_zero(node):
            total = total if total == own else None
        is_zero = is_zero and _is_zero(node)
    return total


def _is_zero(node: Node) -> bool:
    return isinstance(node, Number) and node.number == 0


def _of_call(
    function: Callable[..., float],
    arguments: tuple[Node, ...],
    scaled: Collection[str],
    lookup: Callable[[str], float],
) -> float | None:
    """Return the degree of a function of its arguments."""
    own = [degree(one, scaled, lookup) for one in arguments]
    if function in _LIKE_ALL:
        return _common(own)
    if function in _LIKE_FIRST:
        return own[0]
    if function in _POWERS and own[0] is not None and own[1] == 0:
        return own[0] * arguments[1].value(lookup)
    if function is FUNCTIONS["sqrt"][0] and own[0] is not None:
        return own[0] / 2
    if function is FUNCTIONS["if"][0] and own[0] == 0:
        return own[1] if arguments[0].value(lookup) else own[2]
    return _common(own, only=0.0)


def _common(degrees: list[float | None], only: float | None = None) -> float | None:
    """Return the degree that all have in common."""
    one = degrees[0] if only is None else only
    return one if all(each is not None and each == one for each in degrees) else None
