"""What the page of each kind of result holds."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.analysis_text import analysis_answer
from evenstage.report.corners_text import corners_answer, corners_difference_answer
from evenstage.report.difference_text import difference_answer
from evenstage.report.families import gathered
from evenstage.report.fit_text import fit_answer
from evenstage.report.page.assembly import assembled
from evenstage.report.page.changes import change_table, difference_table
from evenstage.report.page.ends import end_parts
from evenstage.report.page.origin_parts import origin_parts
from evenstage.report.page.parts import (
    Heading,
    KeyFigure,
    Page,
    Paragraph,
    Section,
    Table,
    cells,
)
from evenstage.report.page.path_drawing import path_figure
from evenstage.report.page.precharge import precharge_parts
from evenstage.report.page.residuals import constant_parts, residual_parts
from evenstage.report.page.sides import sides
from evenstage.report.page.sized_corners import sized_corner_section
from evenstage.report.page.stage_tables import effort_table, load_table, time_table
from evenstage.report.page.tradeoff import TradePoint, trade_parts
from evenstage.report.page.waveforms import waveform_parts
from evenstage.report.pair_text import total_rows, worst_charged
from evenstage.report.paper import Paper
from evenstage.report.precharge_text import TITLE as PRECHARGE
from evenstage.report.quality_text import quality_parts
from evenstage.report.scale import Scale, figure, percent, plain
from evenstage.report.simulation_text import BY_CONSTRUCTION, simulation_answer
from evenstage.report.sizing_text import HOLDS, sizing_answer
from evenstage.report.vector_text import vector_words
from evenstage.report.words import (
    block_name,
    counted,
    duration,
    listed,
    rank,
    route,
    same_route,
    takes,
)
from evenstage.simulation.parameters import SCALED
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from evenstage.fitting.results import Fit
    from evenstage.report.origin import Origin
    from evenstage.report.page.parts import Part
    from evenstage.simulation.results import Simulation
    from evenstage.sizing.results import Sizing
    from evenstage.timing.corners import Corners, CornersDifference
    from evenstage.timing.results import Analysis, Difference, Path

_NAMES_SHOWN: Final = 8
_PATHS_SHOWN: Final = 60
_PAPER: Final = Paper(unicode=True)


def analysis_page(analysis: Analysis, origin: Origin) -> Page:
    """Return the page of an analysis."""
    path = analysis.paths[0] if analysis.paths else None
    sections = [
        *(_path_sections(None, path, analysis) if path else ()),
        Section("others", "Other paths", _path_list(analysis.paths[1:], analysis)),
        Section("false", "False paths", _false_paths(analysis)),
        Section("ends", "Path ends", end_parts([("", analysis)])),
        Section("precharge", PRECHARGE, precharge_parts(analysis.precharges)),
        _origin_section(origin, analysis),
    ]
    return assembled(
        subject=block_name(analysis),
        kind="analysis",
        answer=analysis_answer(analysis),
        figures=_one_figures(analysis),
        notices=analysis.notices,
        sections=sections,
    )


def corners_page(corners: Corners, origin: Origin) -> Page:
    """Return the page of a block in several processes: that of the corner that limits, and all."""
    worst = corners.worst
    scale = Scale.of((_latest(one) for one in corners.analyses), "s")
    rows = tuple(
        cells(
            one.yardstick.process,
            scale.number(_latest(one)),
            engineering(one.yardstick.fo4, "s"),
            "limits" if one is worst else "",
        )
        for one in corners.analyses
    )
    headings = (
        Heading("corner"),
        Heading(f"latest arrival, {scale.unit}", "number"),
        Heading("FO4", "number"),
        Heading(""),
    )
    table = Table("Latest arrival in each corner", headings, rows)
    sections = [
        Section("corners", "Corners", (table,)),
        *_path_sections(None, corners.paths[0], worst),
        Section("ends", f"Path ends in {worst.yardstick.process}", end_parts([("", worst)])),
        _origin_section(origin, worst),
    ]
    return assembled(
        subject=block_name(worst),
        kind="analysis in corners",
        answer=corners_answer(corners),
        figures=_one_figures(worst),
        notices=corners.notices,
        sections=sections,
    )


def sizing_page(sizing: Sizing, origin: Origin) -> Page:
    """Return the page of a resizing."""
    before, after = sizing.before, sizing.after
    holds = {hold.instance: HOLDS[hold.hold] for hold in sizing.holds if hold.hold}
    old = before.paths[0] if sizing.changes else None
    table = change_table(sizing.changes)
    both = [("before", before), ("after", after)] if sizing.changes else [("", after)]
    sections = [
        *([sized_corner_section(sizing.corners)] if sizing.corners else []),
        Section("quality", "How good the widths are", _quality(sizing)),
        *_path_sections(old, after.paths[0], after, holds),
        Section("trade", "What speed costs", _trade(sizing)),
        Section("changes", "Changes", (table,) if table else ()),
        Section("ends", "Path ends", end_parts(both, sizing.asked_delay)),
        Section("block", "The block", (_totals(before, after),)),
        _origin_section(origin, after),
    ]
    return assembled(
        subject=block_name(before),
        kind="resizing",
        answer=sizing_answer(sizing),
        figures=_two_figures(before, after, sizing.slowest_before),
        notices=(*sizing.notices, *sizing.block_notices),
        sections=sections,
    )


def difference_page(difference: Difference, origin: Origin, answer: str = "") -> Page:
    """Return the page of two netlists of one design."""
    before, after = difference.before, difference.after
    table = difference_table(difference.widths)
    only = tuple(
        Paragraph(listed(gathered(names, "×"), _NAMES_SHOWN), f"Only {when}")
        for when, names in (("before", difference.only_before), ("after", difference.only_after))
        if names
    )
    sections = [
        *_path_sections(before.paths[0], after.paths[0], after),
        Section("changes", "Widths that differ", (*((table,) if table else ()), *only)),
        Section("ends", "Path ends", end_parts([("before", before), ("after", after)])),
        Section("block", "The blocks", (_totals(before, after),)),
        _origin_section(origin, after),
    ]
    return assembled(
        subject=f"{block_name(before)}, against {block_name(after)}",
        kind="difference",
        answer=answer or difference_answer(difference),
        figures=_two_figures(before, after),
        notices=(*before.notices, *after.notices),
        sections=sections,
    )


def corners_difference_page(difference: CornersDifference, origin: Origin) -> Page:
    """Return the page of two netlists in the corner that limits the second."""
    answer = corners_difference_answer(difference)
    return difference_page(difference.worst, origin, answer)


def simulation_page(simulation: Simulation, origin: Origin) -> Page:
    """Return the page of a simulation."""
    before, after = simulation.before, simulation.after
    new = before if after is None else after
    old = None if after is None else before.paths[0].estimate
    paths = [("" if after is None else "before", before.paths[0])]
    if after is not None:
        paths.append(("after", after.paths[0]))
    waves = [*waveform_parts(paths)]
    if simulation.scaled:
        waves.insert(0, Paragraph(BY_CONSTRUCTION))
    every = [*before.analysis.notices, *(after.analysis.notices if after else ())]
    sections = [
        Section("waveforms", "Simulated waveforms", tuple(waves)),
        *_path_sections(old, new.paths[0].estimate, new.analysis),
        _origin_section(origin, new.analysis),
    ]
    against = "" if after is None else f", against {block_name(after.analysis)}"
    return assembled(
        subject=block_name(before.analysis) + against,
        kind="simulation",
        answer=simulation_answer(simulation),
        figures=_simulated_figures(simulation),
        # That currents were scaled stands above the waveforms already.
        notices=[*every, *(one for one in simulation.notices if one.code != SCALED)],
        sections=sections,
    )


def _simulated_figures(simulation: Simulation) -> tuple[KeyFigure, ...]:
    """Return the first path's delays and how they compare; of two, those after beside before."""
    rows = [
        (
            engineering(block.paths[0].estimated_delay, "s"),
            engineering(block.paths[0].delay, "s"),
            percent(block.paths[0].delay, block.paths[0].estimated_delay),
        )
        for block in (simulation.after, simulation.before)
        if block is not None
    ]
    labels = ("estimated", "simulated", "estimate against simulation")
    was = [""] * 3 if len(rows) == 1 else [f"before {value}" for value in rows[1]]
    return tuple(map(KeyFigure, labels, rows[0], was))


def fit_page(fit: Fit, origin: Origin) -> Page:
    """Return the page of a fitted process."""
    sections = [
        Section("residuals", "Predicted against measured", residual_parts(fit)),
        Section("constants", "Constants", constant_parts(fit)),
        Section("origin", "How to make this page again", origin_parts(origin, None)),
    ]
    return assembled(
        subject=f"{fit.source}, cells of {fit.cells}",
        kind="fit",
        answer=fit_answer(fit),
        figures=(
            KeyFigure("measurements used", f"{fit.used} of {fit.measured}"),
            KeyFigure("FO4 of the fitted process", engineering(fit.fo4, "s")),
        ),
        notices=fit.notices,
        sections=sections,
    )


def _path_sections(
    before: Path | None, after: Path, analysis: Analysis, holds: Mapping[str, str] | None = None
) -> list[Section]:
    """Return the drawing, the times, the efforts and the loads of a path or of two."""
    if not after.stages or (before is not None and not before.stages):
        return []
    both = sides(before, after, holds)
    drawing = path_figure(both)
    name = f"The {rank(analysis)} path"
    if before is None:
        lead, title = f"{route(after)}.".capitalize(), name
    elif same_route(before, after):
        lead, title = f"{route(after)}.", f"{name}, before and after"
    else:
        lead = f"Before: {route(before)}. After: {route(after)}."
        title = f"{name} before, and the one after"
    words = vector_words(after)
    told = (Paragraph(f"{words}.", "Input vector"),) if words else ()
    drawn = (*told, drawing) if drawing else told
    if before is None:
        lead = f"{route(after)}."
    return [
        Section("path", title, (Paragraph(lead), *drawn, time_table(both))),
        Section("efforts", "Stage effort", (Paragraph(_effort(after)), effort_table(both))),
        Section("loads", "Where time and load go", (load_table(both, analysis.yardstick.tau),)),
    ]


def _effort(path: Path) -> str:
    return (
        f"At a stage effort of {path.best_stage_effort:.2f} in each of its "
        f"{counted(len(path.stages), 'stage')} the path's charged delay would be "
        f"{engineering(path.least_delay, 's')}; it is {engineering(path.charged_delay, 's')}. "
        f"The best number of stages for its effort of {figure(path.path_effort)} is "
        f"{path.best_stage_count}."
    )


def _quality(sizing: Sizing) -> tuple[Part, ...]:
    return tuple(Paragraph(f"{words}.", label) for label, words in quality_parts(sizing))


def _trade(sizing: Sizing) -> tuple[Part, ...]:
    """Return what is known of the trade: today, the answer, the bound, and the curve if asked."""
    curve = sizing.trade_off
    what = curve.spend if curve else "width"
    points = [_point(sizing.every_before, what, "today")]
    if sizing.changes:
        points.append(_point(sizing.every_after, what, "answer"))
    if curve is not None:
        points += [TradePoint(one.spend, one.charged_delay) for one in curve.points]
        if curve.knee is not None:
            knee = curve.points[curve.knee]
            points.append(TradePoint(knee.spend, knee.charged_delay, "knee"))
    least = sizing.least_delay if sizing.least_delay > 0 else None
    return trade_parts(points, least, what)


def _point(corners: Sequence[Analysis], what: str, label: str) -> TradePoint:
    """Return what a block spends in its first corner, and its delay in the worst."""
    spend = corners[0].total_width if what == "width" else corners[0].switched_cap
    return TradePoint(spend, max(map(worst_charged, corners)), label)


def _totals(before: Analysis, after: Analysis) -> Table:
    rows = total_rows(_PAPER, before, after)
    headings = (
        Heading(""),
        *(Heading(title, "number") for title in ("before", "after", "change")),
    )
    return Table("Totals", headings, tuple(cells(*row) for row in rows), names=False)


def _path_list(paths: Sequence[Path], analysis: Analysis) -> tuple[Part, ...]:
    return (_path_table("The next slowest paths", paths, analysis, 2),) if paths else ()


def _path_table(title: str, paths: Sequence[Path], analysis: Analysis, first: int) -> Table:
    """Return paths, numbered from some number on, with how long they take."""
    scale = Scale.of((path.delay for path in paths), "s")
    rows = tuple(
        cells(
            f"{number:<4}{_PAPER.shorten(route(path), 70)}",
            scale.number(duration(path)),
            plain(duration(path) / analysis.yardstick.fo4, 1),
            str(len(path.stages)),
        )
        for number, path in enumerate(paths[:_PATHS_SHOWN], first)
    )
    headings = (
        Heading("path"),
        *(Heading(t, "number") for t in (f"takes, {scale.unit}", "FO4", "stages")),
    )
    left = len(paths) - len(rows)
    remark = f"{left} more are in the JSON." if left else ""
    return Table(title, headings, rows, remark=remark, sortable=True)


def _false_paths(analysis: Analysis) -> tuple[Part, ...]:
    if not analysis.false_paths:
        return ()
    told = "Passed over, since no input vector lets them switch."
    return (Paragraph(told), _path_table("Slower, but false", analysis.false_paths, analysis, 1))


def _latest(analysis: Analysis) -> float:
    ends = (end.delay for end in analysis.ends)
    return max([*ends, *(path.delay for path in analysis.paths)], default=0.0)


def _one_figures(analysis: Analysis) -> tuple[KeyFigure, ...]:
    figures = [
        KeyFigure("total width", engineering(analysis.total_width, "m")),
        KeyFigure("switched capacitance", engineering(analysis.switched_cap, "F")),
        KeyFigure("slowest transition", engineering(analysis.worst_transition, "s")),
    ]
    if analysis.paths:
        path = analysis.paths[0]
        taken = takes(path, analysis.yardstick).split(", ", 1)[1]
        figures.insert(0, KeyFigure("path delay", engineering(duration(path), "s"), taken))
    return tuple(figures)


def _two_figures(
    before: Analysis, after: Analysis, slowest: Path | None = None
) -> tuple[KeyFigure, ...]:
    """Return what moves; ``slowest`` is the path before, where it is not that of the block."""
    pairs = (
        ("slowest path", (slowest or before.paths[0]).delay, after.paths[0].delay, "s"),
        ("total width", before.total_width, after.total_width, "m"),
        ("switched capacitance", before.switched_cap, after.switched_cap, "F"),
        ("slowest transition", before.worst_transition, after.worst_transition, "s"),
    )
    return tuple(
        KeyFigure(
            label,
            engineering(new, unit),
            f"{percent(old, new)}, before {engineering(old, unit)}",
        )
        for label, old, new, unit in pairs
    )


def _origin_section(origin: Origin, analysis: Analysis) -> Section:
    parts = origin_parts(origin, analysis.yardstick)
    return Section("origin", "How to make this page again", parts)
