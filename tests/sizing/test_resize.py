"""Laws of every resizing, and what is free to move."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from evenstage.brief import Brief, InputBrief, LimitBrief, OutputBrief
from evenstage.errors import InfeasibleError, SettingsError
from evenstage.pattern import Pattern
from evenstage.sizing.resize import resize
from evenstage.sizing.wishes import Original, Wishes
from evenstage.timing.analyse import analyse
from support.blocks import block, circuit_of, inverter, nand, plain_process
from support.random_blocks import RandomBlock, random_blocks

if TYPE_CHECKING:
    from evenstage.process.process import Process
    from evenstage.sizing.results import Change, Sizing

PROCESS = plain_process(slope=0.2, slope_power=0.8, shape=1.6, shape_carry=0.2, stack=0.7)

LEAF = """.subckt inv a y
mn y a vss vss nx w=1u l=0.1u
mp y a vdd vdd px w=2u l=0.1u
.ends
"""
LEAF_WITH_WIDTHS = """.subckt invp a y wn=1u wp=2u
mn y a vss vss nx w=wn l=0.1u
mp y a vdd vdd px w=wp l=0.1u
.ends
"""


def pats(*names: str) -> tuple[Pattern, ...]:
    return tuple(Pattern(name) for name in names)


def resized(
    text: str,
    wishes: Wishes | None = None,
    brief: Brief | None = None,
    process: Process = PROCESS,
    original: Original | None = None,
) -> Sizing:
    return resize(analyse(circuit_of(text, process, brief), brief), brief, wishes, original)


def chain(widths: list[float], load: float, wire: float = 0) -> str:
    cards = [inverter(f"i{k}", f"x{k}", f"x{k + 1}", w, 2 * w) for k, w in enumerate(widths)]
    if wire:
        cards += [f"cw{k} x{k} vss {wire}f" for k in range(1, len(widths))]
    return block(
        "\n".join([*cards, f"cl x{len(widths)} vss {load}f"]), f"x0 x{len(widths)} vdd vss"
    )


def by_card(sizing: Sizing) -> dict[str, Change]:
    return {change.card: change for change in sizing.changes}


class TestPlainChains:
    @pytest.mark.parametrize("stages", [2, 3, 5])
    @pytest.mark.parametrize("load", [30.0, 900.0])
    def test_equal_stage_effort(self, stages: int, load: float) -> None:
        """The fastest sizes of a plain chain grow by one factor; here to the grid's 1 nm."""
        process = plain_process(slope=0.2, shape=1.6)
        text = chain([1.0] + [1.5] * (stages - 1), load)
        sizing = resized(text, Wishes(margin=0), process=process)
        effort = (load / 3) ** (1 / stages)
        stages_after = sizing.after.paths[0].stages
        assert [s.stage_effort for s in stages_after] == pytest.approx([effort] * stages, rel=6e-3)
        assert sizing.after.paths[0].charged_delay == pytest.approx(
            sizing.after.paths[0].least_delay, rel=1e-4
        )
        assert sizing.bound == pytest.approx(sizing.after.paths[0].least_delay, rel=1e-5)

    def test_the_first_stage_keeps_its_input_capacitance(self) -> None:
        sizing = resized(chain([1.0, 1.0, 1.0], 300), Wishes(margin=0))
        assert dict(sizing.after.input_caps) == pytest.approx(dict(sizing.before.input_caps))

    def test_margin_saves_width(self) -> None:
        fastest = resized(chain([1.0, 1.0, 1.0, 1.0], 900), Wishes(margin=0))
        thrifty = resized(chain([1.0, 1.0, 1.0, 1.0], 900), Wishes(margin=0.05))
        assert thrifty.total_width_after < 0.8 * fastest.total_width_after
        assert thrifty.after.paths[0].charged_delay <= 1.05 * fastest.bound * (1 + 1e-6)


class TestLaws:
    @given(random_blocks(), st.sampled_from([0.0, 0.01, 0.1]), st.sampled_from(["path", "block"]))
    @settings(max_examples=15, deadline=None)
    def test_never_slower_and_no_limit_broken(
        self, drawn: RandomBlock, margin: float, scope: str
    ) -> None:
        sizing = resized(drawn.text(), Wishes(margin=margin, scope=scope))  # type: ignore[arg-type]
        before, after = sizing.before, sizing.after
        assert after.paths[0].delay <= before.paths[0].delay * (1 + 1e-9)
        assert max(e.charged_delay for e in after.ends) <= max(
            e.charged_delay for e in before.ends
        ) * (1 + 1e-9)
        # The grid may shift the ratio of n to p, which the bound holds as drawn.
        assert max(e.charged_delay for e in after.ends) >= sizing.bound * (1 - 2e-3)
        assert after.worst_transition <= before.worst_transition * (1 + 1e-6)
        old = dict(before.input_caps)
        assert all(cap <= old[name] * (1 + 1e-9) for name, cap in after.input_caps)
        assert sizing.gap - sizing.sharing_loss < 1e-4
        smallest = min(w for _, _, _, w in drawn.gates) * 1e-6
        assert all(change.new >= smallest * (1 - 1e-9) for change in sizing.changes)

    @given(random_blocks(), st.sampled_from([0.9, 0.97, 1.1]))
    @settings(max_examples=15, deadline=None)
    def test_a_wished_delay_is_met_or_refused(self, drawn: RandomBlock, share: float) -> None:
        today = analyse(circuit_of(drawn.text(), PROCESS)).paths[0].delay
        try:
            sizing = resized(drawn.text(), Wishes(delay=share * today))
        except InfeasibleError as error:
            # Anything but these two would be another mistake.
            if error.code not in {"delay-out-of-reach", "grid-too-coarse"}:
                raise
            return
        assert sizing.after.paths[0].delay <= share * today * (1 + 1e-6)
        # The bound is for charged delay and the drawn ratio of n to p.
        assert sizing.total_width_after >= sizing.bound * (1 - 2e-3)

    @given(random_blocks())
    @settings(max_examples=15, deadline=None)
    def test_what_each_change_buys_alone_is_measured(self, drawn: RandomBlock) -> None:
        sizing = resized(drawn.text())
        if len({change.instance for change in sizing.changes}) == 1:
            gained = sizing.after.paths[0].delay - sizing.before.paths[0].delay
            assert sizing.changes[0].alone == pytest.approx(gained, abs=1e-18)


class TestWishes:
    def test_out_of_reach_says_by_how_much_and_why(self) -> None:
        with pytest.raises(
            InfeasibleError, match=r"least possible .* more; it is held by"
        ) as error:
            resized(chain([1.0, 2.0, 4.0], 300), Wishes(delay=1e-12))
        assert "input capacitance allowed on 'x0'" in error.value.message

    def test_a_budget_is_kept(self) -> None:
        text = chain([1.0, 1.0, 1.0, 1.0], 2000)
        free = resized(text, Wishes(margin=0))
        held = resized(text, Wishes(width=1.5, margin=0))
        assert held.total_width_after <= 1.5 * held.total_width_before * (1 + 1e-6)
        assert free.after.paths[0].delay < held.after.paths[0].delay < held.before.paths[0].delay

    def test_a_slack_delay_gives_width_back(self) -> None:
        text = chain([1.0, 8.0, 30.0], 100)
        today = analyse(circuit_of(text, PROCESS)).paths[0].delay
        sizing = resized(text, Wishes(delay=1.5 * today))
        assert sizing.total_width_after < 0.5 * sizing.total_width_before

    def test_scope_path_leaves_the_rest_alone(self) -> None:
        side = [inverter("s1", "x1", "q", 6, 12), inverter("s2", "q", "z", 1, 2), "cz z vss 3f"]
        text = chain([1.0, 2.0, 4.0], 600).replace(".ends", "\n".join(side) + "\n.ends")
        text = text.replace("x0 x3", "x0 x3 z")
        alone = {c.card[:2] for c in resized(text).changes}
        assert not alone & {"ms"}
        assert "ms1n" not in by_card(resized(text))
        reclaimed = by_card(resized(text, Wishes(reclaim=True)))
        assert reclaimed["ms1n"].factor < 1

    def test_the_block_scope_may_move_more(self) -> None:
        text = chain([1.0, 2.0, 4.0], 600)
        one, all_ = resized(text), resized(text, Wishes(scope="block"))
        assert all_.after.paths[0].delay == pytest.approx(one.after.paths[0].delay, rel=0.02)

    def test_energy_can_be_kept_small_instead(self) -> None:
        text = chain([1.0, 1.0, 1.0], 300, wire=10)
        sizing = resized(
            text,
            Wishes(delay=0.9 * analyse(circuit_of(text, PROCESS)).paths[0].delay, spend="energy"),
        )
        assert sizing.bound_on == "energy"
        assert sizing.after.switched_cap >= sizing.bound * (1 - 1e-6)


class TestLimits:
    TEXT = chain([1.0, 1.2, 1.5, 2.0], 500)

    def test_fixed_cards_stay(self) -> None:
        brief = Brief(fixed=pats("mi2*"))
        changes = by_card(resized(self.TEXT, brief=brief))
        assert changes
        assert "mi2n" not in changes
        assert "mi2p" not in changes

    def test_a_pattern_that_fits_nothing_is_an_error(self) -> None:
        with pytest.raises(SettingsError, match="no card fits 'zz"):
            resized(self.TEXT, brief=Brief(fixed=pats("zz*")))

    def test_same_size_means_one_factor(self) -> None:
        brief = Brief(same_size=(pats("mi1*", "mi3*"),))
        changes = by_card(resized(self.TEXT, brief=brief))
        assert changes["mi1n"].factor == pytest.approx(changes["mi3n"].factor, rel=2e-3)

    def test_width_limits_hold_exactly(self) -> None:
        limit = LimitBrief(cards=pats("mi3n"), width_max=2.5e-6)
        changes = by_card(resized(self.TEXT, brief=Brief(limits=(limit,))))
        assert changes["mi3n"].new <= 2.5e-6 * (1 + 1e-12)

    def test_limits_that_cross_are_refused(self) -> None:
        limits = (
            LimitBrief(cards=pats("mi3n"), width_max=2e-6),
            LimitBrief(cards=pats("mi3n"), width_min=3e-6),
        )
        with pytest.raises(InfeasibleError, match="smallest width allowed exceeds"):
            resized(self.TEXT, brief=Brief(limits=limits))

    def test_the_grid_is_kept(self) -> None:
        process = plain_process(slope=0.2, shape=1.6, width_step=5e-8)
        for change in resized(self.TEXT, process=process).changes:
            steps = change.new / 5e-8
            assert steps == pytest.approx(round(steps), abs=1e-6)

    def test_an_input_may_grow_to_its_ceiling(self) -> None:
        drawn = resized(self.TEXT)
        brief = Brief(inputs=(InputBrief(nets=pats("x0"), capacitance_max=6e-15),))
        wider = resized(self.TEXT, brief=brief)
        assert dict(wider.after.input_caps)["x0"] <= 6e-15 * (1 + 1e-9)
        assert wider.after.paths[0].delay < drawn.after.paths[0].delay

    def test_an_input_above_its_ceiling_shrinks(self) -> None:
        brief = Brief(inputs=(InputBrief(nets=pats("x0"), capacitance_max=2.4e-15),))
        process = plain_process(slope=0.2, shape=1.6, width_min=1e-7)
        sizing = resized(self.TEXT, brief=brief, process=process)
        assert dict(sizing.after.input_caps)["x0"] <= 2.4e-15 * (1 + 1e-9)

    def test_an_input_that_cannot_shrink_is_named(self) -> None:
        brief = Brief(
            inputs=(InputBrief(nets=pats("x0"), capacitance_max=2e-15),), fixed=pats("mi0*")
        )
        with pytest.raises(InfeasibleError, match="input 'x0' shows more"):
            resized(self.TEXT, brief=brief)

    def test_a_transition_limit_is_kept(self) -> None:
        free = resized(self.TEXT, Wishes(margin=0.1))
        limit = free.after.worst_transition * 0.9
        held = resized(self.TEXT, Wishes(margin=0.1), Brief(transition_max=limit))
        assert held.after.worst_transition <= limit * (1 + 1e-6)

    def test_limits_out_of_reach_are_named(self) -> None:
        with pytest.raises(InfeasibleError, match=r"gate 'mi\dn' cannot keep the transition limit"):
            resized(self.TEXT, brief=Brief(transition_max=1e-12))
        tiny = InputBrief(nets=pats("x0"), capacitance_max=1e-17)
        with pytest.raises(InfeasibleError, match=r"input 'x0' may show 10.0 aF, but"):
            resized(self.TEXT, brief=Brief(inputs=(tiny,)))
        with pytest.raises(InfeasibleError, match=r"a total width of .* is out of reach"):
            resized(self.TEXT, Wishes(width=0.1))

    def test_recorded_limits_count_instead_of_todays(self) -> None:
        original = Original(ceilings={"x0": 6e-15})
        assert (
            resized(self.TEXT, original=original).after.paths[0].delay
            < resized(self.TEXT).after.paths[0].delay
        )

    def test_required_times_decide_which_end_is_late(self) -> None:
        cards = [
            inverter("a", "in", "m", 1, 2), inverter("b", "m", "u", 1, 2), "cu u vss 60f",
            inverter("c", "m", "v", 1, 2), "cv v vss 100f",
        ]  # fmt: skip
        text = block("\n".join(cards), "in u v vdd vss")
        brief = Brief(
            outputs=(
                OutputBrief(nets=pats("u"), required=1e-10),
                OutputBrief(nets=pats("v"), required=9e-10),
            )
        )
        assert resized(text, brief=brief).before.paths[0].end == "u"


class TestHierarchy:
    def test_a_row_called_64_times_keeps_one_size(self) -> None:
        row = ".subckt row a w\nx1 a m inv\nx2 m w inv\n.ends\n"
        calls = "\n".join(f"xr{k} a w{k} row\ncw{k} w{k} vss 40f" for k in range(64))
        text = f"* rows\n.global vdd vss\n{LEAF}{row}.subckt top a\n{calls}\n.ends\n"
        sizing = resized(text)
        assert sizing.changes
        assert {change.occurrences for change in sizing.changes} == {64}

    def test_callers_that_differ_get_copies_or_parameters(self) -> None:
        for leaf, parameter, cell in (("inv", "w", LEAF), ("invp", "wn", LEAF_WITH_WIDTHS)):
            calls = "\n".join(f"x{k} n{k} n{k + 1} {leaf}" for k in range(4))
            text = (
                f"* c\n.global vdd vss\n{cell}.subckt top n0 n4\n{calls}\ncl n4 vss 900f\n.ends\n"
            )
            changes = resized(text).changes
            assert len({change.new for change in changes if change.card == "mn"}) > 1
            assert {change.parameter for change in changes if change.card == "mn"} == {parameter}

    def test_no_more_copies_than_allowed(self) -> None:
        calls = "\n".join(f"x{k} n{k} n{k + 1} inv" for k in range(7))
        text = f"* c\n.global vdd vss\n{LEAF}.subckt top n0 n7\n{calls}\ncl n7 vss 9000f\n.ends\n"
        for copies in (0, 1, 2):
            changes = resized(text, brief=Brief(copies_per_leaf=copies)).changes
            sizes = {round(change.factor, 6) for change in changes if change.card == "mn"}
            assert len(sizes) <= max(copies, 1)

    def test_a_larger_subcircuit_can_be_named_a_leaf(self) -> None:
        buf = ".subckt buf a y\nx1 a m inv\nx2 m y inv\n.ends\n"
        calls = "xa n0 n1 buf\nxb n1 n2 buf\ncl n2 vss 300f"
        text = f"* b\n.global vdd vss\n{LEAF}{buf}.subckt top n0 n2\n{calls}\n.ends\n"
        sizing = resized(text, brief=Brief(leaves=pats("buf")))
        assert sizing.free_cards + sizing.fixed_cards == 2


def test_the_optimum_of_a_nand_chain_beats_any_neighbour() -> None:
    """Perturbing any gate of the continuous optimum by 5 % does not make the block faster."""
    cards = [
        nand("a", ["in", "vdd"], "p", 1, 1), nand("b", ["p", "vdd"], "q", 2, 2),
        inverter("c", "q", "z", 3, 6), "cl z vss 200f",
    ]  # fmt: skip
    text = block("\n".join(cards), "in z vdd vss")
    circuit = circuit_of(text, PROCESS)
    sizing = resize(analyse(circuit), None, Wishes(margin=0))
    written = {c.card: c.factor for c in sizing.changes}
    names = [circuit.devices.netlist.card(int(card)).name for card in circuit.devices.card]
    best = np.array([written.get(name, 1.0) for name in names])
    reached = analyse(circuit.resized(best)).paths[0].charged_delay
    for gate in range(1, len(circuit)):
        for nudge in (0.95, 1.05):
            tried = np.where(circuit.gate_of_device == gate, best * nudge, best)
            assert analyse(circuit.resized(tried)).paths[0].charged_delay >= reached * (1 - 1e-5)


class TestWhatIsTold:
    CALLS = "x1 x0 x1 {leaf}\nx2 x1 x2 {leaf}\nx3 x2 x3 {leaf}\ncl x3 vss 90f"

    def codes(self, sizing: Sizing) -> list[str]:
        return [notice.code for notice in sizing.notices]

    def test_a_width_that_hangs_on_another_may_miss_the_grid_and_is_told(self) -> None:
        leaf = LEAF_WITH_WIDTHS.replace("wn=1u wp=2u", "w=1u").replace("w=wn", "w=w")
        text = block(self.CALLS.format(leaf="invp"), "x0 x3 vdd vss")
        grid = plain_process(shape=1.6, slope=0.2, width_step=1e-8)
        odd = resized(leaf.replace("w=wp", "w='2.003*w'") + text, process=grid)
        (told,) = [notice for notice in odd.notices if notice.code == "off-grid"]
        assert "is off the grid of the process: the width hangs on 'w'" in told.message
        assert told.names == ("mp",)
        even = resized(leaf.replace("w=wp", "w='2*w'") + text, process=grid)
        assert even.changes
        assert "off-grid" not in self.codes(even)

    def test_a_leaf_whose_callers_all_leave_it_stays_and_is_told(self) -> None:
        calls = "x1 x0 x1 inv\nx2 x1 x2 inv\ncl x2 vss 90f"
        first = InputBrief(nets=pats("x0"), capacitance_max=30e-15)
        sizing = resized(
            LEAF + block(calls, "x0 x2 vdd vss"), Wishes(reclaim=True), Brief(inputs=(first,))
        )
        assert {change.instance for change in sizing.changes} == {"x1", "x2"}
        (told,) = [notice for notice in sizing.notices if notice.code == "leaf-uncalled"]
        assert told.names == ("inv",)
        assert "stays in the file: 'inv'" in told.message

    def test_a_process_without_transitions_limits_none(self) -> None:
        assert resized(chain([1, 1, 1], 60), process=plain_process()).changes
