"""Devices to a circuit: which groups are gates of what kind, and what ends at them."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from evenstage.brief import Brief
from evenstage.circuit.apart import set_apart
from evenstage.circuit.assumed import settled
from evenstage.circuit.carrying import carry
from evenstage.circuit.circuit import STORED, Circuit, NotUnderstood
from evenstage.circuit.context import named_clocks
from evenstage.circuit.domains import domain_notices
from evenstage.circuit.groups import group
from evenstage.circuit.names import NAMES_MAX, device_names
from evenstage.circuit.ownership import leaves, owners
from evenstage.circuit.sensing import with_sense_amplifiers
from evenstage.circuit.sorting import sort_groups
from evenstage.circuit.stage_notices import stage_notices
from evenstage.circuit.stage_sorting import sort_stages
from evenstage.circuit.stage_tables import AlikeStages
from evenstage.circuit.storage.dynamic import with_dynamic
from evenstage.circuit.storage.elements import TOO_LARGE, find_storage
from evenstage.circuit.storage.keepers import without_kept
from evenstage.circuit.storage.reading import OSCILLATES
from evenstage.circuit.strength import ratio_notices
from evenstage.circuit.supplies import find_supplies
from evenstage.circuit.tables import AlikeGates
from evenstage.circuit.wiring import find_wiring
from evenstage.errors import CircuitError, Notice
from evenstage.netlist.collection import without_collection
from evenstage.netlist.wording import counted
from evenstage.pattern import select
from evenstage.process.unit import unit_inverter
from evenstage.progress import tell

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.circuit.gate import GateForm
    from evenstage.circuit.groups import AlikeGroups
    from evenstage.circuit.stage_form import StageForm
    from evenstage.circuit.storage.elements import Storage
    from evenstage.netlist.devices import Devices, IntArray
    from evenstage.process.process import Process

_DEFAULT_FANOUT = 4


def recognise(
    devices: Devices, process: Process | None = None, brief: Brief | None = None
) -> Circuit:
    """Recognise the gates of a block.

    Groups of one structure are recognised once, however often they occur. What is no known kind is
    kept as `NotUnderstood`, loads what drives it, and is named in a notice.

    Parameters
    ----------
    devices : Devices
    process : Process, optional
        None: what the ``.model`` cards of the netlist tell, else the built-in generic one, with a
        notice; kinds and functions do not depend on it. Devices that were laid out with a process
        want the same here.
    brief : Brief, optional
        Its supplies and outputs are used here.

    Raises
    ------
    CircuitError
        ``no-supply``, ``no-transistors``, or ``process-wanted`` where devices were laid out with
        transistor types that their netlist alone does not tell.
    SettingsError
        Where a pattern of the brief fits no net.

    Examples
    --------
    >>> from evenstage import elaborate, read, read_brief, read_process
    >>> folder = "sample_netlists/pad_predriver"
    >>> process = read_process(f"{folder}/process.toml")
    >>> brief = read_brief(f"{folder}/brief.toml")
    >>> devices = elaborate(read(f"{folder}/netlist.sp"), None, process, brief)
    >>> circuit = recognise(devices, process, brief)
    >>> len(circuit), circuit.gate_name(1), circuit.gate_kind(1), circuit.gate_function(1)
    (13, 'xp0', 'static gate', '!(a & b)')
    """
    if not len(devices):
        raise CircuitError(
            f"'{devices.top or 'the top level'}' holds no transistors", code="no-transistors"
        )
    tell("recognising")
    with without_collection():
        return _recognised(devices, process, brief)


def _recognised(devices: Devices, process: Process | None, brief: Brief | None) -> Circuit:
    supplies = find_supplies(devices, brief)
    apart, levels = set_apart(devices, supplies)
    logic = np.ones(len(devices), bool)
    for part in apart:
        logic[part.devices] = False
    clocks = named_clocks(devices, brief)
    found = sort_groups(devices, group(devices, supplies, logic, levels), clocks)
    more = sort_stages(devices, found, brief, clocks)
    alike, stages = _numbered(found.gates, more.stages)
    strange = _not_understood(more.strange)
    output = np.empty(sum(len(some.gates) for some in alike), np.int32)
    for some in alike:
        output[some.gates] = some.nets[:, some.form.output]
    process = _with_unit(process or _assumed(devices), devices)
    owner = owners(devices, alike)
    loops = find_storage(devices, found.gates, [some for _, some in found.strange])
    circuit = Circuit(
        devices=devices,
        process=process,
        supplies=supplies,
        alike=alike,
        stages=stages,
        drive=np.zeros(len(devices.net_names)),
        not_understood=strange,
        apart=apart,
        storage=with_dynamic(
            with_sense_amplifiers(without_kept(loops, devices, alike, stages), stages),
            devices,
            alike,
            stages,
            clocks,
        ),
        outside_cap=np.zeros(len(devices.net_names)),
        gate_output=output,
        gate_instance=owner,
        gate_is_leaf=leaves(devices, alike, owner),
        ends={},
        notices=(),
        coupling=brief.coupling if brief else Brief().coupling,
    )
    if alike:
        wiring = find_wiring(devices, circuit.gate_of_device, circuit.driven, supplies.is_supply)
        circuit = carry(circuit, replace(circuit, wiring=wiring))
    return _complete(circuit, brief)


def in_process(circuit: Circuit, process: Process, brief: Brief | None = None) -> Circuit:
    """Return the gates of a block in another process, as if recognised there.

    Parameters
    ----------
    circuit : Circuit
    process : Process
        With transistor types that cover the same models in the same order.
    brief : Brief, optional
        That of the circuit.
    """
    moved = replace(
        circuit,
        process=_with_unit(process, circuit.devices),
        outside_cap=np.zeros(len(circuit.devices.net_names)),
        ends={},
    )
    return _complete(carry(circuit, moved), brief)


def _complete(circuit: Circuit, brief: Brief | None) -> Circuit:
    """Say what was noticed, and find where paths end."""
    devices = circuit.devices
    notices = (
        *devices.notices,
        *circuit.process.notices,
        *_strange_notices(devices, circuit.not_understood),
        *_loop_notices(devices, circuit.storage),
        *ratio_notices(circuit),
        *stage_notices(devices, circuit.stages),
        *domain_notices(circuit),
    )
    circuit = carry(circuit, replace(circuit, notices=notices))
    return _with_surroundings(circuit, brief) if circuit.alike else circuit


def _numbered(
    gates: Sequence[tuple[GateForm, AlikeGroups]], stages: Sequence[tuple[StageForm, AlikeGroups]]
) -> tuple[tuple[AlikeGates, ...], tuple[AlikeStages, ...]]:
    """Give every gate, those that are parts of stages too, a number: its rank by first device."""
    parts = [(part, columns, some) for form, some in stages for part, columns in _parts(form)]
    every = [(form, some.devices, some.nets) for form, some in gates]
    every += [(part, some.devices[:, list(columns)], some.nets) for part, columns, some in parts]
    if not every:
        return (), ()
    first = np.concatenate([devices.min(axis=1) for _, devices, _ in every])
    number = np.empty(len(first), np.int32)
    number[np.argsort(first, kind="stable")] = np.arange(len(first))
    ends = np.cumsum([len(devices) for _, devices, _ in every])
    numbers = np.split(number, ends[:-1])
    alike = []
    for (form, devices, nets), mine in zip(every, numbers, strict=True):
        order = np.argsort(mine)
        alike.append(AlikeGates(form, mine[order], devices[order], nets[order]))
    of_parts, result = iter(numbers[len(gates) :]), []
    for stage, some in stages:
        mine = np.stack([next(of_parts) for _ in stage.parts], axis=1)
        result.append(AlikeStages(stage, mine, some.devices, some.nets))
    return tuple(alike), tuple(result)


def _parts(form: StageForm) -> Iterator[tuple[GateForm, tuple[int, ...]]]:
    return zip(form.parts, form.columns, strict=True)


def _not_understood(strange: Sequence[tuple[str, AlikeGroups]]) -> tuple[NotUnderstood, ...]:
    every = [NotUnderstood(some.devices, reason) for reason, some in strange]
    return tuple(sorted(every, key=lambda some: int(some.devices[0, 0])))


def _strange_notices(devices: Devices, strange: Sequence[NotUnderstood]) -> list[Notice]:
    """Make one notice per reason, naming the devices."""
    by_reason: dict[str, list[IntArray]] = {}
    for some in strange:
        by_reason.setdefault(some.reason, []).append(some.devices)
    notices = []
    for reason, parts in by_reason.items():
        every = np.concatenate([part.ravel() for part in parts])
        count = sum(len(part) for part in parts)
        groups = "one group" if count == 1 else f"{count} groups"
        notices.append(
            Notice(
                "not-understood",
                f"{groups} of transistors not understood, {reason}; timed as loads only",
                devices.netlist.card(int(devices.card[every[0]])).span.place,
                device_names(devices, every),
            )
        )
    return notices


def _loop_notices(devices: Devices, storage: Storage) -> list[Notice]:
    """Name the loops that hold nothing and are cut."""
    told = {
        OSCILLATES: ("loop-oscillates", "has no stable state, as in a ring oscillator"),
        TOO_LARGE: ("loop-not-read", "is too large to be read"),
    }
    notices = []
    for element in storage.elements:
        if element.kind in told:
            code, what = told[element.kind]
            nets = [net for loop in element.loops for net in loop.nets]
            names = tuple(devices.net_names[net] for net in nets[:NAMES_MAX])
            message = f"a loop of {counted(len(nets), 'net')} {what}; it is cut where a path enters"
            notices.append(Notice(code, message, names=names))
    return notices


def _with_surroundings(circuit: Circuit, brief: Brief | None) -> Circuit:
    """Take in what the brief says of the outside, and find where paths end."""
    drive = np.zeros(len(circuit.devices.net_names))
    sources = [some.nets[:, list(some.form.sources)].ravel() for some in circuit.stages]
    nets = np.unique(np.concatenate([np.zeros(0, np.int32), *sources]))
    names = [circuit.devices.net_names[net] for net in nets.tolist()]
    for some in brief.inputs if brief else ():
        fits = [any(pattern.fits(name) for pattern in some.nets) for name in names]
        drive[nets[np.array(fits, bool)]] = some.drive
    return _with_ends(carry(circuit, replace(circuit, drive=drive)), brief)


def _assumed(devices: Devices) -> Process:
    """Return the process that the netlist itself tells; its types must be those of the devices."""
    process = settled(devices.netlist, devices)
    told = [some.polarity for some in process.transistors]
    for model in devices.models:
        if told[model.type_index : model.type_index + 1] != [model.polarity]:
            raise CircuitError(
                f"the model '{model.name}' is type {model.type_index + 1} of the process that the "
                "netlist was laid out with, and the netlist alone tells no such type; give "
                "recognise that process too",
                code="process-wanted",
            )
    return process


def _with_unit(process: Process, devices: Devices) -> Process:
    """Fill in the unit inverter: the smallest n width where the process does not say."""
    is_n = np.array([model.polarity == "n" for model in devices.models], bool)
    widths = devices.width[is_n[devices.model]]
    smallest = float(widths.min()) if len(widths) else float(devices.width.min())
    width_n, width_p = unit_inverter(process, smallest)
    return replace(process, unit_width=width_n, unit_ratio=width_p / width_n)


def _with_ends(circuit: Circuit, brief: Brief | None) -> Circuit:
    """Find where paths end and what hangs there."""
    devices = circuit.devices
    outputs = brief.outputs if brief else ()
    driven = circuit.driven
    names = [devices.net_names[net] for net in driven.tolist()] if outputs else []
    outside = np.full(len(devices.net_names), np.nan)
    ends = _natural_ends(circuit)
    for output in outputs:
        chosen = driven[select(output.nets, names, "driven net")]
        ends.update(dict.fromkeys(chosen.tolist(), "output"))
        if output.load is not None:
            outside[chosen] = output.load
    shown = np.array([net for net, why in ends.items() if why == "output"], np.int32)
    bare = shown[np.isnan(outside[shown]) & (circuit.net_cap[shown] == 0)]
    outside[bare] = _DEFAULT_FANOUT * _unit_input(circuit.process)
    each = "one output; it gets" if len(bare) == 1 else f"{len(bare)} outputs; each gets"
    notice = Notice(
        "default-load",
        f"nothing loads {each} {_DEFAULT_FANOUT} unit inverters",
        names=tuple(devices.net_names[net] for net in bare[:NAMES_MAX].tolist()),
    )
    finished = replace(
        circuit,
        outside_cap=np.nan_to_num(outside),
        ends=dict(sorted(ends.items())),
        notices=(*circuit.notices, notice) if len(bare) else circuit.notices,
    )
    return carry(circuit, finished)


def _natural_ends(circuit: Circuit) -> dict[int, str]:
    """Return driven nets that are ports, load nothing, or enter what was not understood."""
    strange = circuit.strange_cap > 0
    is_output = ~strange
    is_output[circuit.pins.net] = False
    for some in circuit.stages:
        is_output[some.nets[:, list(some.form.unseen)]] = False
    is_output[list(circuit.devices.ports)] = True
    driven = circuit.driven
    stored = np.zeros(len(circuit.devices.net_names), bool)
    for loop in circuit.storage.loops():
        stored[list(loop.nets)] = loop.captures
    entering = driven[strange[driven] & ~is_output[driven]]
    return {
        **dict.fromkeys(driven[is_output[driven]].tolist(), "output"),
        **dict.fromkeys(entering.tolist(), "enters what was not understood"),
        **dict.fromkeys(driven[stored[driven] & ~is_output[driven]].tolist(), STORED),
    }


def _unit_input(process: Process) -> float:
    """Return the input capacitance of the unit inverter, F."""
    n, p = process.first("n"), process.first("p")
    width = process.unit_width or 0.0
    return (
        n.c_gate * width
        + p.c_gate * width * (process.unit_ratio or 0.0)
        + n.c_gate_fixed
        + p.c_gate_fixed
    )
