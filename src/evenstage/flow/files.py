"""Files that a command writes, and where its result comes from."""

from __future__ import annotations

import hashlib
from typing import TYPE_CHECKING

from evenstage.errors import OutputError
from evenstage.fitting.results import Fit
from evenstage.netlist.rewriting.output import write_files
from evenstage.report.origin import FileDigest, Origin
from evenstage.simulation.results import Simulation
from evenstage.sizing.results import Sizing
from evenstage.timing.corners import Corners, CornersDifference
from evenstage.timing.results import Analysis, Difference

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence
    from pathlib import Path

    from evenstage.report.document.convert import Result


def write_text(path: Path, content: str, *, force: bool) -> None:
    """Write a report as a file, whole or not at all.

    Raises
    ------
    OutputError
        Where it exists (without ``force``) or cannot be written.
    """
    write_files({path: content.encode("utf-8", "surrogateescape")}, force=force)


def refuse_existing(output: Path | None, *, force: bool) -> None:
    """Refuse at once what could not be written in the end.

    Raises
    ------
    OutputError
        Where the output exists.
    """
    if output is not None and output.exists() and not force:
        raise OutputError(
            f"'{output}' exists; choose another name, or say --force to overwrite it",
            code="output-exists",
        )


def origin(version: str, arguments: Sequence[str], files: Iterable[Path], result: Result) -> Origin:
    """Return where a result comes from, with the digests of all files that are there.

    Parameters
    ----------
    version : str
    arguments : sequence of str
        Of the command line.
    files : iterable of Path
        Named there, read or written.
    result : Result
        Names the files that netlists include, and the process.
    """
    blocks = [analysis.timing.circuit for analysis in _analyses(result) if analysis.timing]
    process = result.process if isinstance(result, Fit) else blocks[-1].process if blocks else None
    known = {path.resolve(): (str(path), path.read_bytes()) for path in files if path.is_file()}
    for circuit in blocks:
        for source in circuit.devices.netlist.sources:
            known.setdefault(source.path, (source.label, source.data))
    digests = tuple(
        FileDigest(label, hashlib.sha256(data).hexdigest()) for label, data in known.values()
    )
    return Origin(version, tuple(arguments), digests, process)


def _analyses(result: Result) -> tuple[Analysis, ...]:
    """Return the analyses that a result holds, the one that its page is about last."""
    if isinstance(result, Analysis):
        return (result,)
    if isinstance(result, Corners):
        return (*result.analyses, result.worst)
    if isinstance(result, Sizing | Difference):
        return (result.before, result.after)
    if isinstance(result, CornersDifference):
        return (*result.before.analyses, result.after.worst)
    if isinstance(result, Simulation):
        return tuple(block.analysis for block in (result.before, result.after) if block)
    return ()
