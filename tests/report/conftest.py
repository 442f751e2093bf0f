"""Made-up results, for the texts alone: nothing here was computed by the program."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from evenstage.errors import Notice
from evenstage.timing.results import (
    Analysis,
    Counts,
    Path,
    PathEnd,
    SideBranch,
    Stage,
    Yardstick,
)

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


def make_stage(instance, function, output, **given) -> Stage:  # noqa: ANN001, ANN003
    """Return a stage whose numbers agree with each other, from the few that matter."""
    g, h, p, load = (given.pop(key) for key in ("g", "h", "p", "load"))
    branches = given.pop("branches", ())
    on_path = load - sum(branch.cap for branch in branches)
    b = load / on_path
    charged = TAU * (g * h * b + p)
    values = {
        "instance": instance,
        "subcircuit": given.pop("subcircuit", "inv"),
        "function": function,
        "input": given.pop("input", "in"),
        "output": output,
        "edge": "rise",
        "arrival": charged,
        "delay": charged,
        "charged_delay": charged,
        "transition": 2 * charged,
        "logical_effort": g,
        "electrical_effort": h,
        "branching_effort": b,
        "stage_effort": g * h * b,
        "parasitic_delay": p,
        "input_cap": on_path / h,
        "load_cap": load,
        "on_path_cap": on_path,
        "self_cap": 0.6 * on_path / h,
        "width": 1e9 * on_path / h,
        "side_branches": tuple(branches),
    }
    return Stage(**(values | given))


def make_path(stages, *, start="a3", end=None, start_arrival=0.0, **given) -> Path:  # noqa: ANN001, ANN003
    """Return a path through stages, with arrivals, alternating edges and products worked out."""
    arrival, placed = start_arrival, []
    for number, stage in enumerate(stages):
        arrival += stage.delay
        edge = "rise" if (len(stages) - number) % 2 else "fall"
        placed.append(replace(stage, arrival=arrival, edge=edge))
    G = math.prod(stage.logical_effort for stage in stages)
    B = math.prod(stage.branching_effort for stage in stages)
    H = math.prod(stage.electrical_effort for stage in stages)
    P = sum(stage.parasitic_delay for stage in stages)
    n = max(len(stages), 1)
    values = {
        "start": start,
        "start_edge": "fall" if len(stages) % 2 else "rise",
        "start_arrival": start_arrival,
        "end": end or placed[-1].output,
        "edge": "rise",
        "corner": "typical",
        "delay": arrival,
        "charged_delay": arrival,
        "required": None,
        "logical_effort": G,
        "branching_effort": B,
        "electrical_effort": H,
        "path_effort": G * B * H,
        "parasitic_delay": P,
        "best_stage_effort": 3.61,
        "best_stage_count": len(stages),
        "least_delay": TAU * (n * (G * B * H) ** (1 / n) + P),
        "stages": tuple(placed),
    }
    return Path(**(values | given))


def decoder_path(scale: float = 1.0) -> Path:
    """Return the slowest path of an invented row decoder; ``scale`` times the size of its NAND."""
    rows = [SideBranch(instance=f"xrow[{i}].xnand", pin="a", cap=1.1e-15) for i in range(1, 16)]
    others = [SideBranch(instance=f"xtest{i}.xprobe", pin="a", cap=0.3e-15) for i in range(3)]
    wire = SideBranch(instance="cp7", pin="wire", cap=6e-15)
    stages = [
        make_stage(
            "xpre0.xinv",
            "!a3",
            "a3b",
            g=1.0,
            h=1.4,
            p=1.0,
            load=7.5e-15,
            branches=[SideBranch(instance="xpre1.xnand", pin="b", cap=2.5e-15)],
        ),
        make_stage("xpre0.xnand", "!(a1 & a2 & a3b)", "p7b", g=1.62, h=2.2, p=3.1, load=9e-15),
        make_stage(
            "xpre0.xdrv",
            "!p7b",
            "p7",
            g=1.0,
            h=0.9 * scale,
            p=1.0,
            load=(1.2 * scale + 6 + 16.5 + 0.9) * 1e-15,
            branches=[*rows, wire, *others],
        ),
        make_stage("xrow[63].xnand", "!(p7 & q3)", "n1", g=1.33, h=1.9 / scale, p=2.1, load=4e-15),
        make_stage("xrow[63].xdrv.xi1", "!n1", "n2", g=1.0, h=2.7, p=1.0, load=11e-15),
        make_stage(
            "xrow[63].xdrv.xi2",
            "!n2",
            "wl[63]",
            g=1.0,
            h=1.0,
            p=1.0,
            load=95e-15,
            branches=[
                SideBranch(instance="cwl[63]", pin="wire", cap=44e-15),
                SideBranch(instance="", pin="load", cap=38e-15),
            ],
        ),
    ]
    return make_path(stages)


def decoder_analysis(scale: float = 1.0) -> Analysis:
    """Return the analysis of the invented row decoder."""
    path = decoder_path(scale)
    ends = [
        PathEnd(
            net=f"wl[{63 - i}]",
            edge="rise",
            delay=path.delay - i * 0.11e-12,
            charged_delay=path.charged_delay - i * 0.1e-12,
            required=550e-12 if i == 2 else None,
            why="output" if i != 3 else "latch",
        )
        for i in range(64)
    ]
    return Analysis(
        source="rowdec.sp",
        top="rowdec",
        yardstick=YARDSTICK,
        counts=Counts(devices=1040, nets=361, gates=218, stages=218),
        paths=(path,),
        ends=tuple(ends),
        worst_transition=184e-12,
        total_width=1.234e-3 * (1 + 0.03 * scale),
        switched_cap=2.9e-12,
        input_caps=tuple((f"a{i}", (3 + i / 4) * 1e-15) for i in range(6)),
        notices=(
            Notice("resistor-joined", "resistor rwl joins its nets n2 and n3", "rowdec.sp:31:1"),
            Notice("no-load", "output test is not loaded: four unit inverters assumed", ""),
            *(
                Notice("resistor-joined", f"resistor r{i} joins its nets", f"rowdec.sp:{40 + i}:1")
                for i in range(5)
            ),
        ),
    )


@pytest.fixture
def analysis() -> Analysis:
    """The row decoder as it is."""
    return decoder_analysis()
