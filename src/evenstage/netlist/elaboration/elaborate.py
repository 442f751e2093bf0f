"""From cards to the flat columns of one block."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from evenstage.errors import ElaborationError, Notice
from evenstage.netlist.collection import without_collection
from evenstage.netlist.devices import Devices, Wires
from evenstage.netlist.elaboration.extent import check_extent, check_templates
from evenstage.netlist.elaboration.flatten import flatten, ranges, starts_of
from evenstage.netlist.elaboration.geometry import Drawn, geometry
from evenstage.netlist.elaboration.library import Library
from evenstage.netlist.elaboration.mistakes import Mistakes
from evenstage.netlist.elaboration.nets import Joints, NetNames
from evenstage.netlist.elaboration.template import column_of
from evenstage.netlist.elaboration.tops import AmbiguousTopError, choose_top
from evenstage.netlist.elaboration.wires import find_nodes
from evenstage.netlist.wording import counted, listed
from evenstage.process.infer import infer_process
from evenstage.progress import tell

if TYPE_CHECKING:
    from collections.abc import Iterable, Sequence

    from evenstage.brief import Brief
    from evenstage.netlist.devices import FloatArray, IntArray
    from evenstage.netlist.elaboration.flatten import Indices
    from evenstage.netlist.elaboration.template import Key, Template
    from evenstage.netlist.elaboration.wires import Nodes
    from evenstage.netlist.netlist import Netlist
    from evenstage.process.process import Process

_OTHERS = {"d": "diode", "q": "bipolar transistor", "l": "inductor", "i": "current source"}


def elaborate(
    netlist: Netlist,
    top: str | None = None,
    process: Process | None = None,
    brief: Brief | None = None,
) -> Devices:
    """Lay one block out flat.

    Parameters
    ----------
    netlist : Netlist
        The cards.
    top : str, optional
        The subcircuit; None: that of the brief, else the top level of the text if it holds
        transistors or calls, else the one nobody calls.
    process : Process, optional
        The transistor types; None: what the ``.model`` cards and names say.
    brief : Brief, optional
        May name the block.

    Raises
    ------
    ElaborationError
        If the cards do not fit together.

    Examples
    --------
    >>> from evenstage import read
    >>> folder = "sample_netlists/pad_predriver"
    >>> devices = elaborate(read(f"{folder}/netlist.sp"))
    >>> devices.top, len(devices), [devices.net_names[port] for port in devices.ports]
    ('predrv', 30, ['d', 'oe', 'pg', 'ng', 'vdd', 'vss'])
    """
    if process is None:
        facts = ((model.name, model.kind, model.values) for model in netlist.models.values())
        process = infer_process(facts)
    library = Library(netlist, process)
    try:
        name = choose_top(netlist, top, brief)
    except AmbiguousTopError as error:
        # A misspelt call leaves the subcircuit it means uncalled; that is the better message.
        for candidate in error.names:
            library.reachable(candidate.lower())
        raise
    with without_collection():
        try:
            return _Block(library, name).devices()
        except RecursionError:
            message = "wrapped transistors are nested too deeply"
            raise ElaborationError(message, code="too-large") from None


class _Block:
    """One block on its way from templates to columns."""

    def __init__(self, library: Library, name: str) -> None:
        self._library = library
        self._netlist = library.netlist
        self._definitions = library.reachable(name, going_on=True)
        self._templates, callees = _bound(library, name, self._definitions)
        if len(library.mistakes):
            self._add_wrong_sizes(library.mistakes)
        library.mistakes.check()
        check_extent(self._templates, callees)
        self._global_names = self._globals_used()
        self._flat = flatten(self._templates, callees, self._words(self._global_names))
        self._names = self._named(np.arange(len(self._flat.slot_of_net), dtype=np.int32))
        ports = self._flat.net[: self._templates[0].outline.ports]
        self._ports: tuple[int, ...] = tuple(ports.tolist())
        self._notices: list[Notice] = []
        self._nodes: Nodes | None = None
        self._members: Indices = np.zeros(0, np.int32)
        self._net, self._kept = self._joined()

    def _add_wrong_sizes(self, mistakes: Mistakes) -> None:
        """Add the mistakes in sizes that are known to those there are already."""
        sizes = Mistakes(self._netlist.sources)
        with sizes.collecting():
            geometry(self._drawn(), self._netlist, self._library.process)
        for error in sizes.errors():
            # Of a card that was not understood nobody need hear that it has no width.
            if error.code != "missing-width" or not mistakes.any_within(error.span):
                mistakes.add(error)

    def _globals_used(self) -> tuple[str, ...]:
        """Return the global nets that occur, ``0`` among them, in the order of declaration."""
        names = tuple(dict.fromkeys(("0", *self._netlist.global_names)))
        words = self._words(names)
        met = np.zeros(len(words), np.bool_)
        for outline in {id(t.outline): t.outline for t in self._templates}.values():
            met |= np.isin(words, outline.nets.words)
        return tuple(name for name, occurs in zip(names, met.tolist(), strict=True) if occurs)

    def _words(self, names: Sequence[str]) -> IntArray:
        return np.array(list(map(self._netlist.cards.word_number, names)), np.int32)

    def _spread(self, counts: Iterable[int]) -> tuple[Indices, Indices]:
        """Return instance and row of every copy of what templates hold ``counts`` of."""
        starts = starts_of(list(counts))
        each = (starts[1:] - starts[:-1])[self._flat.template]
        instance = np.repeat(np.arange(len(each), dtype=np.int32), each)
        return instance, ranges(starts[self._flat.template], each).astype(np.int32)

    # Resistors.

    def _joined(self) -> tuple[Indices, Indices]:
        """Join the nets that resistors connect.

        Returns
        -------
        net : IntArray
            The final net of each net of the layout.
        kept : IntArray
            The net of the layout each final net is named after.
        """
        rows = [template.outline.resistors for template in self._templates]
        count = len(self._flat.slot_of_net)
        instance, row = self._spread(len(r) for r in rows)
        if len(row) == 0:
            return np.arange(count, dtype=np.int32), np.arange(count, dtype=np.int32)
        local = np.concatenate([r.nets for r in rows], axis=1)[:, row]
        pairs = self._flat.nets_of(instance, local)
        joints = Joints(pairs, count, len(self._global_names), frozenset(self._ports), self._names)
        cards = np.concatenate([r.card for r in rows])[row]
        along = joints.joined
        wires = "taken as wires: the nets at their ends are one"
        apart = "left out: they would join a high and a low supply"
        self._note(cards[along], "resistor-joined", "resistor", wires)
        self._note(cards[~along], "resistor-left-out", "resistor", apart)
        chosen = joints.representative
        kept = np.flatnonzero(chosen == np.arange(count)).astype(np.int32)
        net = np.searchsorted(kept, chosen).astype(np.int32)
        values = np.concatenate([template.resistance for template in self._templates])[row]
        unknown = cards[along & ~(values >= 0)]
        nothing = "without a value taken as no resistance at all"
        self._note(unknown, "resistor-unknown", "resistor", nothing)
        self._members = np.unique(pairs[:, along])
        nodes = find_nodes(pairs[:, along], (values / self._flat.multiplier[instance])[along], net)
        self._nodes = nodes if len(nodes.net) else None
        return net, kept

    def _note(self, cards: Indices, code: str, noun: str, what: str) -> None:
        """Take a notice about some cards, if there are any."""
        numbers = np.unique(cards).tolist()
        if numbers:
            names = self._card_names(numbers)
            message = f"{counted(len(names), noun)} {what} ({listed(names)})"
            place = self._netlist.card(numbers[0]).span.place
            self._notices.append(Notice(code, message, place, names))

    def _wires(self, instance: Indices, row: Indices, pins: Indices) -> Wires | None:
        """Return the resistance along nets, and the nodes that everything hangs on.

        Parameters
        ----------
        instance, row : Indices, shape (n,)
            Of each transistor.
        pins : Indices, shape (4, rows)
            Local nets of each row.
        """
        nodes = self._nodes
        if nodes is None:
            return None
        of_layout = nodes.of_layout
        drain, gate, source = (
            _ids(of_layout[self._flat.nets_of(instance, pin[row])]) for pin in pins[:3]
        )
        rows = [template.outline.capacitors for template in self._templates]
        held, which = self._known_capacitors()
        local = np.concatenate([r.nets for r in rows], axis=1)[:, which]
        return Wires(
            net=_ids(nodes.net),
            ends=_ids(nodes.ends),
            resistance=_frozen(nodes.resistance),
            head=_ids(of_layout[self._kept]),
            drain=drain,
            gate=gate,
            source=source,
            capacitor=_ids(of_layout[self._flat.nets_of(held, local)]),
        )

    def _card_names(self, numbers: Iterable[int]) -> tuple[str, ...]:
        return tuple(self._netlist.cards.full_names(numbers))

    def _nets_of(self, instance: Indices, local: Indices) -> IntArray:
        """Return the final nets of local nets of instances."""
        return _ids(self._net[self._flat.nets_of(instance, local)])

    # The result.

    def devices(self) -> Devices:
        """Return the columns."""
        flat, templates = self._flat, self._templates
        instance, row = self._spread(len(template.card) for template in templates)
        drawn = self._drawn()
        sizes = geometry(drawn, self._netlist, self._library.process)
        nets = np.concatenate([template.nets for template in templates], axis=1)
        drain, gate, source, bulk = (self._nets_of(instance, pin[row]) for pin in nets)
        calls = np.concatenate([template.multiplier for template in templates])
        with np.errstate(over="ignore"):
            multiplier = (sizes.multiplier * calls)[row] * flat.multiplier[instance]
        wires = self._wires(instance, row, nets)
        del nets, calls
        if not np.isfinite(multiplier).all():
            message = "the multipliers along one instance path multiply to infinity"
            raise ElaborationError(message, code="bad-multiplier")
        capacitors = self._capacitors()
        subcircuits, index = self._subcircuits()
        return Devices(
            netlist=self._netlist,
            top=templates[0].outline.subcircuit.name,
            drain=drain,
            gate=gate,
            source=source,
            bulk=bulk,
            width=_frozen(sizes.width[row]),
            length=_frozen(sizes.length[row]),
            multiplier=_frozen(multiplier),
            fingers=_frozen(sizes.fingers[row]),
            drain_area=_frozen(sizes.drain_area[row]),
            source_area=_frozen(sizes.source_area[row]),
            drain_edge=_frozen(sizes.drain_edge[row]),
            source_edge=_frozen(sizes.source_edge[row]),
            model=_ids(drawn.model[row]),
            card=_ids(drawn.card[row]),
            instance=_ids(instance),
            models=self._library.models.models,
            capacitor_nets=capacitors[0],
            capacitance=capacitors[1],
            capacitor_card=capacitors[2],
            capacitor_instance=capacitors[3],
            instance_parent=_ids(flat.parent),
            instance_card=_ids(flat.card),
            instance_subcircuit=_ids(index[flat.template]),
            subcircuits=subcircuits,
            net_names=self._named(self._kept),
            ports=tuple(int(self._net[port]) for port in self._ports),
            global_nets=frozenset(self._net[: len(self._global_names)].tolist()),
            source_nets=self._sources(),
            notices=(*self._notices, *sizes.notices, *self._card_notices()),
            wires=wires,
            joined_names=self._named(self._members),
            joined_net=_ids(self._net[self._members]),
        )

    def _named(self, nets: Indices) -> NetNames:
        """Return the names of some nets of the layout."""
        local = [template.outline.nets for template in self._templates]
        return NetNames(self._netlist, self._flat, local, self._global_names, nets)

    def _drawn(self) -> Drawn:
        templates = self._templates
        names = dict.fromkeys(name for template in templates for name in template.columns)
        return Drawn(
            columns={name: column_of(templates, name, slice(None)) for name in names},
            card=np.concatenate([template.card for template in templates]),
            model=np.concatenate([template.model for template in templates]),
            models=self._library.models.models,
        )

    def _subcircuits(self) -> tuple[tuple[str, ...], IntArray]:
        """Return the names of the definitions and, for each template, the index of its own."""
        names = [template.outline.subcircuit.name for template in self._templates]
        index = {name: i for i, name in enumerate(dict.fromkeys(names))}
        return tuple(index), np.array([index[name] for name in names], np.int32)

    def _capacitors(self) -> tuple[IntArray, FloatArray, IntArray, IntArray]:
        """Return nets, values, cards and instances of the C cards that have a value."""
        rows = [template.outline.capacitors for template in self._templates]
        values = np.concatenate([template.capacitance for template in self._templates])
        cards = np.concatenate([r.card for r in rows])
        unknown = cards[~(values >= 0)]
        self._note(unknown, "capacitor-unknown", "capacitor", "without a value left out")
        instance, row = self._known_capacitors()
        local = np.concatenate([r.nets for r in rows], axis=1)[:, row]
        value = values[row] * self._flat.multiplier[instance]
        return self._nets_of(instance, local), _frozen(value), _ids(cards[row]), _ids(instance)

    def _known_capacitors(self) -> tuple[Indices, Indices]:
        """Return instance and row of every C card that has a value."""
        instance, row = self._spread(len(t.outline.capacitors) for t in self._templates)
        values = np.concatenate([template.capacitance for template in self._templates])
        known = values[row] >= 0
        return instance[known], row[known]

    def _sources(self) -> tuple[tuple[int, int, float], ...]:
        """Return nets and DC value of the V cards of the block's own level."""
        outline = self._templates[0].outline
        scope = self._library.scope((outline.subcircuit.name.lower(), ()))
        found = []
        for number, *ends in outline.sources:
            card = self._netlist.card(number)
            plus, minus = self._net[self._flat.net[ends]].tolist()
            parameter = card.value or card.parameter("dc")
            value = 0.0 if parameter is None else scope.of(parameter)
            found.append((plus, minus, value))
        return tuple(found)

    def _card_notices(self) -> list[Notice]:
        """Return what was assumed about cards, and which were not understood."""
        by_letter: dict[str, list[int]] = {}
        for name in self._definitions:
            outline = self._library.outline(name)
            for letter, numbers in outline.others.items():
                by_letter.setdefault(letter, []).extend(numbers)
            if outline is not self._templates[0].outline:
                by_letter.setdefault("v", []).extend(v for v, *_ in outline.sources)
        notices = self._library.notices(self._definitions)
        notices += self._pin_notices()
        for letter, cards in sorted(by_letter.items()):
            if cards:
                names = self._card_names(cards)
                what = _OTHERS.get(letter, f"'{letter}' card")
                what = "voltage source inside the block" if letter == "v" else what
                message = f"{counted(len(names), what)} left out, not understood ({listed(names)})"
                place = self._netlist.card(cards[0]).span.place
                notices.append(Notice("not-understood", message, place, names))
        return notices

    def _pin_notices(self) -> list[Notice]:
        """Return a notice if transistors have more than four nets."""
        outlines = [self._library.outline(name) for name in self._definitions]
        cards = np.concatenate([outline.further_pins for outline in outlines]).tolist()
        if not cards:
            return []
        names = self._card_names(cards)
        message = (
            f"{counted(len(cards), 'transistor')} with more than four nets: the first four are "
            f"taken as drain, gate, source and bulk, the others load nothing ({listed(names)})"
        )
        return [Notice("further-pins", message, self._netlist.card(cards[0]).span.place, names)]


def _bound(
    library: Library, name: str, definitions: Sequence[str]
) -> tuple[list[Template], list[list[int]]]:
    """Return all templates of a block, callers first, and for each the indices of its callees."""
    by_name: dict[str, dict[Key, Template]] = {definition: {} for definition in definitions}
    by_name[name][name, ()] = library.template((name, ()))
    count = 1
    for done, definition in enumerate(definitions):
        tell("laying out", done / len(definitions))
        for template in by_name[definition].values():
            for callee in template.callees:
                if callee not in by_name[callee[0]]:
                    by_name[callee[0]][callee] = library.template(callee)
                    count += 1
        check_templates(count, len(library.netlist))
    keys = [key for definition in definitions for key in by_name[definition]]
    index = {key: i for i, key in enumerate(keys)}
    templates = [by_name[key[0]][key] for key in keys]
    return templates, [[index[callee] for callee in t.callees] for t in templates]


def _ids(values: Indices) -> IntArray:
    ids = values.astype(np.int32, copy=False)
    ids.flags.writeable = False
    return ids


def _frozen(values: FloatArray) -> FloatArray:
    frozen = values.astype(np.float64, copy=False)
    frozen.flags.writeable = False
    return frozen
