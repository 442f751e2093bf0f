"""What each part of the delay model buys, and where it is farthest off.

Run ``PYTHONPATH=src:tests python tests/benchmarks/bench_accuracy.py``, with names of libraries or
for all, and the open cell data beside the checkout (see `support.open_timing`); some ten minutes.
Each row is a fit of its own to the calibration cells, with one part of the model switched off,
judged on all other cells. Then come the arcs with the largest errors, each at its worst point.
"""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np

from support.accuracy import LIBRARIES, Figures, judge

if TYPE_CHECKING:
    from collections.abc import Iterator, Mapping

    from evenstage.fitting.measurements import Query
    from support.accuracy import Judged

#: The constants that switch parts of the model off.
PARTS: Final[Mapping[str, Mapping[str, float]]] = {
    "the whole model": {},
    "constant resistances and capacitances": {
        "r_fixed": 0.0,
        "c_drain_fixed": 0.0,
        "c_gate_fixed": 0.0,
    },
    "stack factors": {"stack": 1.0},
    "stacks apart in slopes and transitions": {"slope_stack": 1.0, "shape_stack": 1.0},
    "the power of slopes": {"slope_power": 1.0},
    "transitions carried on": {"shape_carry": 0.0},
    "weak levels": {"weak_swing": 1.0},
    "shared diffusion": {"drain_shared": 1.0, "drain_inner": 1.0},
}

_WORST: Final = 10


class WorstPoint(NamedTuple):
    """The worst point of an arc: error as part of one, transition (s) and load (F)."""

    query: Query
    error: float
    transition: float
    load: float
    stages: int


def row(name: str, found: Figures) -> str:
    """Return one line of the table."""
    pairs = "".join(f"{a:7.1f} /{b:5.1f}" for a, b in (found.one, found.several, found.paths))
    return f"{name:<42}{pairs}{found.chains:7.1f}{found.order[0]:8.3f}{found.order[1]:7.3f}"


def worst_points(judged: Judged, count: int = _WORST) -> Iterator[WorstPoint]:
    """Yield the arcs with the largest errors."""
    rows, inside = judged.rows, np.flatnonzero(judged.inside)
    error = judged.predicted.delay[inside] / rows.delay[inside] - 1
    met = set[int]()
    for place in np.argsort(-np.abs(error), kind="stable"):
        point = inside[place]
        query = int(rows.query[point])
        if query not in met and len(met) < count:
            met.add(query)
            yield WorstPoint(
                judged.queries[query],
                float(error[place]),
                float(rows.transition[point]),
                float(rows.load[point]),
                int(judged.graphs[query].level.max()),
            )


def main() -> None:
    """Print the tables."""
    out = sys.stdout.write
    with tempfile.TemporaryDirectory() as folder:
        for library in sys.argv[1:] or LIBRARIES:
            out(
                f"{library}: median / 95th percentile of errors in percent, of arcs of one stage, "
                "of several, of paths; largest of chains; rank correlations of both kinds\n"
            )
            for name, given in PARTS.items():
                judged = judge(library, Path(folder), given)
                out(row(name if not given else f"without {name}", judged.figures()) + "\n")
                sys.stdout.flush()
                if not given:
                    whole = judged
            out("the arcs farthest off\n")
            for one in worst_points(whole):
                edge = "rise" if one.query.rising else "fall"
                arc = f"{whole.library.short(one.query.subcircuit)} {one.query.input} {edge}"
                out(
                    f"{arc:<24}{100 * one.error:+6.0f} %  {one.stages} stages"
                    f"{one.transition * 1e12:7.0f} ps{one.load * 1e15:8.1f} fF\n"
                )


if __name__ == "__main__":
    main()
