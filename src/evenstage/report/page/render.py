"""Any result as one HTML file that needs nothing else."""

from __future__ import annotations

import re
from functools import cache
from typing import TYPE_CHECKING, Any, Final

from jinja2 import Environment, PackageLoader, StrictUndefined

from evenstage.fitting.results import Fit
from evenstage.report.frame import CAUTION
from evenstage.report.page.contents import (
    analysis_page,
    corners_difference_page,
    corners_page,
    difference_page,
    fit_page,
    simulation_page,
    sizing_page,
)
from evenstage.simulation.results import Simulation
from evenstage.sizing.results import Sizing
from evenstage.timing.corners import Corners, CornersDifference
from evenstage.timing.results import Analysis, Difference

if TYPE_CHECKING:
    from collections.abc import Callable

    from jinja2 import Template

    from evenstage.report.document.convert import Reviewable
    from evenstage.report.origin import Origin
    from evenstage.report.page.parts import Page

_UNIT: Final = re.compile(r"(?<=\d) (?=%|[afpnumkMG]?[sFmV]\b)")

# Each takes the result it stands beside.
_PAGES: Final[dict[type, Callable[[Any, Origin], Page]]] = {
    Analysis: analysis_page,
    Corners: corners_page,
    Sizing: sizing_page,
    Difference: difference_page,
    CornersDifference: corners_difference_page,
    Simulation: simulation_page,
    Fit: fit_page,
}


def html(result: Reviewable, origin: Origin) -> str:
    """Return a result as a page.

    Parameters
    ----------
    result : Analysis, Corners, Sizing, Difference, CornersDifference, Simulation or Fit
    origin : Origin

    Returns
    -------
    str
        The same for the same result and origin; signs that cannot be shown are replaced.
    """
    page = _PAGES[type(result)](result, origin)
    text = _template().render(page=page, caution=CAUTION)
    if text.isprintable():
        return text
    return "".join(
        sign
        if sign.isprintable() or sign in "\n\N{NO-BREAK SPACE}"
        else "\N{REPLACEMENT CHARACTER}"
        for sign in text
    )


def _together(text: str) -> str:
    """Return a text in which no line breaks between a number and its unit."""
    return _UNIT.sub("\N{NO-BREAK SPACE}", text)


@cache
def _template() -> Template:
    environment = Environment(
        loader=PackageLoader("evenstage.report.page"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=True,
    )
    environment.filters["together"] = _together
    return environment.get_template("page.html")
