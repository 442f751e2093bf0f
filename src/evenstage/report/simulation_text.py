"""Paths estimated and simulated, side by side, as text."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.frame import framed
from evenstage.report.paper import PLAIN, Paper
from evenstage.report.scale import Scale, percent
from evenstage.report.table import Column, first_that_fits
from evenstage.report.words import (
    block_name,
    both_names,
    counted,
    labelled,
    listed,
    moves,
    rank,
    route,
    same_route,
    section,
)
from evenstage.simulation.parameters import SCALED
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.simulation.results import SimulatedBlock, SimulatedPath, Simulation

_HELD_SHOWN: Final = 12

_LEGEND: Final = (
    "delay from 50 % to 50 %, transition from 10 to 90 % over 0.8; % is the estimate against the "
    "simulation. Simulated are transistors after a simple law (level 1 or alpha-power) with "
    "constant capacitances, not the foundry's models."
)
BY_CONSTRUCTION: Final = (
    "The currents were chosen so that the unit inverter's FO4 agrees: absolute times agree by "
    "construction, only ratios between stages, paths and netlists are evidence."
)


def simulation_report(simulation: Simulation, paper: Paper = PLAIN) -> str:
    """Return a simulation as text: the answer, the first path's stages, the other paths."""
    before, after = simulation.before, simulation.after
    if after is None:
        subject = paper.paragraph(block_name(before.analysis))
    else:
        subject = both_names(paper, before.analysis, after.analysis)
    lines = paper.paragraph(BY_CONSTRUCTION) if simulation.scaled else []
    lines += _block_lines(paper, before, "" if after is None else " before")
    if after is not None:
        lines += _block_lines(paper, after, " after")
    lines += ["", *paper.paragraph(_LEGEND, indent=2)]
    lines += section("How it was simulated", _how_lines(paper, simulation))
    every = [*before.analysis.notices, *(after.analysis.notices if after else ())]
    # That currents were scaled stands above already.
    others = [notice for notice in simulation.notices if notice.code != SCALED]
    return framed(paper, subject, simulation_answer(simulation), lines, [*every, *others])


def simulation_answer(simulation: Simulation) -> str:
    """Return the one thing to know first."""
    old = simulation.before.paths[0]
    name = _first(simulation.before)
    if simulation.after is None:
        return (
            f"The {name}, {route(old.estimate)}, takes "
            f"{engineering(old.estimated_delay, 's')} as estimated and "
            f"{engineering(old.delay, 's')} as simulated: the estimate is {_off(old)}."
            f"{_ranking(simulation.before)}"
        )
    new = simulation.after.paths[0]
    which = route(old.estimate)
    if not same_route(old.estimate, new.estimate):
        which = f"before {which}, after {route(new.estimate)}"
    estimated, simulated = (
        (old.estimated_delay, new.estimated_delay),
        (old.delay, new.delay),
    )
    return (
        f"The {name} ({which}) {moves(*estimated)} as estimated, and {moves(*simulated)} as "
        f"simulated: {_faster(*estimated)} claimed, {_faster(*simulated)} simulated."
    )


def _first(block: SimulatedBlock) -> str:
    """Return what the first path is that was simulated."""
    path = f"{rank(block.analysis)} path"
    if block.paths[0].estimate == block.analysis.paths[0]:
        return path
    return f"{path} of those that switch"


def _faster(before: float, after: float) -> str:
    return f"{before / after:.3f} times as fast"


def _off(path: SimulatedPath) -> str:
    """Return how far the estimate is off, in words."""
    difference = 100 * (path.estimated_delay / path.delay - 1)
    if abs(difference) < 0.05:
        return "right to 0.1 %"
    return f"{abs(difference):.1f} % {'high' if difference > 0 else 'low'}"


def _ranking(block: SimulatedBlock) -> str:
    if len(block.paths) == 1:
        return ""
    if block.ranks_alike:
        return f" Simulated, the {len(block.paths)} paths rank in the same order."
    order = sorted(range(len(block.paths)), key=lambda place: -block.paths[place].delay)
    return f" Simulated, the paths rank {', '.join(str(place + 1) for place in order)}."


def _block_lines(paper: Paper, block: SimulatedBlock, when: str) -> list[str]:
    """Return the stages of a block's first path, and one line for each of the others."""
    first = block.paths[0]
    title = f"The {_first(block)}{when}, stage by stage"
    lines = section(title, _stage_lines(paper, first))
    rows = [
        [str(place), route(path.estimate), *_figures(path, _scale([path]))]
        for place, path in enumerate(block.paths[1:], 2)
    ]
    for label, path in (("", block.other_edge), ("", block.same_path)):
        if path is not None:
            rows.append([label, route(path.estimate), *_figures(path, _scale([path]))])
    columns = [
        Column(""),
        Column("path", kind="name"),
        Column("delay", align="right"),
        Column("simulated", align="right"),
        Column("", align="right"),
    ]
    if not rows:
        return lines
    _, table = first_that_fits(paper, [(columns, rows)], indent=0)
    return [*lines, *section(f"Other paths{when}", table.lines(rows))]


def _scale(paths: Sequence[SimulatedPath]) -> Scale:
    return Scale.of([delay for path in paths for delay in (path.estimated_delay, path.delay)], "s")


def _figures(path: SimulatedPath, scale: Scale) -> list[str]:
    return [
        scale.text(path.estimated_delay),
        scale.text(path.delay),
        percent(path.delay, path.estimated_delay),
    ]


def _stage_lines(paper: Paper, path: SimulatedPath) -> list[str]:
    scale = _scale([path])
    swings = [stage.transition or 0.0 for stage in path.stages]
    swing = Scale.of([*swings, *(stage.estimate.transition for stage in path.stages)], "s")
    rows = [
        [
            str(place),
            stage.estimate.instance,
            stage.estimate.output,
            paper.edge(stage.estimate.edge),
            scale.number(stage.estimate.delay),
            scale.number(stage.delay),
            percent(stage.delay, stage.estimate.delay),
            swing.number(stage.estimate.transition),
            "-" if stage.transition is None else swing.number(stage.transition),
        ]
        for place, stage in enumerate(path.stages, 1)
    ]
    total = [scale.number(path.estimated_delay), scale.number(path.delay)]
    rows.append(["", "path", "", "", *total, percent(path.delay, path.estimated_delay), "", ""])
    columns = [
        Column("", align="right"),
        Column("gate", kind="name"),
        Column("output", kind="name"),
        Column("", before=1),
        Column(f"delay, {scale.unit}", align="right"),
        Column("simulated", align="right"),
        Column("%", align="right"),
        Column(f"transition, {swing.unit}", align="right", before=3),
        Column("simulated", align="right"),
    ]
    _, table = first_that_fits(paper, [(columns, rows)])
    return table.lines(rows)


def _how_lines(paper: Paper, simulation: Simulation) -> list[str]:
    path = simulation.before.paths[0]
    branches = (
        f"{counted(path.side_gates, 'gate')} beside the path, the rest of the load as capacitances"
        if simulation.side_branches == "gates"
        else "side branches as capacitances"
    )
    lines = labelled(
        paper,
        "circuit",
        f"{counted(path.devices, 'transistor')}, {counted(path.nodes, 'node')}, "
        f"{counted(path.steps, 'time step')}; {branches}",
    )
    if path.held:
        held = [f"{net} {'high' if level else 'low'}" for net, level in path.held]
        by = "by the path's vector" if path.by_vector else "to suit the path's own gates"
        lines += labelled(paper, "held", f"{listed(held, _HELD_SHOWN)}; {by}")
    return lines
