"""An analysis as text: the slowest paths and the block around them."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.report.block_text import block_lines, end_lines
from evenstage.report.frame import framed
from evenstage.report.paper import PLAIN, Paper
from evenstage.report.path_text import effort_lines, legend, path_lines
from evenstage.report.precharge_text import TITLE as PRECHARGE
from evenstage.report.precharge_text import precharge_lines
from evenstage.report.vector_text import false_lines, vector_lines
from evenstage.report.words import block_name, punctuality, rank, route, section, takes
from evenstage.units import engineering

if TYPE_CHECKING:
    from evenstage.timing.results import Analysis, Path


def analysis_report(analysis: Analysis, paper: Paper = PLAIN) -> str:
    """Return an analysis as text: the slowest path in stages, the others, the block."""
    lines: list[str] = []
    for number, path in enumerate(analysis.paths, 1):
        lines += path_section(paper, analysis, number, path)
    if analysis.paths:
        lines += ["", *legend(paper, analysis.yardstick)]
        title = f"Path ends, {rank(analysis)} first"
        lines += section(title, end_lines(paper, analysis.ends))
    if analysis.false_paths:
        title = "False paths, passed over: no input vector lets them switch"
        lines += section(title, false_lines(paper, analysis.false_paths))
    lines += section(PRECHARGE, precharge_lines(paper, analysis.precharges))
    lines += section("The block", block_lines(paper, analysis))
    subject = paper.paragraph(block_name(analysis))
    return framed(paper, subject, analysis_answer(analysis), lines, analysis.notices)


def analysis_answer(analysis: Analysis) -> str:
    """Return the one thing to know first."""
    if not analysis.paths:
        return "There is no path to report."
    slowest = analysis.paths[0]
    return " ".join(
        [
            f"The {rank(analysis)} path, {route(slowest)}, {takes(slowest, analysis.yardstick)}.",
            *circumstances(slowest),
        ]
    )


def circumstances(path: Path) -> list[str]:
    """Return sentences on when a path begins and must end, where there is something to say."""
    sentences = []
    arrival = engineering(path.delay, "s")
    if path.start_arrival:
        begins = engineering(path.start_arrival, "s")
        sentences.append(f"It begins at {begins}, so {path.end} arrives at {arrival}.")
    return [*sentences, *required(path)]


def required(path: Path) -> list[str]:
    """Return a sentence on when a path must end, where that is known."""
    if path.required is None:
        return []
    late = punctuality(path.delay, path.required)
    return [f"It must arrive by {engineering(path.required, 's')} and is {late}."]


def path_section(
    paper: Paper, analysis: Analysis, number: int, path: Path, where: str = ""
) -> list[str]:
    """Return the lines of one path, the first with its side branches and efforts.

    Parameters
    ----------
    paper : Paper
    analysis : Analysis
        In which the path was timed.
    number : int
        From 1.
    path : Path
    where : str
        What to add to the route.
    """
    if number == 1:
        lines = [
            f"The {rank(analysis)} path, stage by stage",
            *path_lines(paper, path, branches=True),
        ]
        efforts = effort_lines(paper, path, analysis.yardstick)
        return ["", *lines, "", *efforts, *vector_lines(paper, path)]
    title = f"Path {number}: {route(path)}{where}, {takes(path, analysis.yardstick)}"
    return [
        "",
        *paper.paragraph(title),
        *path_lines(paper, path, branches=False),
        *vector_lines(paper, path),
    ]
