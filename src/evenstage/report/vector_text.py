"""What makes a path switch, in words; and the paths that nothing does."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.words import counted, labelled, route
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Sequence

    from evenstage.report.paper import Paper
    from evenstage.timing.results import Path

#: False paths told one by one.
_SHOWN: Final = 5


def vector_lines(paper: Paper, path: Path) -> list[str]:
    """Return the vector of a path as lines; none where nobody looked for it."""
    words = vector_words(path)
    return labelled(paper, "vector", words) if words else []


def vector_words(path: Path) -> str:
    """Return the vector of a path in words; empty where nobody looked for it."""
    if path.vector is None:
        return ""
    edge = f"{path.start} {'0 to 1' if path.start_edge == 'rise' else '1 to 0'}"
    if path.vector.verdict == "switches":
        held = ", ".join(f"{name} = {int(level)}" for name, level in path.vector.held)
        return f"{edge} with {held}" if held else f"{edge}, whatever the other inputs"
    if path.vector.verdict == "false":
        return "none: the path is false, no input vector lets it switch"
    if path.vector.verdict == "together":
        return f"none for {edge} alone; the path may switch together with others"
    return f"not known: {path.vector.reason}"


def false_lines(paper: Paper, paths: Sequence[Path]) -> list[str]:
    """Return the false paths that were passed over, a line each."""
    lines = []
    for path in paths[:_SHOWN]:
        lines += paper.paragraph(f"{route(path)}, {engineering(path.delay, 's')}", indent=2)
    if len(paths) > _SHOWN:
        lines += paper.paragraph(f"and {counted(len(paths) - _SHOWN, 'other')}", indent=2)
    return lines
