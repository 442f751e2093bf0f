"""A vector for each reported path; false paths apart, and the next ones in their place."""

from __future__ import annotations

from dataclasses import replace
from itertools import islice
from typing import TYPE_CHECKING, Final

from evenstage.circuit.evaluation import outside_nets, switches
from evenstage.errors import Notice
from evenstage.logic.clauses import has_solver
from evenstage.logic.paths import PathLogic
from evenstage.timing.search import slowest_paths
from evenstage.timing.stages import describe

if TYPE_CHECKING:
    from collections.abc import Iterator

    from evenstage.circuit.circuit import Circuit
    from evenstage.logic.paths import PathVector
    from evenstage.timing.results import Analysis, Path

CONFLICTS: Final = 20_000
"""Conflicts after which the search for one path's vector is given up: some seconds."""
DEVICES_MOST: Final = 200_000
"""In larger blocks nobody looks for vectors unasked."""
FALSE_MOST: Final = 100
"""So many false paths are passed over."""


def with_vectors(
    analysis: Analysis, conflicts: int = CONFLICTS, *, replacing: bool = True
) -> Analysis:
    """Return an analysis whose paths carry their vectors, false ones replaced by the next slowest.

    Parameters
    ----------
    analysis : Analysis
        With its timing.
    conflicts : int
        After so many conflicts the search for one path is given up; 0: nothing is searched.
    replacing : bool
        Whether false paths are replaced; if not, they stay, and say that they are.
    """
    if not conflicts or analysis.timing is None:
        return analysis
    circuit = analysis.timing.circuit
    if not has_solver():
        return _noted(
            analysis,
            "no-solver",
            "no input vectors were looked for: the SAT library cannot be loaded; install "
            "python-sat, or say --conflicts 0",
        )
    if len(circuit.devices) > DEVICES_MOST:
        return _noted(
            analysis,
            "no-vectors",
            f"no input vectors were looked for: the block has more than {DEVICES_MOST} transistors",
        )
    logic = path_logic(circuit)
    kept: list[Path] = []
    false: list[Path] = []
    for path in _slowest(analysis):
        vector = logic.vector(_nets(circuit, path), conflicts)
        apart = replacing and vector.verdict == "false"
        (false if apart else kept).append(replace(path, vector=vector))
        if len(kept) == len(analysis.paths) or len(false) > FALSE_MOST:
            break
    if not kept:
        kept, false = false[: len(analysis.paths)], false[len(analysis.paths) :]
    return replace(analysis, paths=tuple(kept), false_paths=tuple(false))


def vector_of(
    logic: PathLogic, circuit: Circuit, path: Path, conflicts: int = CONFLICTS
) -> PathVector:
    """Return the vector of a path: the one it carries, else what is found of it."""
    if path.vector is not None:
        return path.vector
    return logic.vector(_nets(circuit, path), conflicts)


def standing(logic: PathLogic, circuit: Circuit, path: Path, vector: PathVector) -> dict[int, bool]:
    """Return what nets are worth that stand still while a vector lets a path switch, by id.

    Nets that the vector leaves open are left out.
    """
    held = {net: value for name, value in vector.held if (net := circuit.net_id(name)) is not None}
    return logic.standing(_nets(circuit, path), held)


def can_look(circuit: Circuit) -> bool:
    """Tell whether vectors are looked for: there is a solver, and the block is not too large."""
    return has_solver() and len(circuit.devices) <= DEVICES_MOST


def false_path_notices(analysis: Analysis) -> tuple[Notice, ...]:
    """Return a notice where the slowest path is false."""
    if analysis.timing is None or not can_look(analysis.timing.circuit):
        return ()
    circuit = analysis.timing.circuit
    path = analysis.paths[0]
    if path_logic(circuit).vector(_nets(circuit, path), CONFLICTS).verdict != "false":
        return ()
    message = (
        f"no input vector lets the slowest path switch, from '{path.start}' to '{path.end}'; the "
        "widths count it all the same, and [[ignore]] in the brief leaves it out"
    )
    return (Notice("false-path", message, names=tuple(stage.output for stage in path.stages)),)


def path_logic(circuit: Circuit) -> PathLogic:
    """Return a circuit as a block whose paths can be examined."""
    every = switches(circuit)
    return PathLogic(every, circuit.supplies.is_supply | outside_nets(circuit, every))


def _slowest(analysis: Analysis) -> Iterator[Path]:
    """Give the paths that are described already, then all further ones."""
    yield from analysis.paths
    assert analysis.timing is not None
    for arcs in islice(slowest_paths(analysis.timing), len(analysis.paths), None):
        yield describe(analysis.timing, arcs)


def _nets(circuit: Circuit, path: Path) -> tuple[tuple[int, bool], ...]:
    named = [(path.start, path.start_edge), *((s.output, s.edge) for s in path.stages)]
    found = [(circuit.net_id(name), edge == "rise") for name, edge in named]
    return tuple((net, rises) for net, rises in found if net is not None)


def _noted(analysis: Analysis, code: str, message: str) -> Analysis:
    return replace(analysis, notices=(*analysis.notices, Notice(code, message)))
