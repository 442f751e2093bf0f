"""Boolean functions of pull networks, as expressions that print in net names."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from collections.abc import Callable, Iterable

    from evenstage.circuit.network import Network


@dataclass(frozen=True, slots=True)
class Literal:
    """One input; ``net`` is its local net."""

    net: int


@dataclass(frozen=True, slots=True)
class And:
    """The conjunction of its terms (none: true)."""

    terms: tuple[Expression, ...]


@dataclass(frozen=True, slots=True)
class Or:
    """The disjunction of its terms (none: false)."""

    terms: tuple[Expression, ...]


@dataclass(frozen=True, slots=True)
class Not:
    """The complement of its term."""

    term: Expression


@dataclass(frozen=True, slots=True)
class When:
    """Its term where the condition holds; elsewhere nothing drives."""

    term: Expression
    condition: Expression


@dataclass(frozen=True, slots=True)
class Each:
    """Several terms that each hold under their own condition; elsewhere the value may be kept."""

    terms: tuple[Expression, ...]
    kept: bool = False


Expression = Literal | And | Or | Not | When | Each

ONE: Final = And(())
ZERO: Final = Or(())

_Edge = tuple[int, int, Expression]


def conduction(network: Network, start: int, end: int, polarity: str) -> Expression:
    """Return when switches of one polarity join two nodes, as a factored expression.

    Series and parallel switches are folded into one until nothing is left to fold. What is left of
    a network that is not series-parallel (a bridge) is written as the sum of its paths. For ``p``
    switches the literals mean "input is 0".
    """
    edges: list[_Edge] = [
        (switch.a, switch.b, Literal(switch.gate) if switch.gate >= 0 else And(()))
        for switch in network.switches
        if switch.polarity == polarity
    ]
    edges = _folded(edges, (start, end))
    if len(edges) == 1 and {edges[0][0], edges[0][1]} == {start, end}:
        return edges[0][2]
    return disjunction(
        conjunction(edges[i][2] for i in path) for path in sorted(_edge_paths(edges, start, end))
    )


def _folded(edges: list[_Edge], ends: tuple[int, int]) -> list[_Edge]:
    """Fold parallel and series edges, and drop dead ends, until the network is stable."""
    while True:
        before = edges
        edges = _series(_parallel(edges), ends)
        if edges == before:
            return edges


def _parallel(edges: list[_Edge]) -> list[_Edge]:
    bundles: dict[tuple[int, int], list[Expression]] = {}
    for a, b, expression in edges:
        bundles.setdefault((min(a, b), max(a, b)), []).append(expression)
    return [(a, b, disjunction(expressions)) for (a, b), expressions in bundles.items()]


def _series(edges: list[_Edge], ends: tuple[int, int]) -> list[_Edge]:
    """Fold one inner node with two edges, or drop one with a single edge."""
    at: dict[int, list[int]] = {}
    for index, (a, b, _) in enumerate(edges):
        at.setdefault(a, []).append(index)
        at.setdefault(b, []).append(index)
    for node, touching in at.items():
        if node in ends or len(touching) > 2:
            continue
        rest = [edge for index, edge in enumerate(edges) if index not in touching]
        if len(touching) == 1 or node < 0:
            return rest
        first, second = (edges[index] for index in touching)
        a = first[1] if first[0] == node else first[0]
        b = second[1] if second[0] == node else second[0]
        rest.insert(touching[0], (a, b, conjunction((first[2], second[2]))))
        return rest
    return edges


def _edge_paths(edges: list[_Edge], start: int, end: int) -> Iterable[tuple[int, ...]]:
    stack: list[tuple[int, tuple[int, ...], frozenset[int]]] = [(start, (), frozenset({start}))]
    while stack:
        node, path, visited = stack.pop()
        if node == end:
            yield path
            continue
        for index, (a, b, _) in enumerate(edges):
            far = b if a == node else a
            if node in (a, b) and far not in visited and (far >= 0 or far == end):
                stack.append((far, (*path, index), visited | {far}))


def conjunction(terms: Iterable[Expression]) -> Expression:
    """Return the conjunction of some terms, conjunctions among them dissolved."""
    flat = _flat(terms, And)
    return flat[0] if len(flat) == 1 else And(flat)


def disjunction(terms: Iterable[Expression]) -> Expression:
    """Return the disjunction of some terms, disjunctions among them dissolved."""
    flat = _flat(terms, Or)
    return flat[0] if len(flat) == 1 else Or(flat)


def _flat(terms: Iterable[Expression], kind: type[And | Or]) -> tuple[Expression, ...]:
    flat: dict[Expression, None] = {}
    for term in terms:
        flat.update(dict.fromkeys(term.terms if isinstance(term, kind) else (term,)))
    return tuple(flat)


def text(expression: Expression, name: Callable[[int], str]) -> str:
    """Return an expression with ``&`` binding tighter than ``|``, in the names of its nets."""
    if isinstance(expression, Literal):
        return name(expression.net)
    if isinstance(expression, Not):
        return inverted_text(expression.term, name)
    if isinstance(expression, When):
        return f"{text(expression.term, name)} when {text(expression.condition, name)}"
    if isinstance(expression, Each):
        terms = ", ".join(text(term, name) for term in expression.terms)
        return f"{terms}, else kept" if expression.kept else terms
    if not expression.terms:
        return "1" if isinstance(expression, And) else "0"
    if isinstance(expression, Or):
        return " | ".join(text(term, name) for term in expression.terms)
    return " & ".join(
        f"({text(term, name)})" if isinstance(term, Or) else text(term, name)
        for term in expression.terms
    )


def inverted_text(expression: Expression, name: Callable[[int], str]) -> str:
    """Return the text of the complement, as a static gate computes it: ``!(a & b)``."""
    if isinstance(expression, Not):
        return text(expression.term, name)
    inner = text(expression, name)
    return f"!{inner}" if isinstance(expression, Literal) else f"!({inner})"


def dual(expression: Expression) -> Expression:
    """Return an expression with conjunction and disjunction swapped.

    Where the literals of a pull-up network mean "input is 0", its dual says when it does not
    conduct.
    """
    if isinstance(expression, And):
        return Or(tuple(dual(term) for term in expression.terms))
    if isinstance(expression, Or):
        return And(tuple(dual(term) for term in expression.terms))
    return expression
