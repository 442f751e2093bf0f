"""The built-in process for netlists that come without one.

Its numbers are invented and describe no existing technology: a planar bulk process in which, as
common practice has it, gate and drain capacitance per width stay the same over generations, a unit
inverter driving four of itself takes a third of a picosecond per nanometre of channel, and the
supply is ten volts per micron. Absolute times from it are rough; efforts, ratios and rankings hold
their meaning.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Final

from evenstage.errors import Notice
from evenstage.pattern import Pattern
from evenstage.process.process import Channel, Polarity, Process, Transistor
from evenstage.process.supply import SUPPLY_ASSUMED, supply_for_length, supply_notice
from evenstage.units import engineering

#: Channel length the built-in constants are stated at, m.
GENERIC_LENGTH: Final = 180e-9

#: Delay of an inverter driving four of itself per channel length, s/m (common practice, no source).
_FO4_PER_LENGTH: Final = 1 / 3 * 1e-12 / 1e-9

_C_GATE: Final = 1.4e-9
_C_DRAIN: Final = 1.0e-9
_RATIO: Final = 2.2
_SLOPE: Final[dict[Polarity, float]] = {"n": 0.20, "p": 0.22}
_SHAPE: Final[dict[Polarity, float]] = {"n": 1.9, "p": 2.0}
_STACK: Final[dict[Polarity, float]] = {"n": 0.6, "p": 0.9}

#: Of the supply; of the gate capacitance.
_THRESHOLD_SHARE: Final = 0.25
_OVERLAP_SHARE: Final = 0.15
_ALPHA: Final[dict[Polarity, float]] = {"n": 1.3, "p": 1.4}

#: Code of the notice that the built-in constants were taken.
GENERIC_NOTICE: Final = "generic-process"
_SUPPLY_RULE: Final = "ten volts per micron of channel length"

# Model names as designers choose them; a subcircuit that is nowhere defined counts as a transistor
# if its name fits, so nothing as wide as ``n*`` may stand here.
_NAMES: Final[dict[Polarity, str]] = {
    "n": "n nm mn nmos* *nmos* nfet* *nfet* nch* *_nch modn mosn* cmosn* nshort* nlow* nhigh*"
    " nlvt* nsvt* nrvt* nhvt* n12* n18* n25* n33* n50*",
    "p": "p pm mp pmos* *pmos* pfet* *pfet* pch* *_pch modp mosp* cmosp* pshort* plow* phigh*"
    " plvt* psvt* prvt* phvt* p12* p18* p25* p33* p50*",
}


def generic(supply: float | None = None) -> Process:
    """Return the built-in process at the channel length its constants are stated at.

    Parameters
    ----------
    supply : float, optional
        V; None: ten volts per micron of channel length, with a notice.
    """
    assumed = supply_for_length(GENERIC_LENGTH)
    process = Process(
        name="generic",
        supply=assumed if supply is None else supply,
        transistors=(_transistor("n"), _transistor("p")),
        origin="generic",
        notices=(supply_notice(assumed, _SUPPLY_RULE),) if supply is None else (),
    )
    return at_length(process, GENERIC_LENGTH)


def at_length(process: Process, length: float) -> Process:
    """Return a generic process scaled to the channel length of a netlist.

    Capacitance per width stays, resistance per width grows with the length, and so does tau; a
    supply that was assumed follows. Processes of other origin are returned as they are: their
    constants say themselves what length they are meant for.

    Parameters
    ----------
    process : Process
        Of any origin.
    length : float
        Drawn channel length met most often, m.
    """
    if process.origin != "generic":
        return process
    scaled = tuple(
        replace(t, length=length, r_w=t.r_w * length / t.length) for t in process.transistors
    )
    assumed = any(notice.code == SUPPLY_ASSUMED for notice in process.notices)
    supply = supply_for_length(length) if assumed else process.supply
    kept = tuple(n for n in process.notices if n.code not in {SUPPLY_ASSUMED, GENERIC_NOTICE})
    notices = (_generic_notice(length), *kept)
    if assumed:
        notices += (supply_notice(supply, _SUPPLY_RULE),)
    return replace(process, transistors=scaled, supply=supply, notices=notices)


def usual_channel(transistor: Transistor, supply: float) -> Channel:
    """Return a transistor's channel with what its process does not say.

    Threshold and overlaps then have the built-in shares of supply and gate capacitance, and so has
    alpha its built-in value. The saturation voltage at full drive, ``alpha/2`` of the overdrive,
    is right for a long channel (alpha 2) and common practice for others. The current stays unknown.

    Parameters
    ----------
    transistor : Transistor
    supply : float
        V.
    """
    known = transistor.channel
    threshold = _THRESHOLD_SHARE * supply if known.threshold is None else known.threshold
    alpha = _ALPHA[transistor.polarity] if known.alpha is None else known.alpha
    overlap = min(_OVERLAP_SHARE * transistor.c_gate, transistor.c_drain)
    return replace(
        known,
        threshold=threshold,
        alpha=alpha,
        saturation=known.saturation or alpha / 2 * (supply - threshold),
        overlap_source=overlap if known.overlap_source is None else known.overlap_source,
        overlap_drain=overlap if known.overlap_drain is None else known.overlap_drain,
    )


def usual_names(polarity: Polarity) -> tuple[Pattern, ...]:
    """Return the model names that tell a channel type by themselves."""
    return tuple(Pattern(name) for name in _NAMES[polarity].split())


def _transistor(polarity: Polarity) -> Transistor:
    resistance = _n_resistance()
    return Transistor(
        models=usual_names(polarity),
        polarity=polarity,
        length=GENERIC_LENGTH,
        r_w=resistance if polarity == "n" else _RATIO * resistance,
        c_gate=_C_GATE,
        c_drain=_C_DRAIN,
        stack=_STACK[polarity],
        slope=_SLOPE[polarity],
        shape=_SHAPE[polarity],
    )


def _n_resistance() -> float:
    """Return the r_w of the nMOS that gives the unit inverter its FO4 delay.

    With both edges charged by the transitions of an endless chain,
    ``FO4 = q r_w (1 + ratio) (4 c_gate + c_drain)``, q the mean of both edges.
    """
    q = 1 + (_SLOPE["n"] * _SHAPE["p"] + _SLOPE["p"] * _SHAPE["n"]) / 2
    load = (1 + _RATIO) * (4 * _C_GATE + _C_DRAIN)
    return _FO4_PER_LENGTH * GENERIC_LENGTH / (q * load)


def _generic_notice(length: float) -> Notice:
    return Notice(
        GENERIC_NOTICE,
        "no process file and no usable .model card: constants of the built-in generic process for a"
        f" channel length of {engineering(length, 'm')}; efforts and ratios mean something,"
        " absolute times are rough",
    )
