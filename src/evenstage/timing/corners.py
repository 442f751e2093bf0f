"""One block in several processes: its slowest paths over all of them.

Each corner is analysed by itself. Of a route that is among the slowest in several corners the
slowest one is kept; as each corner lists as many paths as are wanted, none of the slowest over all
corners can be missing.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from evenstage.errors import SettingsError
from evenstage.tabular import Row, Tabular, row
from evenstage.units import engineering

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.errors import Notice
    from evenstage.timing.results import Analysis, Difference, Path, PathEnd


@dataclass(frozen=True, slots=True, kw_only=True)
class CornerEnd:
    """A path end in the corner where it is latest.

    Parameters
    ----------
    end : PathEnd
        In that corner.
    corner : str
        Its name.
    delays : tuple of float or None
        Arrival in each corner, s; None where no path reaches the end.
    """

    end: PathEnd
    corner: str
    delays: tuple[float | None, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Corners(Tabular):
    """A block in several processes.

    Parameters
    ----------
    analyses : tuple of Analysis
        One for each corner, in the order asked for.
    paths : tuple of Path
        The slowest over all corners, slowest first; each in the corner where it is slowest.
    ends : tuple of CornerEnd
        Latest first.
    """

    analyses: tuple[Analysis, ...]
    paths: tuple[Path, ...]
    ends: tuple[CornerEnd, ...]

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the corners."""
        return tuple(one.yardstick.process for one in self.analyses)

    @property
    def worst(self) -> Analysis:
        """The corner of the slowest path."""
        return self.corner_of(self.paths[0])

    def corner_of(self, path: Path) -> Analysis:
        """Return the corner a path was timed in."""
        return self.analyses[self.names.index(path.corner)]

    @property
    def notices(self) -> tuple[Notice, ...]:
        """What was assumed in any corner, each once."""
        return tuple(dict.fromkeys(n for one in self.analyses for n in one.notices))

    @property
    def headline(self) -> str:
        """The slowest path over all corners, in one line."""
        return f"{self.worst.headline} in {self.worst.yardstick.process}"

    def tables(self) -> dict[str, list[Row]]:
        """Return the slowest paths, and each path end with its arrival in every corner; SI units.

        Paths are numbered from 1.
        """
        return {
            "paths": [row(path, path=number) for number, path in enumerate(self.paths, 1)],
            "ends": [
                row(one.end, corner=one.corner)
                | {
                    f"{name} arrival": delay
                    for name, delay in zip(self.names, one.delays, strict=True)
                }
                for one in self.ends
            ],
        }


@dataclass(frozen=True, slots=True, kw_only=True)
class CornersDifference(Tabular):
    """Two netlists of one design side by side in several processes.

    Parameters
    ----------
    before, after : Corners
    differences : tuple of Difference
        One for each corner.
    """

    before: Corners
    after: Corners
    differences: tuple[Difference, ...]

    @property
    def worst(self) -> Difference:
        """The difference in the corner that limits the second netlist."""
        return self.differences[self.after.names.index(self.after.worst.yardstick.process)]

    @property
    def headline(self) -> str:
        """Both slowest paths over all corners, in one line."""
        old, new = self.before.paths[0].delay, self.after.paths[0].delay
        return f"{engineering(old, 's')} before, {engineering(new, 's')} after, over all corners"

    def tables(self) -> dict[str, list[Row]]:
        """Return the widths that differ, and the worst delay of each corner; SI units."""
        corners: list[Row] = [
            {
                "corner": one.before.yardstick.process,
                "delay_before": max((end.delay for end in one.before.ends), default=None),
                "delay_after": max((end.delay for end in one.after.ends), default=None),
            }
            for one in self.differences
        ]
        return {"widths": self.worst.tables()["widths"], "corners": corners}


def merged(analyses: Sequence[Analysis]) -> Corners:
    """Rank the paths and path ends of one block over several corners.

    Parameters
    ----------
    analyses : sequence of Analysis
        At least one; equal brief and question.

    Raises
    ------
    SettingsError
        Where two corners have one name.
    """
    names = [one.yardstick.process for one in analyses]
    twice = next((name for name in names if names.count(name) > 1), None)
    if twice is not None:
        raise SettingsError(
            f"two processes are named '{twice}'; give each corner a name of its own",
            code="corner-repeated",
        )
    required = [end.required for one in analyses for end in one.ends]
    latest = max((time for time in required if time is not None), default=0.0)
    count = max(len(one.paths) for one in analyses)
    routes: dict[object, Path] = {}
    for path in sorted(
        (path for one in analyses for path in one.paths),
        key=lambda path: -lateness(path, latest),
    ):
        routes.setdefault(_route(path), path)
    return Corners(
        analyses=tuple(analyses),
        paths=tuple(routes.values())[:count],
        ends=tuple(sorted(_ends(analyses, latest), key=lambda one: -lateness(one.end, latest))),
    )


def lateness(what: Path | PathEnd, latest: float) -> float:
    """Return how late an arrival is, s, its required time counted against the ``latest`` one, s."""
    return what.delay + (latest - what.required if what.required is not None else 0.0)


def _route(path: Path) -> object:
    steps = tuple((stage.instance, stage.input, stage.output, stage.edge) for stage in path.stages)
    return path.start, path.start_edge, path.end, path.edge, steps


def _ends(analyses: Sequence[Analysis], latest: float) -> Iterator[CornerEnd]:
    """Give each path end in its worst corner, in the order in which the corners name them."""
    found: dict[str, list[PathEnd | None]] = {}
    for index, one in enumerate(analyses):
        for end in one.ends:
            found.setdefault(end.net, [None] * len(analyses))[index] = end
    for ends in found.values():
        known = [(index, end) for index, end in enumerate(ends) if end is not None]
        index, worst = max(known, key=lambda pair: (lateness(pair[1], latest), -pair[0]))
        yield CornerEnd(
            end=worst,
            corner=analyses[index].yardstick.process,
            delays=tuple(None if end is None else end.delay for end in ends),
        )
