"""What each part of the delay model buys, and where it is farthest off.

Run ``PYTHONPATH=src:tests python tests/benchmarks/bench_accuracy.py``, with names of libraries or
for all, and the open cell data beside the checkout (see `support.open_timing`); some ten minutes.
Each row is a fit of its own to the calibration cells, with one part of the model switched off,
judged on all other cells. Then come the arcs with the largest errors, each at its worst point; the
reasons stand in `tests/reference/test_accuracy.py`. ``pytest -m benchmark`` on this file holds the
table against `BOUGHT`.
"""

from __future__ import annotations

import sys
import tempfile
from pathlib import Path
from typing import TYPE_CHECKING, Final

import pytest
from numpy.testing import assert_allclose

from support.accuracy import LIBRARIES, Figures, judge, worst_points

if TYPE_CHECKING:
    from collections.abc import Mapping

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

#: What is reached without each part, by the command above: medians and 95th percentiles of arcs of
#: one stage, of several, and of paths; the largest of chains; rank correlations.
BOUGHT: Final[Mapping[str, Mapping[str, Figures]]] = {
    "ihp_sg13g2": {
        "the whole model": Figures((3.2, 10.6), (2.5, 7.2), (2.3, 6.5), 5.7, (0.991, 0.994)),
        "constant resistances and capacitances": Figures(
            (2.7, 10.4), (2.3, 6.6), (2.1, 6.8), 7.0, (0.991, 0.995)
        ),
        "stack factors": Figures((3.4, 13.9), (2.7, 9.3), (4.3, 9.4), 5.9, (0.990, 0.994)),
        "stacks apart in slopes and transitions": Figures(
            (5.1, 25.4), (3.0, 13.7), (7.0, 13.3), 6.2, (0.991, 0.992)
        ),
        "the power of slopes": Figures((9.0, 19.5), (4.5, 9.5), (2.6, 11.8), 4.7, (0.981, 0.984)),
        "transitions carried on": Figures(
            (7.4, 16.5), (7.0, 20.5), (4.8, 15.4), 11.6, (0.987, 0.967)
        ),
        "weak levels": Figures((3.0, 11.4), (2.6, 7.6), (2.7, 7.2), 6.2, (0.992, 0.993)),
        "shared diffusion": Figures((3.4, 12.0), (2.5, 7.3), (2.0, 6.4), 3.1, (0.990, 0.987)),
    },
    "gf180_7t": {
        "the whole model": Figures((4.0, 12.1), (4.8, 13.9), (2.4, 6.9), 5.5, (0.994, 0.991)),
        "constant resistances and capacitances": Figures(
            (4.3, 12.5), (5.0, 14.6), (2.7, 8.3), 2.9, (0.993, 0.987)
        ),
        "stack factors": Figures((4.4, 14.2), (6.1, 18.7), (3.4, 8.5), 6.4, (0.985, 0.989)),
        "stacks apart in slopes and transitions": Figures(
            (4.8, 12.9), (4.3, 12.5), (2.1, 6.5), 6.0, (0.994, 0.991)
        ),
        "the power of slopes": Figures((4.8, 15.2), (4.3, 15.2), (2.6, 9.6), 8.5, (0.993, 0.991)),
        "transitions carried on": Figures(
            (4.4, 12.7), (4.6, 14.2), (2.3, 6.4), 5.0, (0.993, 0.990)
        ),
        "weak levels": Figures((4.0, 12.1), (4.8, 13.9), (2.4, 6.9), 5.5, (0.994, 0.991)),
        "shared diffusion": Figures((3.8, 13.0), (5.9, 16.4), (2.9, 7.8), 7.1, (0.993, 0.990)),
    },
}


def row(name: str, found: Figures) -> str:
    """Return one line of the table."""
    pairs = "".join(f"{a:7.1f} /{b:5.1f}" for a, b in (found.one, found.several, found.paths))
    return f"{name:<42}{pairs}{found.chains:7.1f}{found.order[0]:8.3f}{found.order[1]:7.3f}"


@pytest.mark.benchmark
@pytest.mark.parametrize("library", LIBRARIES)
def test_the_table_is_what_is_found(library: str, tmp_path: Path) -> None:
    for part, known in BOUGHT[library].items():
        found = judge(library, tmp_path, PARTS[part]).figures()
        for kind in ("one", "several", "paths", "chains"):
            assert_allclose(getattr(found, kind), getattr(known, kind), rtol=0.1, atol=0.1)
        assert_allclose(found.order, known.order, rtol=0, atol=0.003)


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
                out(
                    f"{one.name:<24}{100 * one.error:+6.0f} %  {one.stages} stages"
                    f"{one.transition * 1e12:7.0f} ps{one.load * 1e15:8.1f} fF\n"
                )


if __name__ == "__main__":
    main()
