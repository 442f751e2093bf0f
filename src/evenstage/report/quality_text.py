"""How good the widths of a sizing are: goal, what no widths can beat, distance to it."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.pair_text import worst_charged
from evenstage.report.scale import Scale, plain
from evenstage.report.words import counted, labelled, punctuality
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.logic.same import StructureCheck
    from evenstage.report.paper import Paper
    from evenstage.sizing.results import Sizing
    from evenstage.timing.results import PathEnd

#: What no sizes can do to a width or a capacitance, and the unit it is measured in.
_WISHES: Final = {
    "delay": ("have a worst charged delay below", "s"),
    "width": ("be narrower in total than", "m"),
    "energy": ("switch less capacitance than", "F"),
}

#: Percent below which two figures are one.
_SAME: Final = 0.005


def quality_lines(paper: Paper, sizing: Sizing) -> list[str]:
    """Return goal, bound and distance to it in words."""
    return [line for part in quality_parts(sizing) for line in labelled(paper, *part)]


def quality_parts(sizing: Sizing) -> list[tuple[str, str]]:
    """Return goal, bound and distance to it, each a label and a sentence."""
    cards = f" ({counted(sizing.free_cards, 'size')} free to move, {sizing.fixed_cards} fixed)"
    proof = (
        f"the best sizes off the grid are proved to lie within {_gap(sizing.gap)} of the bound"
        f"{_sharing(sizing.sharing_loss)}; "
        f"putting widths on the grid costs {_loss(sizing.rounding_loss)}"
    )
    return [
        ("goal", sizing.goal + ("" if sizing.already_done else cards)),
        ("bound", _bound(sizing)),
        ("proof", proof),
        *([("function", _function(sizing.structure))] if sizing.structure else []),
    ]


def _sharing(loss: float) -> str:
    """Return how much of the gap is there because copies of a leaf share sizes."""
    return (
        f", {_gap(loss)} of it because copies of a leaf share sizes" if loss >= _SAME / 100 else ""
    )


def _function(check: StructureCheck) -> str:
    """Return what came of reading the written netlist back."""
    if check.same is None:
        return f"the written netlist was not read back: {check.reason}"
    return (
        "unchanged: the written netlist was read back, and its "
        f"{counted(check.transistors, 'transistor')} differ from those before in widths alone"
    )


def _bound(sizing: Sizing) -> str:
    """Return what no sizes can beat, and where the written ones stand."""
    required = {end.required for end in sizing.after.ends if end.required is not None}
    if sizing.bound_on == "delay" and len(required) > 1:
        latest = max(required)
        reached = max(_charged(one.ends, latest) for one in sizing.every_after)
        return _bound_by_requirement(sizing.bound, reached, latest)
    wish, unit = _WISHES[sizing.bound_on]
    reached = _reached(sizing)
    scale = Scale.of([sizing.bound, reached], unit)
    least = f"; the fastest possible would be {engineering(sizing.least_delay, 's')}"
    return (
        f"{_who(sizing)} can {wish} {scale.text(sizing.bound)}; the written ones are "
        f"at {scale.text(reached)}{_distance(sizing.bound, reached)}"
        f"{'' if sizing.bound_on == 'delay' else least}"
    )


def _who(sizing: Sizing) -> str:
    """Return which sizes a bound is about."""
    if sizing.few is None:
        return "no sizes within the limits"
    return f"with only the chosen cards changed ({sizing.few.asked} at most) no sizes"


def _reached(sizing: Sizing) -> float:
    """Return what the written sizes make of the figure that the bound is about.

    A delay is the worst over corners, a capacitance that of the first.
    """
    every = sizing.every_after
    if sizing.bound_on == "delay":
        return max(map(worst_charged, every))
    return sizing.total_width_after if sizing.bound_on == "width" else every[0].switched_cap


def _charged(ends: Sequence[PathEnd], latest: float) -> float:
    """Return the worst charged delay where an end required earlier counts as later by as much."""
    return max(end.charged_delay + latest - (end.required or latest) for end in ends)


def _bound_by_requirement(bound: float, reached: float, latest: float) -> str:
    """Return the bound as what is late or early; ends that need not hurry count as the latest."""
    return (
        "by their charged delays, no sizes within the limits do better than "
        f"{punctuality(bound, latest)}; the written ones are {punctuality(reached, latest)}"
    )


def _distance(bound: float, reached: float) -> str:
    """Return how far a figure is from its bound.

    A size scales all widths of a gate alike; the grid may move them apart, and then a little more
    is possible than the bound on sizes says.
    """
    if bound <= 0:
        return ""
    above = 100 * (reached - bound) / bound
    number = plain(abs(above), 2 if abs(above) < 9.995 else 0)
    if above >= _SAME:
        return f", {number} % above"
    if above > -_SAME:
        return ", just there"
    return f", {number} % below, as the grid moves the widths of one gate apart"


def _gap(gap: float) -> str:
    """Return a relative gap; very small ones as an upper limit."""
    return f"{plain(100 * gap, 3)} %" if gap >= 1e-5 else "0.001 %"


def _loss(loss: float) -> str:
    return f"{plain(100 * loss, 2)} %" if loss >= 5e-5 else "nothing"
