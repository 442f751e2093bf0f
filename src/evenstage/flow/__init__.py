"""What each command does: the rooms in order, once."""

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from evenstage.circuit.inventory import Inventory
    from evenstage.fitting.results import Deck, Fit
    from evenstage.flow.files import origin, write_text
    from evenstage.flow.fitting import fit, fit_simulated, write_deck
    from evenstage.flow.loading import Block, Question, load
    from evenstage.flow.paths import analyse, diff, recognise
    from evenstage.flow.reporting import html, report
    from evenstage.flow.simulating import simulate
    from evenstage.flow.sizing import resize
    from evenstage.netlist.rewriting.output import check_place
    from evenstage.report.document.convert import Result
    from evenstage.report.origin import Origin
    from evenstage.report.published import schema_text
    from evenstage.report.results import json, notices, text
    from evenstage.simulation.results import Simulation
    from evenstage.sizing.results import Sizing
    from evenstage.sizing.wishes import Wishes
    from evenstage.timing.corners import Corners, CornersDifference
    from evenstage.timing.results import Analysis, Difference

__all__ = [
    "Analysis",
    "Block",
    "Corners",
    "CornersDifference",
    "Deck",
    "Difference",
    "Fit",
    "Inventory",
    "Origin",
    "Question",
    "Result",
    "Simulation",
    "Sizing",
    "Wishes",
    "analyse",
    "check_place",
    "diff",
    "fit",
    "fit_simulated",
    "html",
    "json",
    "load",
    "notices",
    "origin",
    "recognise",
    "report",
    "resize",
    "schema_text",
    "simulate",
    "text",
    "write_deck",
    "write_text",
]

_HOMES = {
    "Analysis": "evenstage.timing.results",
    "Block": "evenstage.flow.loading",
    "Corners": "evenstage.timing.corners",
    "CornersDifference": "evenstage.timing.corners",
    "Deck": "evenstage.fitting.results",
    "Difference": "evenstage.timing.results",
    "Fit": "evenstage.fitting.results",
    "Inventory": "evenstage.circuit.inventory",
    "Origin": "evenstage.report.origin",
    "Question": "evenstage.flow.loading",
    "Result": "evenstage.report.document.convert",
    "Simulation": "evenstage.simulation.results",
    "Sizing": "evenstage.sizing.results",
    "Wishes": "evenstage.sizing.wishes",
    "analyse": "evenstage.flow.paths",
    "check_place": "evenstage.netlist.rewriting.output",
    "diff": "evenstage.flow.paths",
    "fit": "evenstage.flow.fitting",
    "fit_simulated": "evenstage.flow.fitting",
    "html": "evenstage.flow.reporting",
    "json": "evenstage.report.results",
    "load": "evenstage.flow.loading",
    "notices": "evenstage.report.results",
    "origin": "evenstage.flow.files",
    "recognise": "evenstage.flow.paths",
    "report": "evenstage.flow.reporting",
    "resize": "evenstage.flow.sizing",
    "schema_text": "evenstage.report.published",
    "simulate": "evenstage.flow.simulating",
    "text": "evenstage.report.results",
    "write_deck": "evenstage.flow.fitting",
    "write_text": "evenstage.flow.files",
}

if not TYPE_CHECKING:

    def __getattr__(name: str) -> object:
        """Import a name when it is first asked for: no command waits for the rooms of others."""
        if name not in _HOMES:
            raise AttributeError(f"module 'evenstage.flow' has no attribute '{name}'")
        value = getattr(import_module(_HOMES[name]), name)
        globals()[name] = value
        return value
