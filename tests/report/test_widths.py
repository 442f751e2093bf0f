"""Every sample's reports keep to the columns there are, and to ASCII where that is wanted."""

from __future__ import annotations

from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Final

import pytest

from evenstage import flow

if TYPE_CHECKING:
    from collections.abc import Callable

SAMPLES: Final = Path(__file__).parents[2] / "sample_netlists"
NAMES: Final = sorted(path.name for path in SAMPLES.iterdir())

#: All that say something about one netlist.
COMMANDS: Final[dict[str, Callable[[Path, flow.Question], flow.Result]]] = {
    "analyse": flow.analyse,
    "resize": flow.resize,
    "diff": lambda path, question: flow.diff(path, path, question),
    "recognise": flow.recognise,
    "simulate": flow.simulate,
}


@cache
def result(command: str, sample: str) -> flow.Result:
    folder = SAMPLES / sample
    question = flow.Question(process=folder / "process.toml", brief=folder / "brief.toml", count=3)
    return COMMANDS[command](folder / "netlist.sp", question)


#: Samples that are simulated in a second.
QUICK: Final = ("bus_mux", "pad_predriver", "row_decoder")


@pytest.mark.parametrize(
    ("command", "sample"),
    [(c, s) for c in COMMANDS for s in NAMES if c != "simulate" or s in QUICK],
)
def test_reports_keep_to_the_columns(command: str, sample: str) -> None:
    found = result(command, sample)
    for width in (80, 100, 160):
        for unicode in (True, False):
            report = flow.text(found, width=width, unicode=unicode)
            long = [line for line in report.splitlines() if len(line) > width]
            assert long == [], (width, unicode)
            assert unicode or report.isascii() or not str(found).isascii()
            assert not any(line != line.rstrip() for line in report.splitlines())
