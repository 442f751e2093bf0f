"""One netlist in several processes, from files to reports."""

from __future__ import annotations

import json
from dataclasses import replace
from typing import TYPE_CHECKING, Final

import pytest

from evenstage import flow
from evenstage.cli import main
from evenstage.errors import InfeasibleError, SettingsError

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


def resized(netlist: Path, question: flow.Question, margin: float = 0.0) -> flow.Sizing:
    return flow.resize(netlist, question, flow.Wishes(margin=margin, scope="block"))


class TestResize:
    def test_one_set_of_widths_serves_every_corner(
        self, netlist: Path, question: flow.Question, tmp_path: Path
    ) -> None:
        """Each corner of the written netlist, analysed alone, is as the report says."""
        output = tmp_path / "out.sp"
        wishes = flow.Wishes(margin=0, scope="block")
        found = flow.resize(netlist, question, wishes, output)
        assert found.corners is not None
        assert found.changes
        again = corners(output, question)
        for told, read in zip(found.corners.after.analyses, again.analyses, strict=True):
            assert told.paths[0].delay == pytest.approx(read.paths[0].delay, rel=1e-9)
            assert told.worst_transition == pytest.approx(read.worst_transition, rel=1e-9)
        assert found.after.paths[0] == found.corners.after.paths[0]
        assert sum(found.corners.shares) == pytest.approx(1)

    def test_the_worst_corner_is_no_faster_than_it_can_be_alone(
        self, netlist: Path, processes: list[Path], question: flow.Question
    ) -> None:
        joint = resized(netlist, question)
        alone = [resized(netlist, flow.Question(process=path)).bound for path in processes]
        assert joint.bound >= max(alone) * (1 - 1e-6)
        assert joint.gap < 1e-6

    def test_a_wished_delay_holds_in_every_corner(
        self, netlist: Path, question: flow.Question
    ) -> None:
        today = corners(netlist, question).paths[0].delay
        found = flow.resize(netlist, question, flow.Wishes(delay=0.95 * today))
        assert found.corners is not None
        assert all(one.paths[0].delay <= 0.95 * today for one in found.corners.after.analyses)
        assert found.corners.after.paths[0].delay > 0.9 * today

    def test_a_delay_out_of_reach_names_the_corner(
        self, netlist: Path, question: flow.Question
    ) -> None:
        with pytest.raises(InfeasibleError, match=r"the least possible .* in slow n, .* more"):
            flow.resize(netlist, question, flow.Wishes(delay=100e-12))

    def test_no_input_and_no_edge_gets_worse_in_any_corner(
        self, netlist: Path, question: flow.Question
    ) -> None:
        found = resized(netlist, question)
        assert found.corners is not None
        both = zip(found.corners.before.analyses, found.corners.after.analyses, strict=True)
        for before, after in both:
            assert after.worst_transition <= before.worst_transition * (1 + 1e-6)
            allowed = dict(before.input_caps)
            assert all(cap <= allowed[net] * (1 + 1e-6) for net, cap in after.input_caps)

    def test_again_there_is_nothing_to_do(
        self, netlist: Path, question: flow.Question, tmp_path: Path
    ) -> None:
        first, second = tmp_path / "first.sp", tmp_path / "second.sp"
        flow.resize(netlist, question, None, first)
        found = flow.resize(first, question, None, second)
        assert found.already_done
        assert second.read_bytes() == first.read_bytes()
        assert found.corners is not None
        assert "limits" not in flow.text(found).split("How good")[0]

    def test_later_runs_keep_what_each_corner_kept(
        self, netlist: Path, processes: list[Path], question: flow.Question, tmp_path: Path
    ) -> None:
        """In another order, or in one corner alone, the limits as first drawn count."""
        first = tmp_path / "first.sp"
        flow.resize(netlist, question, flow.Wishes(margin=0.3), first)
        turned = flow.Question(process=processes[2], corners=(processes[0], processes[1]))
        kept = {
            one.yardstick.process: limits
            for one, limits in zip(
                corners(netlist, question).analyses, resized(netlist, question).kept, strict=True
            )
        }
        later = resized(first, turned)
        assert later.corners is not None
        for name, limits in zip(later.corners.after.names, later.kept, strict=True):
            assert limits.ceilings == pytest.approx(kept[name].ceilings)
            assert limits.transition == pytest.approx(kept[name].transition)
        (alone,) = resized(first, flow.Question(process=processes[1])).kept
        assert alone.transition == pytest.approx(kept["slow p"].transition)

    def test_text_and_json_and_page(self, netlist: Path, question: flow.Question) -> None:
        found = resized(netlist, question)
        text = flow.text(found, unicode=False)
        assert "The slowest path over 3 corners falls from " in text
        assert "in slow n before and after" in text
        document = json.loads(flow.json(found))
        assert [one["after"]["process"]["name"] for one in document["corners"]] == list(CORNERS)
        latest = max(one["after"]["delay_s"] for one in document["corners"])
        assert document["after"]["paths"][0]["delay_s"] == latest
        page = flow.html(found, flow.origin("0", [], [], found))
        assert "The latest path in each corner" in page

    def test_a_curve_and_few_changes_count_the_worst_corner(
        self, netlist: Path, question: flow.Question
    ) -> None:
        found = flow.resize(netlist, question, flow.Wishes(changes=1, margin=0), curve=True)
        assert found.corners is not None
        assert found.trade_off is not None
        assert found.few is not None
        today = max(end.charged_delay for one in found.corners.before.analyses for end in one.ends)
        assert found.trade_off.today_charged_delay == pytest.approx(today)
        assert found.few.today_charged_delay == pytest.approx(today)
        assert len({change.instance for change in found.changes}) <= 1

    def test_corners_that_draw_widths_differently_are_refused(
        self, netlist: Path, processes: list[Path], question: flow.Question
    ) -> None:
        text = processes[1].read_text().replace("slope", 'width_step = "5n"\nslope')
        processes[1].write_text(text)
        with pytest.raises(SettingsError, match="'even' and 'slow p' draw widths differently"):
            resized(netlist, question)


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

    def test_an_inventory_takes_one(
        self, netlist: Path, processes: list[Path], capsys: pytest.CaptureFixture[str]
    ) -> None:
        several = [word for path in processes for word in ("--process", str(path))]
        assert main(["recognise", str(netlist), *several]) == 1
        assert capsys.readouterr().err == (
            "recognise takes one process, got 3; give --process once (several-corners)\n"
        )

    def test_a_simulation_says_how_to_see_all(
        self, netlist: Path, processes: list[Path], capsys: pytest.CaptureFixture[str]
    ) -> None:
        several = [word for path in processes for word in ("--process", str(path))]
        assert main(["simulate", str(netlist), *several]) == 1
        each = ", then with ".join(f"--process {path}" for path in processes)
        assert capsys.readouterr().err == (
            "simulate takes one process, got 3; run it once for each corner: with"
            f" {each} (several-corners)\n"
        )
