"""What each command does: the rooms in order, once."""

from evenstage.circuit.inventory import Inventory
from evenstage.fitting.deck import Deck
from evenstage.fitting.results import Fit
from evenstage.flow.files import html, origin, write_text
from evenstage.flow.fitting import fit, fit_simulated, write_deck
from evenstage.flow.loading import Block, Question, load
from evenstage.flow.paths import analyse, diff, recognise
from evenstage.flow.reporting import report
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
