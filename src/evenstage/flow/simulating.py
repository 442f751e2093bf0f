"""The slowest paths simulated, and their voltages written."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.flow.files import write_text
from evenstage.flow.loading import Question, load, one_process
from evenstage.report.document.simulation import waveform_table
from evenstage.simulation.simulate import simulate as run_simulation
from evenstage.timing.vectors import with_vectors

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.simulation.results import SideBranches, Simulation


def simulate(
    path: Path,
    question: Question,
    *,
    after: Path | None = None,
    side_branches: SideBranches = "gates",
    waveforms: Path | None = None,
) -> Simulation:
    """Simulate the slowest paths of a netlist, and of the same design after a change.

    Parameters
    ----------
    path : Path
    question : Question
    after : Path, optional
        The changed netlist.
    side_branches : {"gates", "capacitances"}
        How what hangs on the paths is simulated.
    waveforms : Path, optional
        Where the voltages are written as CSV.

    Raises
    ------
    EvenstageError
        For every mistake in the inputs, and where no path can be simulated.
    OutputError
        Where the waveforms cannot be written.
    """
    each = ", then with ".join(f"--process {one}" for one in (question.process, *question.corners))
    one_process(question, "simulate", f"run it once for each corner: with {each}")
    first = load(path, question)
    before = with_vectors(first.analysis, question.conflicts)
    changed = None
    if after is not None:
        second = load(after, question, first.process).analysis
        changed = with_vectors(second, question.conflicts)
    result = run_simulation(
        before, changed, side_branches=side_branches, conflicts=question.conflicts
    )
    if waveforms is not None:
        write_text(waveforms, waveform_table(result), force=True)
    return result
