"""Made-up results, for their texts alone: an invented row decoder, its sizing, a comparison."""

from __future__ import annotations

import math
import os
from dataclasses import replace
from pathlib import Path as FilePath
from typing import TYPE_CHECKING

import pytest

from evenstage.errors import Notice
from evenstage.logic.paths import PathVector
from evenstage.logic.same import StructureCheck
from evenstage.sizing.results import Change, LimitPrice, Sizing, StageHold
from evenstage.timing.results import (
    Analysis,
    Counts,
    Difference,
    Path,
    PathEnd,
    SideBranch,
    Stage,
    WidthDifference,
    Yardstick,
)

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from evenstage.sizing.results import Hold
    from evenstage.timing.results import Edge

GOLDEN = FilePath(__file__).parent / "golden"
TAU = 4.8e-12
YARDSTICK = Yardstick(
    process="sample65",
    tau=TAU,
    p_inv=1.02,
    fo4=24.1e-12,
    input_cap=1.9e-15,
    charge_rise=1.31,
    charge_fall=1.27,
    transition_rise=38e-12,
    transition_fall=33e-12,
)


def make_stage(
    instance: str,
    function: str,
    output: str,
    *,
    g: float,
    p: float,
    input_cap: float,
    on_path: float,
    branches: Sequence[SideBranch] = (),
) -> Stage:
    """Return a stage whose numbers agree with each other; edges and arrivals come later."""
    load = on_path + sum(branch.cap for branch in branches)
    effort = g * load / input_cap
    charged = TAU * (effort + p)
    return Stage(
        instance=instance,
        subcircuit="",
        function=function,
        input="",
        output=output,
        edge="rise",
        arrival=0.0,
        delay=0.9 * charged + 2e-12,
        charged_delay=charged,
        transition=1.6 * charged,
        logical_effort=g,
        electrical_effort=on_path / input_cap,
        branching_effort=load / on_path,
        stage_effort=effort,
        parasitic_delay=p,
        input_cap=input_cap,
        load_cap=load,
        on_path_cap=on_path,
        self_cap=0.6 * input_cap,
        width=7.5e8 * input_cap,
        side_branches=tuple(sorted(branches, key=lambda branch: -branch.cap)),
    )


def make_path(stages: Sequence[Stage], start: str, start_arrival: float = 0.0) -> Path:
    """Return a path through stages, with arrivals, alternating edges and products worked out."""
    arrival, placed = start_arrival, []
    for number, stage in enumerate(stages):
        arrival += stage.delay
        edge: Edge = "rise" if (len(stages) - number) % 2 else "fall"
        placed.append(replace(stage, arrival=arrival, edge=edge))
    F = math.prod(stage.stage_effort for stage in stages)
    P = sum(stage.parasitic_delay for stage in stages)
    return Path(
        start=start,
        start_edge="fall" if len(stages) % 2 else "rise",
        start_arrival=start_arrival,
        end=placed[-1].output,
        edge="rise",
        corner="sample65",
        delay=arrival,
        charged_delay=start_arrival + sum(stage.charged_delay for stage in stages),
        required=None,
        logical_effort=math.prod(stage.logical_effort for stage in stages),
        branching_effort=math.prod(stage.branching_effort for stage in stages),
        electrical_effort=math.prod(stage.electrical_effort for stage in stages),
        path_effort=F,
        parasitic_delay=P,
        best_stage_effort=3.61,
        best_stage_count=len(stages),
        least_delay=TAU * (len(stages) * F ** (1 / len(stages)) + P),
        stages=tuple(placed),
    )


def decoder_path(driver: float, row: int = 63) -> Path:
    """Return a path of an invented row decoder; ``driver`` is the input capacitance of p7's, F."""
    siblings = [SideBranch(instance=f"xrow[{i}].xnand", pin="a", cap=1.1e-15) for i in range(15)]
    probes = [SideBranch(instance=f"xtest{i}.xprobe", pin="in", cap=0.3e-15) for i in range(3)]
    wire = SideBranch(instance="cp7", pin="wire", cap=6e-15)
    word_line = SideBranch(instance=f"cwl[{row}]", pin="wire", cap=19e-15)
    twin = SideBranch(instance="xpre1.xnand", pin="b", cap=2.5e-15)
    stages = [
        make_stage(
            "xpre0.xinv",
            "!a3",
            "a3b",
            g=1,
            p=1.0,
            input_cap=1.9e-15,
            on_path=2.9e-15,
            branches=[twin],
        ),
        make_stage(
            "xpre0.xnand",
            "!(a1 & a2 & a3b)",
            "p7b",
            g=1.62,
            p=3.1,
            input_cap=2.9e-15,
            on_path=driver,
        ),
        make_stage(
            "xpre0.xdrv",
            "!p7b",
            "p7",
            g=1,
            p=1.0,
            input_cap=driver,
            on_path=1.1e-15,
            branches=[*siblings, wire, *probes],
        ),
        make_stage(
            f"xrow[{row}].xnand",
            "!(p7 & q3)",
            "n1",
            g=1.33,
            p=2.1,
            input_cap=1.1e-15,
            on_path=2.4e-15,
        ),
        make_stage(
            f"xrow[{row}].xdrv.xi1", "!n1", "n2", g=1, p=1.0, input_cap=2.4e-15, on_path=8e-15
        ),
        make_stage(
            f"xrow[{row}].xdrv.xi2",
            "!n2",
            f"wl[{row}]",
            g=1,
            p=1.0,
            input_cap=8e-15,
            on_path=16e-15,
            branches=[word_line],
        ),
    ]
    return make_path(stages, "a3")


def decoder_analysis(driver: float, *, source: str = "rowdec.sp") -> Analysis:
    """Return the analysis of the invented row decoder."""
    held = (("en", True), ("a0", False), *((f"q{i}", True) for i in range(4)))
    path = replace(decoder_path(driver), vector=PathVector(verdict="switches", held=held))
    second = replace(
        decoder_path(driver, row=62),
        start="a2",
        required=None,
        vector=PathVector(verdict="together"),
    )
    false = tuple(
        replace(decoder_path(driver, row=row), vector=PathVector(verdict="false"))
        for row in range(10, 17)
    )
    ends = [
        PathEnd(
            net=f"wl[{63 - i}]",
            edge="rise",
            delay=path.delay - i * 0.11e-12,
            charged_delay=path.charged_delay - i * 0.1e-12,
            required=250e-12 if i == 2 else None,
            why="output" if i != 3 else "enters what was not understood",
        )
        for i in range(64)
    ]
    joined = [
        Notice("resistor-joined", f"resistor rwl{i} joins its nets", f"rowdec.sp:{31 + i}:1")
        for i in range(6)
    ]
    return Analysis(
        source=source,
        top="rowdec",
        yardstick=YARDSTICK,
        counts=Counts(devices=1040, nets=361, gates=218, stages=218),
        paths=(path, second),
        ends=tuple(ends),
        worst_transition=184e-12,
        total_width=1.2e-3 + 8e9 * driver,
        switched_cap=2.9e-12 + 16 * driver,
        false_paths=false,
        input_caps=(("clk", 7.2e-15), *((f"a{i}", (3 + i / 4) * 1e-15) for i in range(6))),
        notices=(
            *joined,
            Notice("default-load", "nothing loads one output; it gets 4 unit inverters"),
        ),
    )


@pytest.fixture
def analysis() -> Analysis:
    """The row decoder with a driver that is too small."""
    return decoder_analysis(1.4e-15)


@pytest.fixture
def sizing(analysis: Analysis) -> Sizing:
    """The same, resized."""
    after = decoder_analysis(3.2e-15)
    row_holds: tuple[Hold, ...] = ("ceiling", "", "", "same size", "transition", "upper")

    def change(instance: str, card: str, parameter: str, old: float, new: float) -> Change:
        predriver = instance == "xpre0.xdrv"
        return Change(
            card=card,
            file="rowdec.sp",
            line=12 + (card == "mp1") if predriver else 44,
            instance=instance,
            occurrences=8 if predriver else 64,
            parameter=parameter,
            old=old,
            new=new,
            alone=-41e-12 if predriver else 0.4e-12,
            last=-44e-12 if predriver else -9.7e-12,
            why="drives 16 rows and a wire" if predriver else "drives the word line",
        )

    return Sizing(
        before=analysis,
        after=after,
        goal="fastest",
        bound=0.985 * after.paths[0].charged_delay,
        bound_on="delay",
        gap=3e-7,
        rounding_loss=0.0031,
        least_delay=0.985 * after.paths[0].charged_delay,
        total_width_before=analysis.total_width,
        total_width_after=after.total_width,
        free_cards=14,
        fixed_cards=3,
        changes=(
            change("xpre0.xdrv", "mn1", "w", 0.35e-6, 0.8e-6),
            change("xpre0.xdrv", "mp1", "w", 0.7e-6, 1.6e-6),
            change("xrow[63].xdrv.xi2", "xi2", "wn", 4.2e-6, 5.1e-6),
            change("xrow[63].xdrv.xi2", "xi2", "wp", 8.2e-6, 10.1e-6),
        ),
        holds=tuple(
            StageHold(instance=stage.instance, hold=hold)
            for stage, hold in zip(after.paths[0].stages, row_holds, strict=True)
        ),
        already_done=False,
        prices=(
            LimitPrice(limit="input", name="a3", buys=7.1e-12),
            LimitPrice(limit="fixed", name="xpre0.xnand", buys=2.2e-12),
            LimitPrice(limit="fixed", name="xpre1.xnand", buys=2.2e-12),
            LimitPrice(limit="transition", name="", buys=0.4e-12),
        ),
        notices=(Notice("fixed-outside", "3 cards lie outside the main file's folder"),),
        structure=StructureCheck(same=True, reason="", transistors=analysis.counts.devices),
    )


@pytest.fixture
def difference(analysis: Analysis) -> Difference:
    """The same, against a netlist edited by hand."""
    after = decoder_analysis(3.2e-15, source="rowdec_by_hand.sp")
    rows = [
        WidthDifference(
            instance=f"xrow[{i}].xdrv.xi2", card="mn1", model="nch", before=1.2e-6, after=2.4e-6
        )
        for i in range(64)
    ]
    return Difference(
        before=analysis,
        after=replace(after, paths=after.paths[::-1]),
        widths=(
            *rows,
            WidthDifference(
                instance="xpre0.xdrv", card="mp1", model="pch", before=1.2e-6, after=0.8e-6
            ),
            WidthDifference(instance="", card="mp2", model="pch", before=None, after=0.8e-6),
        ),
        unchanged=974,
        same_path_after=after.paths[0],
        same_path_before=analysis.paths[1],
        only_before=("xpre0.xold", "nold"),
        only_after=tuple(f"xspare{i}" for i in range(20)),
    )


@pytest.fixture
def golden() -> Callable[[str, str], None]:
    """Compare a text with the one kept under its name; ``EVENSTAGE_GOLDEN=write`` keeps it anew."""

    def compare(name: str, text: str) -> None:
        kept = GOLDEN / f"{name}.txt"
        if os.environ.get("EVENSTAGE_GOLDEN") == "write":
            kept.write_bytes(text.encode())
        assert text == kept.read_bytes().decode()

    return compare
