"""How large a block may be before it is refused, so that no text fills the memory."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.errors import ElaborationError

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.netlist.elaboration.template import Template

#: Transistors, instances or nets of a block.
MOST: Final = 50_000_000
#: Definitions, each with the values its callers give it, beyond one for each card.
MOST_TEMPLATES: Final = 100_000


def check_extent(templates: Sequence[Template], callees: Sequence[Sequence[int]]) -> None:
    """Refuse a block that cannot be laid out.

    Parameters
    ----------
    templates : sequence of Template
        Callers before callees; the block first.
    callees : sequence of sequence of int
        For each template the index of the template of each call.

    Raises
    ------
    ElaborationError
        If it has too many transistors, instances or nets.
    """
    for what, own in (
        ("transistors", [len(template.card) for template in templates]),
        ("instances", [1] * len(templates)),
        ("nets", [len(template.outline.nets.words) for template in templates]),
    ):
        _check(_total(own, callees), what)


def check_templates(count: int, cards: int) -> None:
    """Refuse a block whose calls give too many different values for so many cards.

    Raises
    ------
    ElaborationError
        If they do.
    """
    if count > MOST_TEMPLATES + cards:
        message = (
            f"the calls in this block give their subcircuits more than {MOST_TEMPLATES} different "
            "sets of values; is there a parameter that grows from level to level?"
        )
        raise ElaborationError(message, code="too-large")


def _total(own: Sequence[int], callees: Sequence[Sequence[int]]) -> int:
    """Return how many of something the block holds, from how many each template holds itself."""
    totals = list(own)
    for index in range(len(callees) - 1, -1, -1):
        totals[index] += sum(totals[callee] for callee in callees[index])
    return totals[0]


def _check(count: int, what: str) -> None:
    if count > MOST:
        shown = str(count) if count < MOST * MOST else "endlessly many"
        message = f"the block has {shown} {what}; at most {MOST} can be laid out"
        raise ElaborationError(message, code="too-large")
