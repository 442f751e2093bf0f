"""Whether a condition of the text holds, while the text is read."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.errors import ElaborationError, NetlistError
from evenstage.netlist.expression import FormulaError
from evenstage.netlist.parameters import Scope
from evenstage.netlist.reading.fields import plain_text
from evenstage.netlist.values import parse_value

if TYPE_CHECKING:
    from collections.abc import Collection, Mapping, Sequence

    from evenstage.netlist.functions import Function
    from evenstage.netlist.netlist import Parameter
    from evenstage.source import Span


def holds(
    condition: Span,
    known: tuple[Sequence[Parameter], Collection[str]],
    functions: Mapping[str, Function],
) -> bool:
    """Tell whether a condition holds.

    Parameters
    ----------
    condition : Span
        The expression.
    known : (sequence of Parameter, collection of str)
        The parameters of the top level so far, and the names that mean something else here.
    functions : Mapping of str to Function
        Defined so far.

    Raises
    ------
    NetlistError
        If that cannot be said yet.
    """
    assignments, masked = known
    text = plain_text(condition)
    try:
        formula = parse_value(text).formula
        names = sorted(formula.names) if formula is not None else []
    except FormulaError:
        names = []
    set_so_far = {p.name for p in assignments}
    for name in names:
        if name in masked:
            message = (
                f"this condition needs '{name}' of the subcircuit around it, which each call may "
                "set; conditions are decided once, from parameters of the top level"
            )
            raise NetlistError(message, code="undecided-condition", span=condition)
        if name not in set_so_far and not name.endswith("()"):
            message = (
                f"this condition needs '{name}', which no '.param' card of the top level has set "
                "before it"
            )
            raise NetlistError(message, code="undecided-condition", span=condition)
    try:
        return (
            Scope(assignments=assignments, functions=functions).evaluate(text, lambda: condition)
            != 0
        )
    except ElaborationError as error:
        raise NetlistError(error.message, code=error.code, span=error.span) from None
