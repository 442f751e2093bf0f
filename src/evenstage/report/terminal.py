"""Results as plain text for a terminal, a file or a pipe."""

from __future__ import annotations

from evenstage.report.analysis_text import analysis_report
from evenstage.report.corners_text import corners_difference_report, corners_report
from evenstage.report.difference_text import difference_report
from evenstage.report.fit_text import deck_report, fit_report
from evenstage.report.inventory_text import inventory_report
from evenstage.report.simulation_text import simulation_report
from evenstage.report.sizing_text import sizing_report

__all__ = [
    "analysis_report",
    "corners_difference_report",
    "corners_report",
    "deck_report",
    "difference_report",
    "fit_report",
    "inventory_report",
    "simulation_report",
    "sizing_report",
]
