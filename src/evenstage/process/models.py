"""Process constants from level-1 ``.model`` cards.

A card suffices if it gives VTO, KP or UO, and TOX. What is taken from where:

- ``r_w``: the effective resistance of the saturated transistor, times ln 2.
- ``c_gate``: ``C_ox (L0 - 2 LD)`` plus the overlaps, the drain's counted twice because the drain
  moves against the gate (Miller); ``c_gate_fixed``: CGBO along the channel.
- junction capacitances: CJ and CJSW, averaged over the half of the swing that each edge's 50 %
  delay sees, plus twice the drain overlap; CBD and CBS, where given, in place of CJ.
- ``c_drain``, for cards without areas: a diffusion that reaches 2.5 L0 from the gate, its perimeter
  without the gate's edge, plus twice the drain overlap.
- slopes: an input ramp adds ``(1 + 2v)/6`` of itself to the delay, v = V_T/V_DD; the output's own
  ramp is its 90 to 10 % time for a step over 0.8. The share of a slow input that an output's ramp
  keeps, 0.56, was fitted to simulated chains of level-1 inverters (v from 0.1 to 0.3; delays then
  agree within 4 %).
- ``stack`` is 1: n such transistors in series are one of n times the length.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Final, NamedTuple

from evenstage.errors import Notice
from evenstage.pattern import Pattern
from evenstage.process import level1
from evenstage.process.process import Channel, Junction, Junctions, Polarity, Process, Transistor
from evenstage.process.supply import supply_for_threshold, supply_notice

#: Name, type and parameters by lower-case name (SI values) of one ``.model`` card.
ModelFacts = tuple[str, str, Mapping[str, float]]

#: How far a contacted diffusion reaches from its gate, in channel lengths (common practice).
_DIFFUSION_REACH: Final = 2.5

#: Usual channel length in oxide thicknesses (common practice, no source).
_LENGTH_OVER_OXIDE: Final = 45.0

#: Share of an input ramp that the output ramp keeps; see above.
_CARRY: Final = 0.56

_BIN: Final = re.compile(r"\.\d+$")


@dataclass(frozen=True, slots=True, kw_only=True)
class _Card:
    """What a sufficient level-1 card says; the manual's defaults where it says nothing."""

    pattern: Pattern
    polarity: Polarity
    threshold: float
    kp: float
    modulation: float
    c_ox: float
    lateral: float
    overlap_source: float
    overlap_drain: float
    overlap_bulk: float
    c_drain: float
    c_source: float
    c_area: float
    c_edge: float
    phi: float
    grade_area: float
    grade_edge: float
    body: float
    surface: float


def polarity_of(kind: str) -> Polarity | None:
    """Return the channel type a ``.model`` card's type stands for; None: no MOS transistor."""
    kinds: dict[str, Polarity] = {"nmos": "n", "pmos": "p"}
    return kinds.get(kind.lower())


def model_pattern(name: str) -> Pattern:
    """Return what a model is called on element cards: bins ``nch.1``, ``nch.2`` are one ``nch``."""
    return Pattern(_BIN.sub("", name))


def process_from_models(
    models: Sequence[ModelFacts], supply: float | None = None, length: float | None = None
) -> Process | None:
    """Derive a process from level-1 cards.

    Parameters
    ----------
    models : Sequence of ModelFacts
        All ``.model`` cards; those that do not suffice are passed over.
    supply : float, optional
        V; None: five times the mean threshold, with a notice.
    length : float, optional
        L0, m; None: 45 times the thinnest oxide.

    Returns
    -------
    Process or None
        None unless cards of both polarities suffice at this supply and length.
    """
    cards = [card for facts in models if (card := _card(facts)) is not None]
    if not cards:
        return None
    notices = []
    if supply is None:
        supply = supply_for_threshold(sum(card.threshold for card in cards) / len(cards))
        notices.append(supply_notice(supply, "five times the mean threshold of the model cards"))
    if length is None:
        length = _LENGTH_OVER_OXIDE * level1.OXIDE_PERMITTIVITY / max(c.c_ox for c in cards)
    usable = [card for card in cards if _usable(card, supply, length)]
    if {card.polarity for card in usable} != {"n", "p"}:
        return None
    bare = tuple(card.pattern.text for card in usable if _is_bare(card))
    if bare:
        notices.append(_bare_notice(bare))
    return Process(
        name="level-1 model cards",
        supply=supply,
        transistors=tuple(_transistor(card, supply, length) for card in usable),
        origin="models",
        notices=tuple(notices),
    )


def _bare_notice(names: tuple[str, ...]) -> Notice:
    return Notice(
        "drain-assumed",
        "model cards without CJ and CJSW: a drain is taken to load its net as much as a gate does",
        names=names,
    )


def _card(facts: ModelFacts) -> _Card | None:
    """Return the constants of a card that suffices."""
    name, kind, values = facts
    polarity = polarity_of(kind)
    oxide = values.get("tox", 0.0)
    mobility = values.get("uo", values.get("u0", 0.0))
    sufficient = "vto" in values and oxide > 0 and max(values.get("kp", 0.0), mobility) > 0
    if polarity is None or values.get("level", 1.0) != 1 or not sufficient:
        return None
    grade = values.get("mj", 0.5)
    # What is given for the whole device stands for the bottom of both its junctions.
    replaced = max(values.get("cbd", 0.0), values.get("cbs", 0.0)) > 0
    return _Card(
        pattern=model_pattern(name),
        polarity=polarity,
        threshold=abs(values["vto"]),
        kp=values.get("kp") or level1.transconductance(mobility, oxide),
        modulation=values.get("lambda", 0.0),
        c_ox=level1.oxide_capacitance(oxide),
        lateral=values.get("ld", 0.0),
        overlap_source=values.get("cgso", 0.0),
        overlap_drain=values.get("cgdo", 0.0),
        overlap_bulk=values.get("cgbo", 0.0),
        c_drain=values.get("cbd", 0.0),
        c_source=values.get("cbs", 0.0),
        c_area=0.0 if replaced else values.get("cj", 0.0),
        c_edge=values.get("cjsw", 0.0),
        phi=values.get("pb", 0.8),
        grade_area=grade,
        grade_edge=values.get("mjsw", 0.5),
        body=values.get("gamma", 0.0),
        surface=values.get("phi", 0.6),
    )


def _usable(card: _Card, supply: float, length: float) -> bool:
    """Tell whether the laws hold: it conducts, has a channel, and no constant is negative."""
    overlaps = (card.lateral, card.overlap_source, card.overlap_drain, card.overlap_bulk)
    amounts = (*overlaps, card.c_drain, card.c_source, card.c_area, card.c_edge)
    return (
        0 < card.threshold < 0.9 * supply
        and 0 <= card.modulation * supply < 1
        and length > 2 * card.lateral
        and min(card.phi, card.surface) > 0
        and card.body >= 0
        and min(*amounts, card.grade_area, card.grade_edge) >= 0
    )


def _transistor(card: _Card, supply: float, length: float) -> Transistor:
    channel = length - 2 * card.lateral
    current = level1.saturation_current(card.kp, 1 / channel, supply - card.threshold)
    resistance = math.log(2) * level1.effective_resistance(current, supply, card.modulation)
    v = card.threshold / supply
    drain = _drain(card, supply, length)
    return Transistor(
        models=(card.pattern,),
        polarity=card.polarity,
        length=length,
        r_w=resistance,
        c_gate=_gate(card, channel),
        c_gate_fixed=card.overlap_bulk * channel,
        c_drain=drain.per_width or _gate(card, channel),
        c_drain_fixed=drain.fixed,
        stack=1.0,
        slope=level1.ramp_delay_share(v),
        shape=_ramp(card, supply, channel) / resistance,
        shape_carry=_CARRY,
        junctions=drain.junctions,
        channel=Channel(
            threshold=card.threshold,
            alpha=2.0,
            current=current,
            saturation=supply - card.threshold,
            modulation=card.modulation,
            body=card.body,
            phi=card.surface,
            overlap_source=card.overlap_source,
            overlap_drain=card.overlap_drain,
            overlap_count=2.0,
        ),
    )


def _gate(card: _Card, channel: float) -> float:
    """Return the gate capacitance per width."""
    return card.c_ox * channel + card.overlap_source + 2 * card.overlap_drain


class _Drain(NamedTuple):
    """Capacitance of a drain per width and per device, and what makes it of areas."""

    per_width: float
    fixed: float
    junctions: Junctions | None


def _drain(card: _Card, supply: float, length: float) -> _Drain:
    """Return what a card says of drains; nothing where it says nothing."""
    if _is_bare(card):
        return _Drain(0.0, 0.0, None)
    near, far = _junction(card, 0.0, supply / 2), _junction(card, supply / 2, supply)
    rise, fall = (near, far) if card.polarity == "n" else (far, near)
    whole, reach = _junction(card, 0.0, supply), _DIFFUSION_REACH * length
    return _Drain(
        whole.area * reach + whole.edge + whole.overlap,
        2 * reach * whole.edge + whole.drain_fixed,
        Junctions(rise=rise, fall=fall),
    )


#: Names that later levels have for parameters of level 1 with the same meaning and unit.
_LATER_NAMES: Final = {
    "tox": ("tox", "toxe"),
    "cgso": ("cgso",),
    "cgdo": ("cgdo",),
    "cj": ("cj", "cjs"),
    "cjsw": ("cjsw", "cjsws"),
    "pb": ("pb", "pbs"),
    "mj": ("mj", "mjs"),
    "mjsw": ("mjsw", "mjsws"),
}


def with_capacitances(
    transistor: Transistor, facts: ModelFacts, supply: float
) -> tuple[Transistor, tuple[str, ...]]:
    """Return a transistor with the capacitances of a card of any level, and what was taken.

    Oxide, overlaps and junctions mean the same at every level; all else stays as it is.

    Parameters
    ----------
    transistor : Transistor
        Whose other constants count.
    facts : ModelFacts
    supply : float
        V, the swing that junctions are linearised over.
    """
    name, _, values = facts
    found = {
        key: (later, values[later])
        for key, names in _LATER_NAMES.items()
        for later in names
        if values.get(later, 0.0) > 0
    }
    told = {key: value for key, (_, value) in found.items()}
    card = _Card(
        pattern=model_pattern(name),
        polarity=transistor.polarity,
        threshold=0.0,
        kp=0.0,
        modulation=0.0,
        c_ox=level1.oxide_capacitance(told["tox"]) if "tox" in told else 0.0,
        lateral=0.0,
        overlap_source=told.get("cgso", 0.0),
        overlap_drain=told.get("cgdo", 0.0),
        overlap_bulk=0.0,
        c_drain=0.0,
        c_source=0.0,
        c_area=told.get("cj", 0.0),
        c_edge=told.get("cjsw", 0.0),
        phi=told.get("pb", 0.8),
        grade_area=told.get("mj", 0.5),
        grade_edge=told.get("mjsw", 0.33),
        body=0.0,
        surface=0.6,
    )
    changed, taken = transistor, []
    if card.c_ox > 0:
        changed = replace(changed, c_gate=_gate(card, transistor.length), c_gate_fixed=0.0)
        taken += ["tox", "cgso", "cgdo"]
    drain = _drain(card, supply, transistor.length)
    if drain.junctions is not None:
        changed = replace(
            changed,
            c_drain=drain.per_width,
            c_drain_fixed=drain.fixed,
            junctions=drain.junctions,
        )
        taken += ["cgdo", "cj", "cjsw", "pb", "mj", "mjsw"]
    names = dict.fromkeys(found[key][0] for key in taken if key in found)
    return replace(changed, models=(card.pattern,)), tuple(names)


def _junction(card: _Card, least: float, most: float) -> Junction:
    """Return the junction constants over a range of reverse bias."""
    bottom = level1.junction_factor(card.phi, card.grade_area, least, most)
    return Junction(
        area=card.c_area * bottom,
        edge=card.c_edge * level1.junction_factor(card.phi, card.grade_edge, least, most),
        overlap=2 * card.overlap_drain,
        drain_fixed=card.c_drain * bottom,
        source_fixed=card.c_source * bottom,
    )


def _is_bare(card: _Card) -> bool:
    """Tell whether a card says nothing about its junctions."""
    return max(card.c_area, card.c_edge, card.c_drain, card.c_source) == 0


def _ramp(card: _Card, supply: float, channel: float) -> float:
    """Return the output's full-swing ramp for a step input, per capacitance and 1/W, s m/F."""
    per_width = card.kp / channel * supply
    return level1.fall_time_factor(card.threshold / supply) / per_width / 0.8
