"""Small phrases that several reports share."""

from __future__ import annotations

from itertools import accumulate, pairwise
from typing import TYPE_CHECKING, Final

from evenstage.report.scale import percent, plain
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.paper import Paper
    from evenstage.timing.results import Analysis, Edge, Path, Yardstick

#: Cells for the label of a paragraph.
_MARGIN: Final = 12

#: Arrivals at least this share of the latest are the latest but for rounding.
_SAME: Final = 1 - 1e-9

RISING: Final[dict[Edge, str]] = {"rise": "rising", "fall": "falling"}


def counted(number: int, one: str, many: str = "") -> str:
    """Return a number with its noun: ``1 stage``, ``6 stages``, ``no stages``."""
    if number == 1:
        return f"1 {one}"
    return f"{number or 'no'} {many or one + 's'}"


def block_name(analysis: Analysis) -> str:
    """Return which block of which file is meant."""
    return f"{analysis.source}, {f'block {analysis.top}' if analysis.top else 'top level'}"


def rank(analysis: Analysis) -> str:
    """Return what the first path is: where some are required early it need not be the slowest."""
    latest = max((end.delay for end in analysis.ends), default=0.0)
    return "most urgent" if analysis.paths[0].delay < _SAME * latest else "slowest"


def route(path: Path) -> str:
    """Return where a path leads, as in ``a3 falling to wl[63] rising``."""
    start = f"{path.start} {RISING[path.start_edge]}"
    return f"{start} to {path.end} {RISING[path.edge]}"


def duration(path: Path) -> float:
    """Return the time from the switching of a path's input to the arrival at its end, s."""
    return path.delay - path.start_arrival


def switching(path: Path) -> list[tuple[float, float]]:
    """Return from when to when each stage of a path switches, s, in the path's own arrivals."""
    delays = (stage.delay for stage in path.stages)
    return list(pairwise(accumulate(delays, initial=path.start_arrival)))


def takes(path: Path, yardstick: Yardstick) -> str:
    """Return how long a path takes and through how many stages."""
    time = duration(path)
    corner = f" (corner {path.corner})" if path.corner not in {"", yardstick.process} else ""
    return (
        f"takes {engineering(time, 's')}, {plain(time / yardstick.fo4, 1)} FO4, "
        f"through {counted(len(path.stages), 'stage')}{corner}"
    )


def same_route(one: Path, other: Path) -> bool:
    """Whether two paths lead through the same gates with the same edges."""
    return _steps(one) == _steps(other)


def _steps(path: Path) -> tuple[object, ...]:
    stages = tuple((stage.instance, stage.output, stage.edge) for stage in path.stages)
    return path.start, path.start_edge, path.end, path.edge, stages


def moves(before: float, after: float) -> str:
    """Return how a time moves, as in ``falls from 612 ps to 455 ps (-26 %)``."""
    if before == after:
        return f"stays at {engineering(before, 's')}"
    verb = "falls" if after < before else "rises"
    change = percent(before, after)
    was, now = engineering(before, "s"), engineering(after, "s")
    if was == now:
        return f"{verb} by {engineering(abs(after - before), 's')} to {now} ({change})"
    return f"{verb} from {was} to {now} ({change})"


def punctuality(delay: float, required: float) -> str:
    """Return how late or early an arrival is, as in ``62 ps late``."""
    if delay == required:
        return "just in time"
    word = "late" if delay > required else "early"
    return f"{engineering(abs(delay - required), 's')} {word}"


def listed(names: Sequence[str], most: int) -> str:
    """Return the first names and the number of the others."""
    shown = ", ".join(names[:most])
    return shown if len(names) <= most else f"{shown} and {len(names) - most} more"


def section(title: str, lines: Sequence[str]) -> list[str]:
    """Return a blank line, a title and the lines under it; nothing if there are none."""
    return ["", title, *lines] if lines else []


def labelled(paper: Paper, label: str, text: str) -> list[str]:
    """Return a paragraph with a label in its margin."""
    first, *rest = paper.paragraph(text, indent=_MARGIN)
    return [(f"  {label}".ljust(_MARGIN) + first[_MARGIN:]).rstrip(), *rest]


def both_names(paper: Paper, before: Analysis, after: Analysis) -> list[str]:
    """Return which blocks of which files are compared."""
    labels = (("before", before), ("after", after))
    return [line for label, one in labels for line in labelled(paper, label, block_name(one))]
