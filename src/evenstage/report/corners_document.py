"""Results over several processes as documents for scripts."""

from __future__ import annotations

from typing import TYPE_CHECKING

from evenstage.report.machine import (
    analysis_document,
    difference_document,
    end_document,
    notice_document,
    path_document,
    yardstick_document,
)

if TYPE_CHECKING:
    from evenstage.report.circuit_document import Document
    from evenstage.timing.corners import CornerEnd, Corners, CornersDifference
    from evenstage.timing.results import Analysis


def corners_document(corners: Corners) -> Document:
    """Return a block in several processes as the document scripts read.

    It is that of the corner of the slowest path, but for paths and ends, which are the slowest over
    all corners; ``corners`` names them.

    Parameters
    ----------
    corners : Corners

    Returns
    -------
    dict
        Plain values only; ``kind`` is ``analysis``.
    """
    return analysis_document(corners.worst) | {
        "notices": [notice_document(notice) for notice in corners.notices],
        "paths": [path_document(path) for path in corners.paths],
        "ends": [_end(end, corners.names) for end in corners.ends],
        "corners": [_corner(one) for one in corners.analyses],
    }


def corners_difference_document(difference: CornersDifference) -> Document:
    """Return two netlists in several processes as the document scripts read.

    It is that of the corner that limits the second netlist; ``corners`` holds the others' delays.

    Parameters
    ----------
    difference : CornersDifference

    Returns
    -------
    dict
        Plain values only; ``kind`` is ``difference``.
    """
    return difference_document(difference.worst) | {
        "corners": [
            {"before": _corner(one.before), "after": _corner(one.after)}
            for one in difference.differences
        ]
    }


def _corner(analysis: Analysis) -> Document:
    return {
        "process": yardstick_document(analysis.yardstick),
        "delay_s": max((end.delay for end in analysis.ends), default=None),
        "charged_delay_s": max((end.charged_delay for end in analysis.ends), default=None),
        "worst_transition_s": analysis.worst_transition,
    }


def _end(found: CornerEnd, names: tuple[str, ...]) -> Document:
    return end_document(found.end) | {
        "corner": found.corner,
        "delays_s": dict(zip(names, found.delays, strict=True)),
    }
