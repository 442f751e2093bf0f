"""What a netlist holds and how fast it is: three commands that change nothing."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.circuit.inventory import Inventory, take_inventory
from evenstage.flow.files import write_text
from evenstage.flow.loading import Question, in_corners, one_process, recognised
from evenstage.report.graph_document import graph_document
from evenstage.timing.compare import compare
from evenstage.timing.corners import Corners, CornersDifference, merged
from evenstage.timing.vectors import with_vectors

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.timing.results import Analysis, Difference


def recognise(path: Path, question: Question, graph: Path | None = None) -> Inventory:
    """Find out what each group of transistors is, and write the graph of gates where asked for.

    Raises
    ------
    EvenstageError
        For every mistake in the inputs.
    OutputError
        Where the graph cannot be written.
    """
    one_process(question, "recognise")
    circuit, _, _ = recognised(path, question)
    if graph is not None:
        write_text(graph, graph_document(circuit), force=True)
    return take_inventory(circuit)


def analyse(path: Path, question: Question) -> Analysis | Corners:
    """Find the slowest paths of a netlist, over all corners asked for; raises as `load`."""
    blocks = in_corners(path, question)
    # In several corners each path stands once, with its worst: false ones stay and say so.
    analyses = [
        with_vectors(block.analysis, question.conflicts, replacing=not question.corners)
        for block in blocks
    ]
    return merged(analyses) if question.corners else analyses[0]


def diff(before: Path, after: Path, question: Question) -> Difference | CornersDifference:
    """Compare two netlists of one design, in all corners asked for; raises as `load`."""
    first = in_corners(before, question)
    second = in_corners(after, question, [block.process for block in first])
    old, new = ([block.analysis for block in blocks] for blocks in (first, second))
    differences = tuple(map(compare, old, new))
    if not question.corners:
        return differences[0]
    return CornersDifference(before=merged(old), after=merged(new), differences=differences)
