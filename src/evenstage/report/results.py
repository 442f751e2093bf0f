"""Any result of a command as text, as JSON, and what it has to say besides."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.circuit.inventory import Inventory
from evenstage.fitting.results import Deck, Fit
from evenstage.report.document.convert import Result, document, to_json
from evenstage.report.paper import Paper
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
    from evenstage.report.origin import Origin

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


def text(
    result: Result, *, width: int = 100, unicode: bool = True, with_notices: bool = True
) -> str:
    """Return a result as a report for people, with or without its notices."""
    return _REPORTS[type(result)](result, Paper(width, unicode, with_notices))


def json(result: Result, origin: Origin | None = None) -> str:
    """Return a result as JSON text, with where it comes from."""
    return to_json(document(result, origin))


def notices(result: Result) -> tuple[Notice, ...]:
    """Return everything a result has to say besides itself, each once."""
    if isinstance(result, Sizing):
        some = (*result.block_notices, *result.notices)
    elif isinstance(result, Difference | CornersDifference):
        some = (*result.before.notices, *result.after.notices)
    elif isinstance(result, Simulation):
        blocks = (result.before, result.after)
        told = (notice for one in blocks if one for notice in one.analysis.notices)
        some = (*told, *result.notices)
    else:
        some = result.notices
    return tuple(dict.fromkeys(some))
