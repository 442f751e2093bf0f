"""Results as JSON for scripts: SI units, the unit in the key; keys are added, never renamed."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING, Final

from evenstage.report.circuit_document import inventory_body
from evenstage.report.few_changes import few_changes_body
from evenstage.report.fit_document import fit_body
from evenstage.report.prices import price_document
from evenstage.report.simulation_document import simulation_body
from evenstage.report.trade_off import trade_off_body

if TYPE_CHECKING:
    from collections.abc import Mapping

    from evenstage.circuit.inventory import Inventory
    from evenstage.errors import Notice
    from evenstage.fitting.deck import Deck
    from evenstage.fitting.results import Fit
    from evenstage.logic.paths import PathVector
    from evenstage.logic.same import StructureCheck
    from evenstage.report.circuit_document import Document, JsonValue
    from evenstage.simulation.results import Simulation
    from evenstage.sizing.results import Change, Sizing, StageHold
    from evenstage.timing.results import (
        Analysis,
        Difference,
        Path,
        PathEnd,
        SideBranch,
        Stage,
        WidthDifference,
        Yardstick,
    )

FORMAT: Final = 1


def analysis_document(analysis: Analysis) -> Document:
    """Return an analysis as the document scripts read.

    Parameters
    ----------
    analysis : Analysis

    Returns
    -------
    dict
        Plain values only; ``kind`` is ``analysis``.
    """
    return _head("analysis") | _analysis(analysis)


def sizing_document(sizing: Sizing) -> Document:
    """Return a sizing as the document scripts read.

    Parameters
    ----------
    sizing : Sizing

    Returns
    -------
    dict
        Plain values only; ``kind`` is ``sizing``. Of ``bound_s``, ``bound_m`` and ``bound_f`` those
        that ``bound_on`` does not name are null.
    """
    return _head("sizing") | {
        "goal": sizing.goal,
        "bound_on": sizing.bound_on,
        "bound_s": sizing.bound if sizing.bound_on == "delay" else None,
        "bound_m": sizing.bound if sizing.bound_on == "width" else None,
        "bound_f": sizing.bound if sizing.bound_on == "energy" else None,
        "gap": sizing.gap,
        "sharing_loss": sizing.sharing_loss,
        "rounding_loss": sizing.rounding_loss,
        "least_delay_s": sizing.least_delay,
        "total_width_m": {"before": sizing.total_width_before, "after": sizing.total_width_after},
        "free_cards": sizing.free_cards,
        "fixed_cards": sizing.fixed_cards,
        "already_done": sizing.already_done,
        "structure": _structure(sizing.structure),
        "changes": [_change(change) for change in sizing.changes],
        "holds": [_hold(hold) for hold in sizing.holds],
        "trade_off": None if sizing.trade_off is None else trade_off_body(sizing.trade_off),
        "prices": [price_document(price, sizing.bound_on) for price in sizing.prices],
        "few_changes": None if sizing.few is None else few_changes_body(sizing.few),
        "notices": [notice_document(notice) for notice in sizing.notices],
        "before": _analysis(sizing.before),
        "after": _analysis(sizing.after),
    }


def _structure(check: StructureCheck | None) -> Document | None:
    if check is None:
        return None
    return {"same": check.same, "reason": check.reason, "transistors": check.transistors}


def difference_document(difference: Difference) -> Document:
    """Return a comparison of two netlists as the document scripts read.

    Parameters
    ----------
    difference : Difference

    Returns
    -------
    dict
        Plain values only; ``kind`` is ``difference``.
    """
    return _head("difference") | {
        "widths": [_width(width) for width in difference.widths],
        "unchanged": difference.unchanged,
        "same_path_before": _optional_path(difference.same_path_before),
        "same_path_after": _optional_path(difference.same_path_after),
        "only_before": list(difference.only_before),
        "only_after": list(difference.only_after),
        "before": _analysis(difference.before),
        "after": _analysis(difference.after),
    }


def inventory_document(inventory: Inventory) -> Document:
    """Return the contents of a block as the document scripts read.

    Parameters
    ----------
    inventory : Inventory

    Returns
    -------
    dict
        Plain values only; ``kind`` is ``circuit``.
    """
    notices: Document = {"notices": [notice_document(notice) for notice in inventory.notices]}
    return _head("circuit") | inventory_body(inventory) | notices


def simulation_document(simulation: Simulation) -> Document:
    """Return a simulation as the document scripts read.

    Parameters
    ----------
    simulation : Simulation

    Returns
    -------
    dict
        Plain values only; ``kind`` is ``simulation``.
    """
    notices: Document = {"notices": [notice_document(notice) for notice in simulation.notices]}
    process: Document = {"process": yardstick_document(simulation.before.analysis.yardstick)}
    return _head("simulation") | process | simulation_body(simulation) | notices


def fit_document(fit: Fit) -> Document:
    """Return a fitted process as the document scripts read.

    Parameters
    ----------
    fit : Fit

    Returns
    -------
    dict
        Plain values only; ``kind`` is ``fit``. Constants have the units of the process file.
    """
    notices: Document = {"notices": [notice_document(notice) for notice in fit.notices]}
    return _head("fit") | fit_body(fit) | notices


def deck_document(deck: Deck) -> Document:
    """Return what a measuring deck measures as the document scripts read.

    Parameters
    ----------
    deck : Deck

    Returns
    -------
    dict
        Plain values only; ``kind`` is ``deck``.
    """
    return _head("deck") | {
        "output": str(deck.output),
        "table": str(deck.table_output),
        "cells": list(deck.cells),
        "arcs": deck.arcs,
        "measurements": deck.measurements,
        "notices": [notice_document(notice) for notice in deck.notices],
    }


def to_json(document: Mapping[str, JsonValue]) -> str:
    """Return a document as JSON text in pure ASCII, with a final newline.

    Bytes of a name that are not UTF-8 stand as escaped lone surrogates, which Python reads back as
    they were.

    Parameters
    ----------
    document : mapping

    Returns
    -------
    str
        The same text for the same document on any machine.

    Raises
    ------
    ValueError
        If a number is not finite; no result may hold such a number.
    """
    return json.dumps(document, indent=2, allow_nan=False) + "\n"


def _head(kind: str) -> Document:
    return {"program": "evenstage", "format": FORMAT, "kind": kind}


def _analysis(analysis: Analysis) -> Document:
    counts = analysis.counts
    return {
        "source": analysis.source,
        "top": analysis.top,
        "process": yardstick_document(analysis.yardstick),
        "counts": {
            "devices": counts.devices,
            "nets": counts.nets,
            "gates": counts.gates,
            "stages": counts.stages,
        },
        "total_width_m": analysis.total_width,
        "switched_cap_f": analysis.switched_cap,
        "worst_transition_s": analysis.worst_transition,
        "input_caps": [{"net": net, "cap_f": cap} for net, cap in analysis.input_caps],
        "notices": [notice_document(notice) for notice in analysis.notices],
        "paths": [path_document(path) for path in analysis.paths],
        "false_paths": [path_document(path) for path in analysis.false_paths],
        "ends": [end_document(end) for end in analysis.ends],
    }


def yardstick_document(yardstick: Yardstick) -> Document:
    """Return a unit inverter as plain values."""
    return {
        "name": yardstick.process,
        "tau_s": yardstick.tau,
        "p_inv": yardstick.p_inv,
        "fo4_s": yardstick.fo4,
        "input_cap_f": yardstick.input_cap,
        "charge_rise": yardstick.charge_rise,
        "charge_fall": yardstick.charge_fall,
        "transition_rise_s": yardstick.transition_rise,
        "transition_fall_s": yardstick.transition_fall,
    }


def _optional_path(path: Path | None) -> Document | None:
    return None if path is None else path_document(path)


def path_document(path: Path) -> Document:
    """Return a path as plain values."""
    return {
        "from": path.start,
        "from_edge": path.start_edge,
        "from_arrival_s": path.start_arrival,
        "to": path.end,
        "edge": path.edge,
        "corner": path.corner,
        "delay_s": path.delay,
        "charged_delay_s": path.charged_delay,
        "required_s": path.required,
        "logical_effort": path.logical_effort,
        "branching_effort": path.branching_effort,
        "electrical_effort": path.electrical_effort,
        "path_effort": path.path_effort,
        "parasitic_delay": path.parasitic_delay,
        "best_stage_effort": path.best_stage_effort,
        "best_stage_count": path.best_stage_count,
        "least_delay_s": path.least_delay,
        "vector": _vector(path.vector),
        "stages": [_stage(stage) for stage in path.stages],
    }


def _vector(vector: PathVector | None) -> Document | None:
    if vector is None:
        return None
    held: list[JsonValue] = [{"net": net, "level": int(level)} for net, level in vector.held]
    return {"verdict": vector.verdict, "held": held, "reason": vector.reason}


def _stage(stage: Stage) -> Document:
    return {
        "instance": stage.instance,
        "through": list(stage.through),
        "subcircuit": stage.subcircuit,
        "function": stage.function,
        "input": stage.input,
        "output": stage.output,
        "edge": stage.edge,
        "arrival_s": stage.arrival,
        "delay_s": stage.delay,
        "charged_delay_s": stage.charged_delay,
        "transition_s": stage.transition,
        "logical_effort": stage.logical_effort,
        "electrical_effort": stage.electrical_effort,
        "branching_effort": stage.branching_effort,
        "stage_effort": stage.stage_effort,
        "parasitic_delay": stage.parasitic_delay,
        "input_cap_f": stage.input_cap,
        "load_cap_f": stage.load_cap,
        "on_path_cap_f": stage.on_path_cap,
        "self_cap_f": stage.self_cap,
        "width_m": stage.width,
        "wire_delay_s": stage.wire_delay,
        "wire_cap_f": stage.wire_cap,
        "effective_cap_f": stage.effective_cap,
        "side_branches": [_side_branch(branch) for branch in stage.side_branches],
    }


def _side_branch(branch: SideBranch) -> Document:
    return {"instance": branch.instance, "pin": branch.pin, "cap_f": branch.cap}


def end_document(end: PathEnd) -> Document:
    """Return a path end as plain values."""
    return {
        "net": end.net,
        "edge": end.edge,
        "delay_s": end.delay,
        "charged_delay_s": end.charged_delay,
        "required_s": end.required,
        "why": end.why,
    }


def notice_document(notice: Notice) -> Document:
    """Return a notice as plain values."""
    return {
        "code": notice.code,
        "message": notice.message,
        "place": notice.place,
        "names": list(notice.names),
    }


def _change(change: Change) -> Document:
    return {
        "card": change.card,
        "file": change.file,
        "line": change.line,
        "instance": change.instance,
        "occurrences": change.occurrences,
        "parameter": change.parameter,
        "old_m": change.old,
        "new_m": change.new,
        "factor": change.factor,
        "alone_s": change.alone,
        "last_s": change.last,
        "why": change.why,
    }


def _hold(hold: StageHold) -> Document:
    return {"instance": hold.instance, "hold": hold.hold}


def _width(width: WidthDifference) -> Document:
    return {
        "instance": width.instance,
        "card": width.card,
        "model": width.model,
        "before_m": width.before,
        "after_m": width.after,
        "factor": width.after / width.before if width.before and width.after else None,
    }
