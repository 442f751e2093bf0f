"""Briefs: every key, and what is refused."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from pathlib import Path
from typing import TYPE_CHECKING

import pytest

from evenstage.brief import Brief, read_brief
from evenstage.errors import SettingsError

if TYPE_CHECKING:
    from evenstage.pattern import Pattern

FULL = """\
top = "rowdec"
supplies.high = "vdd*"
supplies.low = ["vss"]
fixed = ["xrow*.xdrv"]
leaves = ["nand3"]
transition_max = "400 ps"
coupling = 1.5
copies_per_leaf = 0
case = "exact"
aim = {delay = "1.2 ns", width = 1.25, spend = "energy"}

[[input]]
nets = ["a<*>"]
arrival = "-10 ps"
transition = 60e-12
drive = "1.5 kohm"
capacitance_max = "12 fF"

[[input]]
nets = "en"
capacitance_max = "as drawn"

[[output]]
nets = ["wl<*>"]
load = "85fF"
required = 1e-9

[[ignore]]
from = "scan*"
to = "q"

[[same_size]]
cards = ["xa", "xb"]

[[limit]]
cards = "xrow*"
width_min = "0.3 um"
width_max = 12e-6
"""

Read = Callable[[str], Brief]


@pytest.fixture
def read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Read:
    monkeypatch.chdir(tmp_path)

    def reader(text: str) -> Brief:
        Path("b.toml").write_bytes(text.encode())
        return read_brief("b.toml")

    return reader


def texts(patterns: Iterable[Pattern]) -> list[str]:
    return [pattern.text for pattern in patterns]


SAMPLES = sorted((Path(__file__).parents[1] / "sample_netlists").glob("*/brief.toml"))


class TestReadBrief:
    @pytest.mark.parametrize("path", SAMPLES, ids=lambda path: path.parent.name)
    def test_samples(self, path: Path) -> None:
        brief = read_brief(path)
        assert brief.inputs
        assert all(output.load for output in brief.outputs)

    def test_an_empty_brief_says_nothing(self, read: Read) -> None:
        brief = read("")
        assert brief == Brief(source=brief.source)

    def test_whole_block(self, read: Read) -> None:
        brief = read(FULL)
        assert brief.top == "rowdec"
        assert texts(brief.supplies_high + brief.supplies_low) == ["vdd*", "vss"]
        assert texts(brief.fixed + brief.leaves) == ["xrow*.xdrv", "nand3"]
        assert [texts(group) for group in brief.same_size] == [["xa", "xb"]]
        assert (brief.transition_max, brief.coupling) == (400e-12, 1.5)
        assert brief.copies_per_leaf == 0
        assert brief.case == "exact"
        assert (brief.aim_delay, brief.aim_width, brief.aim_spend) == (1.2e-9, 1.25, "energy")

    def test_inputs_and_outputs(self, read: Read) -> None:
        brief = read(FULL)
        address, enable = brief.inputs
        assert (address.arrival, address.transition, address.drive) == (-10e-12, 60e-12, 1500.0)
        assert address.capacitance_max == 12e-15
        assert (enable.arrival, enable.transition, enable.drive) == (0.0, None, 0.0)
        assert enable.capacitance_max is None
        assert [(o.load, o.required) for o in brief.outputs] == [(85e-15, 1e-9)]

    def test_ignored_paths_and_limits(self, read: Read) -> None:
        brief = read(FULL)
        (ignored,) = brief.ignores
        ends = [texts(p) for p in (ignored.start, ignored.through, ignored.end)]
        assert ends == [["scan*"], [], ["q"]]
        assert [(x.width_min, x.width_max) for x in brief.limits] == [(0.3e-6, 12e-6)]

    def test_patterns_keep_their_place(self, read: Read) -> None:
        brief = read(FULL)
        assert brief.fixed[0].span is not None
        assert brief.fixed[0].span.place == "b.toml:4:11"

    @pytest.mark.parametrize(
        ("text", "message"),
        [
            (
                "[[ignore]]",
                (
                    "b.toml:1:1: [[ignore]] needs from, through or to (empty-table)\n"
                    "    [[ignore]]\n"
                    "    ^^^^^^^^^^"
                ),
            ),
            (
                '[[limit]]\ncards = "x"',
                (
                    "b.toml:1:1: [[limit]] needs width_min or width_max (empty-table)\n"
                    "    [[limit]]\n"
                    "    ^^^^^^^^^"
                ),
            ),
            (
                '[[limit]]\ncards = "x"\nwidth_min = 2e-6\nwidth_max = 1e-6',
                (
                    "b.toml:4:13: width_max is below width_min (limits-crossed)\n"
                    "    width_max = 1e-6\n"
                    "                ^^^^"
                ),
            ),
            (
                '[[input]]\nnets = "a"\narrival = 20',
                (
                    "b.toml:3:11: input.arrival must be at least -1 ms and at most 1 ms, got 20 s"
                    " (out-of-range)\n"
                    "    arrival = 20\n"
                    "              ^^"
                ),
            ),
            (
                "supply.high = 'vdd'",
                (
                    "b.toml:1:1: unknown key supply; the nearest known one is supplies"
                    " (unknown-key)\n"
                    "    supply.high = 'vdd'\n"
                    "    ^^^^^^^^^^^\n"
                    "known here: top, supplies, input, output, clock, ignore, fixed, leaves,"
                    " same_size, limit, transition_max, coupling, copies_per_leaf, aim, pulls,"
                    " skew, case, first_line"
                ),
            ),
            (
                "aim.delay = 0",
                (
                    "b.toml:1:13: aim.delay must be above 0 s and at most 1 ms, got 0 s"
                    " (out-of-range)\n"
                    "    aim.delay = 0\n"
                    "                ^"
                ),
            ),
        ],
    )
    def test_whole_message(self, read: Read, text: str, message: str) -> None:
        with pytest.raises(SettingsError) as caught:
            read(text)
        assert str(caught.value) == message
