"""Results over several processes as documents."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from evenstage.report.document.shape import NUMBER, Kind, a_list, an_object, optional
from evenstage.report.document.timing import ANALYSIS, DIFFERENCE, END, NOTICES, PATHS, YARDSTICK
from evenstage.sizing.results import SizedCorners
from evenstage.timing.corners import Corners, CornersDifference, merged

if TYPE_CHECKING:
    from evenstage.report.document.shape import Document, JsonValue
    from evenstage.timing.corners import CornerEnd
    from evenstage.timing.results import Analysis


def write_corners(corners: Corners) -> Document:
    """Return a block in several processes as plain values.

    It is that of the corner of the slowest path, but for paths and ends, which are the slowest over
    all corners; ``corners`` holds each corner's own.
    """
    return ANALYSIS.write(corners.worst) | {
        "notices": NOTICES.write(corners.notices),
        "paths": PATHS.write(corners.paths),
        "ends": [_end(end, corners.names) for end in corners.ends],
        "corners": [_corner(one) | {"analysis": ANALYSIS.write(one)} for one in corners.analyses],
    }


def read_corners(document: object, place: str = "") -> Corners:
    """Return a block in several processes; raises as `Shape.read`."""
    del place
    corners = a_list(an_object(document, "").get("corners"), "corners")
    return merged(
        [
            ANALYSIS.read(an_object(one, at).get("analysis"), f"{at}.analysis")
            for at, one in ((f"corners[{index}]", one) for index, one in enumerate(corners))
        ]
    )


def write_corners_difference(difference: CornersDifference) -> Document:
    """Return two netlists in several processes as plain values.

    It is that of the corner that limits the second netlist; ``corners`` holds each corner's own.
    """
    return DIFFERENCE.write(difference.worst) | {
        "corners": [
            {
                "before": _corner(one.before),
                "after": _corner(one.after),
                "difference": DIFFERENCE.write(one),
            }
            for one in difference.differences
        ]
    }


def read_corners_difference(document: object, place: str = "") -> CornersDifference:
    """Return two netlists in several processes; raises as `Shape.read`."""
    del place
    corners = a_list(an_object(document, "").get("corners"), "corners")
    found = tuple(
        DIFFERENCE.read(an_object(one, at).get("difference"), f"{at}.difference")
        for at, one in ((f"corners[{index}]", one) for index, one in enumerate(corners))
    )
    return CornersDifference(
        before=merged([one.before for one in found]),
        after=merged([one.after for one in found]),
        differences=found,
    )


def write_sized_corners(corners: SizedCorners) -> list[JsonValue]:
    """Return a block sized for several processes, a part for each."""
    shares = corners.shares or [None] * len(corners.after.analyses)
    every = zip(corners.before.analyses, corners.after.analyses, shares, strict=True)
    return [
        {
            "before": _corner(before) | {"analysis": ANALYSIS.write(before)},
            "after": _corner(after) | {"analysis": ANALYSIS.write(after)},
            "limits": share,
        }
        for before, after, share in every
    ]


def read_sized_corners(value: object, place: str) -> SizedCorners:
    """Return a block sized for several processes; raises as `Shape.read`."""
    parts = [an_object(one, f"{place}[{k}]") for k, one in enumerate(a_list(value, place))]
    before, after = (
        merged([_analysis(one.get(when), f"{place}[{k}].{when}") for k, one in enumerate(parts)])
        for when in ("before", "after")
    )
    shares = [
        optional(NUMBER).read(one.get("limits"), f"{place}[{k}].limits")
        for k, one in enumerate(parts)
    ]
    known = tuple(share for share in shares if share is not None)
    return SizedCorners(before=before, after=after, shares=known)


SIZED_CORNERS: Final = Kind(write_sized_corners, read_sized_corners)


def _analysis(corner: object, place: str) -> Analysis:
    """Return the analysis that stands with a corner."""
    return ANALYSIS.read(an_object(corner, place).get("analysis"), f"{place}.analysis")


def _corner(analysis: Analysis) -> Document:
    return {
        "process": YARDSTICK.write(analysis.yardstick),
        "delay_s": max((end.delay for end in analysis.ends), default=None),
        "charged_delay_s": max((end.charged_delay for end in analysis.ends), default=None),
        "worst_transition_s": analysis.worst_transition,
    }


def _end(found: CornerEnd, names: tuple[str, ...]) -> Document:
    return END.write(found.end) | {
        "corner": found.corner,
        "delays_s": dict(zip(names, found.delays, strict=True)),
    }
