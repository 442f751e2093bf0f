"""Analyses and differences as documents."""

from __future__ import annotations

from typing import Final, get_args

from evenstage.errors import Notice
from evenstage.logic.paths import PathVector, Verdict
from evenstage.report.document.shape import (
    LEVEL,
    NUMBER,
    TEXT,
    WHOLE,
    Field,
    Shape,
    Told,
    many,
    optional,
    pairs,
    words,
)
from evenstage.timing.results import (
    Analysis,
    Counts,
    Difference,
    Edge,
    Path,
    PathEnd,
    Precharge,
    SideBranch,
    Stage,
    WidthDifference,
    Yardstick,
)

EDGE: Final = words(*get_args(Edge))

#: Nets and what they are held at.
HELD: Final = pairs("net", TEXT, "level", LEVEL)

NOTICE: Final = Shape(
    Notice,
    Field("code", "code", TEXT),
    Field("message", "message", TEXT),
    Field("place", "place", TEXT),
    Field("names", "names", many(TEXT)),
)
NOTICES: Final = many(NOTICE.kind)

YARDSTICK: Final = Shape(
    Yardstick,
    Field("name", "process", TEXT),
    Field("tau_s", "tau", NUMBER),
    Field("p_inv", "p_inv", NUMBER),
    Field("fo4_s", "fo4", NUMBER),
    Field("input_cap_f", "input_cap", NUMBER),
    Field("charge_rise", "charge_rise", NUMBER),
    Field("charge_fall", "charge_fall", NUMBER),
    Field("transition_rise_s", "transition_rise", NUMBER),
    Field("transition_fall_s", "transition_fall", NUMBER),
)

_SIDE_BRANCH: Final = Shape(
    SideBranch,
    Field("instance", "instance", TEXT),
    Field("pin", "pin", TEXT),
    Field("cap_f", "cap", NUMBER),
)

STAGE: Final = Shape(
    Stage,
    Field("instance", "instance", TEXT),
    Field("through", "through", many(TEXT)),
    Field("subcircuit", "subcircuit", TEXT),
    Field("function", "function", TEXT),
    Field("input", "input", TEXT),
    Field("output", "output", TEXT),
    Field("edge", "edge", EDGE),
    Field("arrival_s", "arrival", NUMBER),
    Field("delay_s", "delay", NUMBER),
    Field("charged_delay_s", "charged_delay", NUMBER),
    Field("transition_s", "transition", NUMBER),
    Field("logical_effort", "logical_effort", NUMBER),
    Field("electrical_effort", "electrical_effort", NUMBER),
    Field("branching_effort", "branching_effort", NUMBER),
    Field("stage_effort", "stage_effort", NUMBER),
    Field("parasitic_delay", "parasitic_delay", NUMBER),
    Field("input_cap_f", "input_cap", NUMBER),
    Field("load_cap_f", "load_cap", NUMBER),
    Field("on_path_cap_f", "on_path_cap", NUMBER),
    Field("self_cap_f", "self_cap", NUMBER),
    Field("width_m", "width", NUMBER),
    Field("wire_delay_s", "wire_delay", NUMBER),
    Field("wire_cap_f", "wire_cap", NUMBER),
    Field("effective_cap_f", "effective_cap", optional(NUMBER)),
    Field("side_branches", "side_branches", many(_SIDE_BRANCH.kind)),
)

_VECTOR: Final = Shape(
    PathVector,
    Field("verdict", "verdict", words(*get_args(Verdict))),
    Field("held", "held", HELD),
    Field("reason", "reason", TEXT),
)

PATH: Final = Shape(
    Path,
    Field("from", "start", TEXT),
    Field("from_edge", "start_edge", EDGE),
    Field("from_arrival_s", "start_arrival", NUMBER),
    Field("to", "end", TEXT),
    Field("edge", "edge", EDGE),
    Field("corner", "corner", TEXT),
    Field("delay_s", "delay", NUMBER),
    Field("charged_delay_s", "charged_delay", NUMBER),
    Field("required_s", "required", optional(NUMBER)),
    Field("logical_effort", "logical_effort", NUMBER),
    Field("branching_effort", "branching_effort", NUMBER),
    Field("electrical_effort", "electrical_effort", NUMBER),
    Field("path_effort", "path_effort", NUMBER),
    Field("parasitic_delay", "parasitic_delay", NUMBER),
    Field("best_stage_effort", "best_stage_effort", NUMBER),
    Field("best_stage_count", "best_stage_count", WHOLE),
    Field("least_delay_s", "least_delay", NUMBER),
    Field("vector", "vector", optional(_VECTOR.kind)),
    Field("stages", "stages", many(STAGE.kind)),
)

PATHS: Final = many(PATH.kind)

END: Final = Shape(
    PathEnd,
    Field("net", "net", TEXT),
    Field("edge", "edge", EDGE),
    Field("delay_s", "delay", NUMBER),
    Field("charged_delay_s", "charged_delay", NUMBER),
    Field("required_s", "required", optional(NUMBER)),
    Field("why", "why", TEXT),
)

_PRECHARGE: Final = Shape(
    Precharge,
    Field("net", "net", TEXT),
    Field("edge", "edge", EDGE),
    Field("instance", "instance", TEXT),
    Field("devices", "devices", many(TEXT)),
    Field("clock", "clock", TEXT),
    Field("clock_edge", "clock_edge", EDGE),
    Field("delay_s", "delay", NUMBER),
    Field("transition_s", "transition", NUMBER),
    Told("complete_s", lambda one: one.complete),
    Field("phase_s", "phase", optional(NUMBER)),
)

_COUNTS: Final = Shape(
    Counts,
    Field("devices", "devices", WHOLE),
    Field("nets", "nets", WHOLE),
    Field("gates", "gates", WHOLE),
    Field("stages", "stages", WHOLE),
)

ANALYSIS: Final = Shape(
    Analysis,
    Field("source", "source", TEXT),
    Field("top", "top", TEXT),
    Field("process", "yardstick", YARDSTICK.kind),
    Field("counts", "counts", _COUNTS.kind),
    Field("total_width_m", "total_width", NUMBER),
    Field("switched_cap_f", "switched_cap", NUMBER),
    Field("worst_transition_s", "worst_transition", NUMBER),
    Field("input_caps", "input_caps", pairs("net", TEXT, "cap_f", NUMBER)),
    Field("notices", "notices", NOTICES),
    Field("paths", "paths", PATHS),
    Field("false_paths", "false_paths", PATHS),
    Field("ends", "ends", many(END.kind)),
    Field("precharges", "precharges", many(_PRECHARGE.kind)),
)


def _factor(width: WidthDifference) -> float | None:
    return width.after / width.before if width.before and width.after else None


_WIDTH: Final = Shape(
    WidthDifference,
    Field("instance", "instance", TEXT),
    Field("card", "card", TEXT),
    Field("model", "model", TEXT),
    Field("before_m", "before", optional(NUMBER)),
    Field("after_m", "after", optional(NUMBER)),
    Told("factor", _factor),
)

DIFFERENCE: Final = Shape(
    Difference,
    Field("widths", "widths", many(_WIDTH.kind)),
    Field("unchanged", "unchanged", WHOLE),
    Field("same_path_before", "same_path_before", optional(PATH.kind)),
    Field("same_path_after", "same_path_after", optional(PATH.kind)),
    Field("only_before", "only_before", many(TEXT)),
    Field("only_after", "only_after", many(TEXT)),
    Field("before", "before", ANALYSIS.kind),
    Field("after", "after", ANALYSIS.kind),
)
