"""One netlist in several processes, from files to reports."""

from __future__ import annotations

import json
from dataclasses import replace
from typing import TYPE_CHECKING, Final

import pytest

from evenstage import flow
from evenstage.cli import main
from evenstage.errors import SettingsError

if TYPE_CHECKING:
    from pathlib import Path

#: Two routes to two outputs: one of three pulls up, one of many transistors in series.
BLOCK: Final = """* two outputs
.global vdd vss
.subckt inv a y wn=1u wp=2u
mn y a vss vss nch w=wn l=0.1u
mp y a vdd vdd pch w=wp l=0.1u
.ends
.subckt nand3 a b c y
mna y a n1 vss nch w=1u l=0.1u
mnb n1 b n2 vss nch w=1u l=0.1u
mnc n2 c vss vss nch w=1u l=0.1u
mpa y a vdd vdd pch w=4u l=0.1u
mpb y b vdd vdd pch w=4u l=0.1u
mpc y c vdd vdd pch w=4u l=0.1u
.ends
.subckt top a b c y z
xn a b c n nand3
xi n y inv wn=2u wp=4u
x1 a p inv wn=1u wp=0.6u
x2 p z inv wn=1u wp=2u
cy y vss 20f
cz z vss 20f
.ends
"""

TRANSISTOR: Final = """
[[transistor]]
models = "{polarity}ch"
polarity = "{polarity}"
length = "0.1u"
r_w = "{r_w}"
c_gate = "1.2n"
c_drain = "1n"
slope = 0.2
shape = 1.7
"""

#: The p transistors of one corner, the n transistors of the other are the slow ones.
CORNERS: Final = {"even": ("2m", "4m"), "slow p": ("1.6m", "7m"), "slow n": ("3.4m", "3.6m")}


@pytest.fixture
def netlist(tmp_path: Path) -> Path:
    path = tmp_path / "block.sp"
    path.write_text(BLOCK)
    return path


@pytest.fixture
def processes(tmp_path: Path) -> list[Path]:
    paths = []
    for name, (n, p) in CORNERS.items():
        tables = "".join(
            TRANSISTOR.format(polarity=kind, r_w=r_w) for kind, r_w in (("n", n), ("p", p))
        )
        path = tmp_path / f"{name.replace(' ', '_')}.toml"
        path.write_text(f'name = "{name}"\nsupply = 1.1\n{tables}')
        paths.append(path)
    return paths


@pytest.fixture
def question(processes: list[Path]) -> flow.Question:
    first, *others = processes
    return flow.Question(process=first, corners=tuple(others), count=3)


def corners(netlist: Path, question: flow.Question) -> flow.Corners:
    found = flow.analyse(netlist, question)
    assert isinstance(found, flow.Corners)
    return found


class TestAnalyse:
    def test_every_corner_is_what_it_is_alone(
        self, netlist: Path, processes: list[Path], question: flow.Question
    ) -> None:
        """Laid out once, timed in each: as if each process had been asked for alone."""
        for one, path in zip(corners(netlist, question).analyses, processes, strict=True):
            assert one == flow.analyse(netlist, flow.Question(process=path, count=3))

    def test_each_end_names_its_worst_corner(self, netlist: Path, question: flow.Question) -> None:
        found = corners(netlist, question)
        assert {end.end.net: end.corner for end in found.ends} == {"y": "slow n", "z": "slow p"}
        for end in found.ends:
            known = [delay for delay in end.delays if delay is not None]
            assert end.end.delay == max(known)
            assert len(known) == 3
        latest = [end.end.delay for end in found.ends]
        assert latest == sorted(latest, reverse=True)

    def test_paths_are_the_slowest_of_all_each_route_once(
        self, netlist: Path, question: flow.Question
    ) -> None:
        found = corners(netlist, question)
        everything = corners(netlist, replace(question, count=100))
        slowest: dict[tuple[str, ...], float] = {}
        for one in everything.analyses:
            for path in one.paths:
                route = (path.start, path.start_edge, *(s.output + s.edge for s in path.stages))
                slowest[route] = max(slowest.get(route, 0.0), path.delay)
        assert [path.delay for path in found.paths] == sorted(slowest.values(), reverse=True)[:3]
        assert found.worst.paths[0] == found.paths[0]

    def test_widths_read_otherwise_are_read_anew(
        self, netlist: Path, processes: list[Path], question: flow.Question
    ) -> None:
        text = processes[1].read_text().replace("slope", 'width_is = "finger"\nslope')
        processes[1].write_text(text)
        one = corners(netlist, question).analyses[1]
        assert one == flow.analyse(netlist, flow.Question(process=processes[1], count=3))

    def test_equal_names_are_refused(self, netlist: Path, processes: list[Path]) -> None:
        twice = flow.Question(process=processes[0], corners=(processes[0],))
        with pytest.raises(SettingsError, match="two processes are named 'even'"):
            flow.analyse(netlist, twice)

    def test_text(self, netlist: Path, question: flow.Question) -> None:
        text = flow.text(flow.analyse(netlist, question), unicode=False)
        assert "over 3 corners, " in text
        lines = [line.split() for line in text.splitlines()]
        (end,) = (line for line in lines if line[:2] == ["z", "rise"] or line[:2] == ["z", "fall"])
        assert " ".join(end[4:6]) == "slow p"
        assert "on even," in " ".join(end)

    def test_json(self, netlist: Path, question: flow.Question) -> None:
        found = corners(netlist, question)
        document = json.loads(flow.json(found))
        assert document["kind"] == "analysis"
        assert [one["process"]["name"] for one in document["corners"]] == list(CORNERS)
        assert document["paths"][0]["corner"] == found.paths[0].corner
        (z,) = (end for end in document["ends"] if end["net"] == "z")
        assert z["corner"] == "slow p"
        assert z["delays_s"]["slow p"] == z["delay_s"] > z["delays_s"]["even"]


class TestOtherCommands:
    def test_diff(self, netlist: Path, question: flow.Question) -> None:
        after = netlist.with_name("after.sp")
        after.write_text(BLOCK.replace("nch w=1u", "nch w=5u"))
        found = flow.diff(netlist, after, question)
        assert isinstance(found, flow.CornersDifference)
        assert found.before.worst.yardstick.process == "slow n"
        assert found.after.worst.yardstick.process == "slow p"
        assert found.worst.after.paths[0] == found.after.paths[0]
        text = flow.text(found, unicode=False)
        assert text.startswith("Over 3 corners the slowest path falls from ")
        document = json.loads(flow.json(found))
        delays = [one["after"]["delay_s"] for one in document["corners"]]
        assert max(delays) == document["after"]["paths"][0]["delay_s"]

    @pytest.mark.parametrize("command", ["resize", "recognise"])
    def test_the_others_take_one(
        self,
        command: str,
        netlist: Path,
        processes: list[Path],
        capsys: pytest.CaptureFixture[str],
    ) -> None:
        several = [word for path in processes for word in ("--process", str(path))]
        assert main([command, str(netlist), *several]) == 1
        assert capsys.readouterr().err == (
            f"{command} takes one process, got 3; give --process once (several-corners)\n"
        )
