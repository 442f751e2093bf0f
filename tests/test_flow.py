"""What each command does, from files to results."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Final

import pytest

from evenstage import flow
from evenstage.errors import FitError, SettingsError

if TYPE_CHECKING:
    from pathlib import Path

    from evenstage.sizing.results import Sizing

#: Three inverters, the last one far too wide for its bare output.
CHAIN: Final = """* three inverters
.global vdd vss
.subckt inv a y wn=1u wp=2u
mn y a vss vss nch w=wn l=0.1u
mp y a vdd vdd pch w=wp l=0.1u
.ends
.subckt chain a y
x1 a b inv
x2 b c inv wn=4u wp=8u
x3 c y inv wn=30u wp=60u
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
width_min = "0.2u"
width_step = "10n"
"""


@pytest.fixture
def netlist(tmp_path: Path) -> Path:
    path = tmp_path / "chain.sp"
    path.write_bytes(CHAIN.encode())
    return path


@pytest.fixture
def question(tmp_path: Path) -> flow.Question:
    path = tmp_path / "process.toml"
    kinds = (("n", "2m"), ("p", "4m"))
    tables = "".join(TRANSISTOR.format(polarity=kind, r_w=r_w) for kind, r_w in kinds)
    path.write_text(f'name = "invented"\nsupply = 1.1\n{tables}')
    return flow.Question(process=path)


def shrunk(netlist: Path, question: flow.Question) -> tuple[Path, Sizing]:
    """Return a netlist with everything made as small as it may be, and the sizing behind it."""
    output = netlist.with_name("small.sp")
    wishes = flow.Wishes(margin=9.0, scope="block", reclaim=True)
    return output, flow.resize(netlist, question, wishes, output)


class TestCurve:
    def test_only_where_asked_for_and_again_after_it_is_done(
        self, netlist: Path, question: flow.Question
    ) -> None:
        output, sizing = shrunk(netlist, question)
        assert sizing.trade_off is None
        wishes = flow.Wishes(margin=9.0, scope="block", reclaim=True)
        again = flow.resize(output, question, wishes, curve=True)
        assert again.already_done
        assert again.trade_off is not None
        assert again.trade_off.today_spend == pytest.approx(sizing.total_width_after, rel=1e-9)


class TestSpend:
    def test_the_option_is_the_aim_of_a_brief(
        self, netlist: Path, question: flow.Question, tmp_path: Path
    ) -> None:
        brief = tmp_path / "brief.toml"
        brief.write_text('[aim]\nspend = "energy"\n')
        wishes = flow.Wishes(delay=1e-9)
        asked = flow.resize(netlist, question, wishes, spend="energy")
        aimed = flow.resize(netlist, replace(question, brief=brief), wishes)
        assert asked.bound_on == aimed.bound_on == "energy"
        assert asked.bound == aimed.bound <= asked.after.switched_cap * (1 + 1e-9)
        width = flow.resize(netlist, replace(question, brief=brief), wishes, spend="width")
        assert width.bound_on == "width"


class TestFirstLine:
    def test_the_brief_says_whether_it_is_a_title(
        self, netlist: Path, question: flow.Question, tmp_path: Path
    ) -> None:
        netlist.write_text("x0 q r inv wn=2u\n" + CHAIN)
        brief = tmp_path / "brief.toml"
        tops = {}
        for word in ("title", "card"):
            brief.write_text(f'first_line = "{word}"\n')
            block = flow.load(netlist, replace(question, brief=brief))
            assert block.analysis.timing is not None
            tops[word] = block.analysis.timing.circuit.devices.top
        assert tops == {"title": "chain", "card": ""}


class TestUnitInverter:
    """It stays that of the netlist as first drawn, or delays would move without a cause."""

    def test_written_netlist_keeps_the_promise(
        self, netlist: Path, question: flow.Question
    ) -> None:
        output, sizing = shrunk(netlist, question)
        assert min(change.new for change in sizing.changes) < 1e-6
        again = flow.load(output, question).analysis
        assert again.yardstick == sizing.after.yardstick
        assert again.paths[0].delay == pytest.approx(sizing.after.paths[0].delay, rel=1e-12)

    def test_of_two_netlists_is_that_of_the_first(
        self, netlist: Path, question: flow.Question
    ) -> None:
        after = netlist.with_name("after.sp")
        after.write_bytes(CHAIN.replace("wn=1u", "wn=0.5u").encode())
        difference = flow.diff(netlist, after, question)
        assert isinstance(difference, flow.Difference)
        assert difference.after.yardstick == difference.before.yardstick

    def test_a_netlist_alone_is_measured_by_its_own(
        self, netlist: Path, question: flow.Question
    ) -> None:
        before = flow.load(netlist, question).analysis.yardstick
        netlist.write_bytes(CHAIN.replace("wn=1u", "wn=0.5u").encode())
        assert flow.load(netlist, question).analysis.yardstick.input_cap == pytest.approx(
            before.input_cap / 2
        )


def test_a_brief_with_two_aims_is_refused(tmp_path: Path) -> None:
    netlist, brief = tmp_path / "chain.sp", tmp_path / "brief.toml"
    netlist.write_text(CHAIN)
    brief.write_text('[aim]\ndelay = "1n"\nwidth = 1.5\n')
    with pytest.raises(SettingsError, match="aims at a delay and at a width"):
        flow.resize(netlist, flow.Question(brief=brief))


class TestFitSimulated:
    def test_estimates_then_agree_with_simulations(
        self, netlist: Path, question: flow.Question, tmp_path: Path
    ) -> None:
        output = tmp_path / "fitted.toml"
        found = flow.fit_simulated(netlist, question, output)
        assert found.measured == 3 * 2 * 25
        assert found.single is not None
        assert found.single.median < 0.05
        path = flow.simulate(netlist, flow.Question(process=output)).before.paths[0]
        assert abs(path.estimated_delay / path.delay - 1) < 0.1

    def test_the_file_says_the_currents(
        self, netlist: Path, question: flow.Question, tmp_path: Path
    ) -> None:
        output = tmp_path / "fitted.toml"
        flow.fit_simulated(netlist, question, output)
        assert not flow.simulate(netlist, flow.Question(process=output)).scaled

    def test_a_netlist_without_cells_is_refused(
        self, tmp_path: Path, question: flow.Question
    ) -> None:
        path = tmp_path / "bare.sp"
        path.write_bytes(b"* bare\n.subckt load a vss\nc1 a vss 1f\n.ends\n")
        with pytest.raises(FitError) as caught:
            flow.fit_simulated(path, question)
        assert caught.value.code == "no-leaf"
