"""Functions that a netlist defines for its expressions."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

from evenstage.errors import NetlistError

if TYPE_CHECKING:
    from evenstage.source import Span

_HEAD: Final = re.compile(r"\s*([a-z_]\w*)\s*\(([^()]*)\)\s*=?\s*(\S.*)", re.IGNORECASE | re.DOTALL)
_NAME: Final = re.compile(r"[a-z_]\w*", re.IGNORECASE)


@dataclass(frozen=True, slots=True)
class Function:
    """One definition.

    Parameters
    ----------
    name : str
        In lower case.
    arguments : tuple of str
        In lower case.
    text : str
        The expression, perhaps in quotes or braces. Its other names are parameters of the top
        level.
    span : Span
        The card's words.
    """

    name: str
    arguments: tuple[str, ...]
    text: str
    span: Span


def read_function(text: str, span: Span) -> Function:
    """Return the function some words define, as in ``twice(x) {2*x}``.

    Parameters
    ----------
    text : str
        The words, the joints of continuation lines taken out.
    span : Span
        Their bytes.

    Raises
    ------
    NetlistError
        If they do not define one.
    """
    head = _HEAD.fullmatch(text)
    arguments = head[2].replace(",", " ").lower().split() if head else []
    if head is None or not all(map(_NAME.fullmatch, arguments)):
        message = f"expected a name, its arguments in brackets and an expression, got '{text}'"
        raise NetlistError(message, code="bad-function", span=span)
    if len(set(arguments)) < len(arguments):
        message = f"'{head[1]}' has two arguments of one name"
        raise NetlistError(message, code="bad-function", span=span)
    return Function(head[1].lower(), tuple(arguments), head[3].strip(), span)
