"""Values with the netlist's own functions written out, so that what they hang on can be traced."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

from evenstage.netlist.expression import (
    Call,
    Chain,
    Choice,
    Formula,
    FormulaError,
    Logic,
    Name,
    Number,
    OwnCall,
)
from evenstage.netlist.values import parse_value

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.netlist.expression import Node
    from evenstage.netlist.functions import Function

#: What stands before a name of the top level inside a function: no name holds a colon.
TOP: Final = "top:"
_MOST: Final = 2000


def inlined(text: str, functions: Mapping[str, Function]) -> Formula | None:
    r"""Return the expression of a value, the netlist's functions written out; None for a number.

    Names of a function's own expression are those of the top level, and begin with ``TOP``.

    Parameters
    ----------
    text : str
        As on the card.
    functions : Mapping of str to Function
        By lower-case name.

    Raises
    ------
    FormulaError
        If the value is no expression, calls a function there is not, or grows too long.

    Examples
    --------
    >>> from pathlib import Path
    >>> from evenstage.netlist.reading.read import read_bytes
    >>> text = b"* t\n.param k=2 twice(x)='k*x'\n"
    >>> functions = read_bytes(text, "a.sp", Path()).functions
    >>> formula = inlined("'twice(wn)'", functions)
    >>> sorted(formula.names), formula.value({"wn": 3.0, "top:k": 2.0}.__getitem__)
    (['top:k', 'wn'], 6.0)
    """
    formula = parse_value(text).formula
    if formula is None or not any(name.endswith("()") for name in formula.names):
        return formula
    writer = _Writer(functions)
    root = writer.written(formula.root, None, ())
    return Formula(root, frozenset(writer.names))


@dataclass
class _Writer:
    """Writes functions out."""

    functions: Mapping[str, Function]
    nodes: int = 0

    def __post_init__(self) -> None:
        self.names: set[str] = set()

    def written(
        self, node: Node, given: Mapping[str, Node] | None, inside: tuple[str, ...]
    ) -> Node:
        """Return a node without calls of own functions.

        Parameters
        ----------
        node : Node
            Part of a value or of a function.
        given : Mapping of str to Node, optional
            The arguments of the function; None: part of a value.
        inside : tuple of str
            The functions around it.
        """
        self.nodes += 1
        if self.nodes > _MOST:
            raise FormulaError("is too long")
        match node:
            case Name(name):
                return self._named(name, given)
            case Call(_, arguments):
                return replace(node, arguments=self._all(arguments, given, inside))
            case Chain(first, rest):
                steps = tuple((op, self.written(one, given, inside)) for op, one in rest)
                return Chain(self.written(first, given, inside), steps)
            case Logic(operands):
                return replace(node, operands=self._all(operands, given, inside))
            case Choice(condition, yes, no):
                return Choice(*self._all((condition, yes, no), given, inside))
            case OwnCall(name, arguments):
                return self._applied(name, self._all(arguments, given, inside), inside)
            case _:
                return node

    def _all(
        self, nodes: tuple[Node, ...], given: Mapping[str, Node] | None, inside: tuple[str, ...]
    ) -> tuple[Node, ...]:
        return tuple(self.written(node, given, inside) for node in nodes)

    def _named(self, name: str, given: Mapping[str, Node] | None) -> Node:
        if given is not None and name in given:
            return given[name]
        own = name if given is None else f"{TOP}{name}"
        self.names.add(own)
        return Name(own)

    def _applied(self, name: str, arguments: tuple[Node, ...], inside: tuple[str, ...]) -> Node:
        function = self.functions.get(name)
        if function is None or name in inside or len(arguments) != len(function.arguments):
            raise FormulaError(f"calls '{name}', which cannot be written out")
        value = parse_value(function.text)
        if value.formula is None:
            return Number(value.number)
        given = dict(zip(function.arguments, arguments, strict=True))
        return self.written(value.formula.root, given, (*inside, name))
