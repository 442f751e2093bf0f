"""Any result of a command as text, as JSON, and what it has to say besides."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, Final

from evenstage.circuit.inventory import Inventory
from evenstage.fitting.deck import Deck
from evenstage.fitting.results import Fit
from evenstage.report.corners_document import corners_difference_document, corners_document
from evenstage.report.machine import (
    analysis_document,
    deck_document,
    difference_document,
    fit_document,
    inventory_document,
    simulation_document,
    sizing_document,
    to_json,
)
from evenstage.report.terminal import (
    analysis_report,
    corners_difference_report,
    corners_report,
    deck_report,
    difference_report,
    fit_report,
    inventory_report,
    simulation_report,
    sizing_report,
)
from evenstage.simulation.results import Simulation
from evenstage.sizing.results import Sizing
from evenstage.timing.corners import Corners, CornersDifference
from evenstage.timing.results import Analysis, Difference

if TYPE_CHECKING:
    from collections.abc import Callable

    from evenstage.errors import Notice
    from evenstage.report.circuit_document import Document

Result = (
    Analysis
    | Corners
    | Sizing
    | Difference
    | CornersDifference
    | Inventory
    | Simulation
    | Fit
    | Deck
)

# Each takes the result it stands beside.
_REPORTS: Final[dict[type, Callable[..., str]]] = {
    Analysis: analysis_report,
    Corners: corners_report,
    Sizing: sizing_report,
    Difference: difference_report,
    CornersDifference: corners_difference_report,
    Inventory: inventory_report,
    Simulation: simulation_report,
    Fit: fit_report,
    Deck: deck_report,
}
_DOCUMENTS: Final[dict[type, Callable[[Any], Document]]] = {
    Analysis: analysis_document,
    Corners: corners_document,
    Sizing: sizing_document,
    Difference: difference_document,
    CornersDifference: corners_difference_document,
    Inventory: inventory_document,
    Simulation: simulation_document,
    Fit: fit_document,
    Deck: deck_document,
}


def text(
    result: Result, *, width: int = 100, unicode: bool = True, with_notices: bool = True
) -> str:
    """Return a result as a report for people, with or without its notices."""
    report = _REPORTS[type(result)]
    return report(result, width=width, unicode=unicode, notices=with_notices)


def json(result: Result) -> str:
    """Return a result as JSON text."""
    return to_json(_DOCUMENTS[type(result)](result))


def notices(result: Result) -> tuple[Notice, ...]:
    """Return everything a result has to say besides itself, each once."""
    if isinstance(result, Sizing):
        some = (*result.before.notices, *result.notices)
    elif isinstance(result, Difference | CornersDifference):
        some = (*result.before.notices, *result.after.notices)
    elif isinstance(result, Simulation):
        blocks = (result.before, result.after)
        told = (notice for one in blocks if one for notice in one.analysis.notices)
        some = (*told, *result.notices)
    else:
        some = result.notices
    return tuple(dict.fromkeys(some))
