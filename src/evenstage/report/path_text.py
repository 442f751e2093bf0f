"""A path, stage by stage, every stage with its bar on the path's time axis."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

from evenstage.report.bars import TimeAxis
from evenstage.report.families import family_name, family_of
from evenstage.report.scale import Scale, figure, percent
from evenstage.report.stage_count import stage_count_text
from evenstage.report.table import Column, Table, first_that_fits
from evenstage.report.words import labelled, switching
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.paper import Paper
    from evenstage.timing.results import Path, SideBranch, Stage, Yardstick

#: A stage effort this many times above or below the best is marked.
FAR: Final = 2.0

#: Up to this ratio of charged to least delay, even stages would gain nothing worth telling.
_NEARLY: Final = 1.01

#: Side branches, or families of them, shown under a stage.
_BRANCHES_SHOWN: Final = 3

_NUMBER, _GATE, _FUNCTION, _OUTPUT, _EDGE, _TIME, _DELAY, _G, _H, _B, _F, _P, _MARK = range(13)
_COLUMNS: Final = (
    Column("", align="right"),
    Column("gate", kind="name"),
    Column("function", kind="name"),
    Column("output", kind="name"),
    Column("", before=1),
    Column("time", kind="chart", least=16, most=60),
    Column("delay", align="right"),
    Column("g", align="right"),
    Column("h", align="right", before=1),
    Column("b", align="right", before=1),
    Column("f", align="right", before=1),
    Column("p", align="right", before=1),
    Column("", before=1),
)
_EVERYTHING: Final = tuple(range(len(_COLUMNS)))
_NO_FUNCTION: Final = tuple(column for column in _EVERYTHING if column != _FUNCTION)
_NARROW: Final = tuple(c for c in _NO_FUNCTION if c not in {_G, _H, _B})


@dataclass(frozen=True, slots=True)
class Branch:
    """Side branches of one family on one stage."""

    what: str
    count: int
    cap: float
    share: float


def path_lines(paper: Paper, path: Path, *, branches: bool) -> list[str]:
    """Return a path's stages, one per line under a time axis.

    Parameters
    ----------
    paper : Paper
    path : Path
    branches : bool
        Whether the fattest side branches stand under the stage they load.
    """
    if not path.stages:
        return ["  The input is the path end: there is no stage between them."]
    scale = Scale.of((stage.delay for stage in path.stages), "s", digits=3, least=1)
    rows = _rows(paper, path, scale)
    chosen = (_EVERYTHING, _NO_FUNCTION, _NARROW)
    options = [([_COLUMNS[i] for i in c], [[row[i] for i in c] for row in rows]) for c in chosen]
    index, table = first_that_fits(paper, options)
    kept = chosen[index]
    axis = TimeAxis(path.start_arrival, path.delay, table.widths[kept.index(_TIME)], scale, paper)
    lines = _head(table, kept, axis)
    details = _details(paper, path, rows, kept, table, branches=branches)
    for span, row, detail in zip(switching(path), rows, details, strict=True):
        row[_TIME] = axis.bar(*span)
        lines += [table.line(*(row[i] for i in kept)), *detail]
    return lines


def _rows(paper: Paper, path: Path, scale: Scale) -> list[list[str]]:
    """Return the texts of all columns, the time column still empty."""
    stages = path.stages
    g = Scale.of((stage.logical_effort for stage in stages), digits=3)
    h = Scale.of((stage.electrical_effort for stage in stages), digits=2, least=1)
    b = Scale.of((stage.branching_effort for stage in stages), digits=2, least=1)
    f = Scale.of((stage.stage_effort for stage in stages), digits=2, least=1)
    p = Scale.of((stage.parasitic_delay for stage in stages), digits=2, least=1)
    return [
        [
            str(number),
            stage.instance,
            stage.function.replace(" ", ""),
            stage.output,
            paper.edge(stage.edge),
            "",
            scale.number(stage.delay),
            g.number(stage.logical_effort),
            h.number(stage.electrical_effort),
            b.number(stage.branching_effort),
            f.number(stage.stage_effort),
            p.number(stage.parasitic_delay),
            effort_mark(stage, path),
        ]
        for number, stage in enumerate(stages, 1)
    ]


def effort_mark(stage: Stage, path: Path) -> str:
    """Return ``high`` or ``low`` for a stage effort far from the best, else nothing."""
    if stage.stage_effort > FAR * path.best_stage_effort:
        return "high"
    return "low" if stage.stage_effort < path.best_stage_effort / FAR else ""


def _head(table: Table, kept: Sequence[int], axis: TimeAxis) -> list[str]:
    """Return the titles with the tick labels, and the units with the axis."""
    titles = {_TIME: axis.labels()}
    units = {_TIME: axis.ruler(), _DELAY: axis.scale.unit}
    return [
        table.line(*(titles.get(i, _COLUMNS[i].title) for i in kept)),
        table.line(*(units.get(i, "") for i in kept)),
    ]


def _details(
    paper: Paper,
    path: Path,
    rows: Sequence[Sequence[str]],
    kept: Sequence[int],
    table: Table,
    *,
    branches: bool,
) -> list[list[str]]:
    """Return the lines under each stage: what found no column, and its side branches."""
    indent = table.start(kept.index(_GATE))
    details = [
        _left_over(paper, row, kept, indent)
        + _through(paper, stage, indent)
        + _wire(paper, stage, indent)
        for row, stage in zip(rows, path.stages, strict=True)
    ]
    if not branches:
        return details
    loads = [branch_families(paper, stage) for stage in path.stages]
    everything = [branch for load in loads for branch in load]
    scale = Scale.of((branch.cap for branch in everything), "F", digits=3)
    texts = [[_branch_row(branch, scale) for branch in load] for load in loads]
    columns = [Column("", kind="name"), Column("", align="right"), Column("", align="right")]
    flat = [row for load in texts for row in load]
    _, layout = first_that_fits(paper, [(columns, flat)], indent=indent + 2)
    return [
        [*detail, *(layout.line(*row) for row in load)]
        for detail, load in zip(details, texts, strict=True)
    ]


def _through(paper: Paper, stage: Stage, indent: int) -> list[str]:
    """Return the gates besides its own that a stage runs through, if any."""
    if not stage.through:
        return []
    text = f"through {', '.join(stage.through)}"
    return [" " * indent + paper.shorten(text, paper.width - indent)]


def _left_over(paper: Paper, row: Sequence[str], kept: Sequence[int], indent: int) -> list[str]:
    if _FUNCTION in kept:
        return []
    text = row[_FUNCTION]
    if _G not in kept:
        text = f"g {row[_G]}  h {row[_H]}  b {row[_B]}  {text}"
    return [(" " * indent + paper.shorten(text, paper.width - indent)).rstrip()]


def _wire(paper: Paper, stage: Stage, indent: int) -> list[str]:
    """Return what resistance along the net behind a stage does, where there is some."""
    if stage.effective_cap is None and not stage.wire_delay:
        return []
    text = f"wire adds {engineering(stage.wire_delay, 's')}"
    if stage.effective_cap is not None:
        scale = Scale.of([stage.load_cap], "F", digits=3)
        text += f", shows {scale.number(stage.effective_cap)} of {scale.text(stage.load_cap)}"
    return [" " * (indent + 2) + paper.shorten(text, paper.width - indent - 2)]


def branch_families(paper: Paper, stage: Stage) -> list[Branch]:
    """Return the fattest families of a stage's side branches and the sum of the others."""
    members: dict[tuple[str, str], list[SideBranch]] = {}
    for branch in stage.side_branches:
        members.setdefault((family_of(branch.instance), branch.pin), []).append(branch)
    families = [_family(paper, group, stage.load_cap) for group in members.values()]
    families.sort(key=lambda family: (-family.cap, family.what))
    first = _BRANCHES_SHOWN if len(families) != _BRANCHES_SHOWN + 1 else len(families)
    rest = families[first:]
    if not rest:
        return families
    cap = sum(family.cap for family in rest)
    count = sum(family.count for family in rest)
    share = _share(cap, stage.load_cap)
    return [*families[:first], Branch(f"and {count} more", count, cap, share)]


def _family(paper: Paper, group: Sequence[SideBranch], load: float) -> Branch:
    cap = sum(branch.cap for branch in group)
    name = family_name([branch.instance for branch in group])
    pin = group[0].pin
    what = f"{name} {pin}" if pin in {"wire", "load", "on the way"} else f"{name} pin {pin}"
    if not name:
        what = "load outside the block" if pin == "load" else f"{pin} outside the block"
    many = f"{len(group)} {paper.times} " if len(group) > 1 else ""
    return Branch(many + what, len(group), cap, _share(cap, load))


def _share(cap: float, load: float) -> float:
    return cap / load if load > 0 else 0.0


def _branch_row(branch: Branch, scale: Scale) -> list[str]:
    return [f"+ {branch.what}", scale.text(branch.cap), f"{100 * branch.share:.0f} %"]


def effort_lines(paper: Paper, path: Path, yardstick: Yardstick) -> list[str]:
    """Return what the path's efforts say of its widths, its stage count and its topology."""
    if not path.stages:
        return []
    product = (
        f"F {figure(path.path_effort)} = G {figure(path.logical_effort)} {paper.times} "
        f"B {figure(path.branching_effort)} {paper.times} H {figure(path.electrical_effort)}"
    )
    logic = (
        f"parasitic delay P {figure(path.parasitic_delay)} {paper.times} tau makes "
        f"{engineering(path.parasitic_delay * yardstick.tau, 's')} of the charged delay"
    )
    return [
        *labelled(paper, "effort", f"{product}; {logic}"),
        *labelled(paper, "widths", _evenness(path)),
        *labelled(paper, "stages", stage_count_text(path, yardstick.p_inv)),
    ]


def _evenness(path: Path) -> str:
    """Return how uneven the stage efforts are and what that costs."""
    efforts = [stage.stage_effort for stage in path.stages]
    even = path.path_effort ** (1 / len(efforts))
    charged = sum(stage.charged_delay for stage in path.stages)
    effort = Scale.of([*efforts, even], digits=2, least=1)
    delay = Scale.of([charged], "s", digits=3)
    spread = (
        f"stage efforts run from {effort.number(min(efforts))} to {effort.number(max(efforts))}"
    )
    if charged <= _NEARLY * path.least_delay:
        return f"{spread}; evening them out would gain next to nothing"
    return (
        f"{spread}; at {effort.number(even)} each, the charged delay would fall from "
        f"{delay.text(charged)} to {delay.text(path.least_delay)} "
        f"({percent(charged, path.least_delay)}), as far as wires, fixed loads and limits allow"
    )


def legend(paper: Paper, yardstick: Yardstick) -> list[str]:
    """Return what the columns mean."""
    product = f"g{paper.times}h{paper.times}b" if paper.unicode else "g*h*b"
    text = (
        f"{paper.edge('rise')} rising, {paper.edge('fall')} falling output; g logical, "
        f"h electrical, b branching effort; f = {product} stage effort, high or low where {FAR:g} "
        f"times off the best; p parasitic delay. tau {paper.times} (f + p) with tau "
        f"{engineering(yardstick.tau, 's')} is the charged delay, which counts a slow edge to the "
        "stage that makes it; delay is the time between half-supply points. + what else the stage "
        "drives, and its share of the load."
    )
    return paper.paragraph(text, indent=2)
