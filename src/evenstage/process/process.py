"""The constants of a manufacturing process, as the delay model uses them.

A transistor of drawn width ``W`` and length ``L`` has the resistance ``r_w (L/L0)/W + r_fixed``,
with the ln 2 of an RC response inside, so that a delay is ``R C``. Its gate loads its driver with
``c_gate W L/L0 + c_gate_fixed``; its drain and its source each with ``c_drain W + c_drain_fixed``.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Literal

if TYPE_CHECKING:
    from evenstage.errors import Notice
    from evenstage.pattern import Pattern
    from evenstage.source import SourceText

Polarity = Literal["n", "p"]
WidthMeaning = Literal["total", "finger", "fins"]


@dataclass(frozen=True, slots=True, kw_only=True)
class Junction:
    """Source and drain capacitance of cards that give areas and perimeters.

    Parameters
    ----------
    area : float
        F/m^2, multiplies AD or AS; linearised over the swing.
    edge : float
        F/m, multiplies PD or PS; linearised likewise.
    overlap : float
        F/m, multiplies the width: the gate's overlap, counted twice because it moves against.
    drain_fixed, source_fixed : float
        F per device.
    """

    area: float
    edge: float
    overlap: float = 0.0
    drain_fixed: float = 0.0
    source_fixed: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Junctions:
    """Junction constants over the part of the swing that a 50 % delay sees.

    A junction holds more near zero bias. An n transistor's drain works there while the output
    rises to half the supply, and far from it while the output falls to half; a p transistor's the
    other way round. The mean of both is that of the whole swing.

    Parameters
    ----------
    rise, fall : Junction
        While the output rises and while it falls.
    """

    rise: Junction
    fall: Junction


@dataclass(frozen=True, slots=True, kw_only=True)
class Channel:
    """How the current of a transistor depends on its voltages; what is None is not known.

    Estimates need none of it; see `evenstage.simulation.channel` for the law.

    Parameters
    ----------
    threshold : float, optional
        V, magnitude, without source bias.
    alpha : float, optional
        Power of the overdrive that the saturated current follows; 2 for a long channel.
    current : float, optional
        A/m: saturated current at full drive per width, at the transistor type's length.
    saturation : float, optional
        V; saturation voltage at full drive.
    modulation : float
        1/V; lambda, channel-length modulation.
    body, phi : float
        V^0.5 and V; how the threshold rises with the source's bias.
    overlap_source, overlap_drain : float, optional
        F/m, between the gate and each end; both contained in ``c_gate``.
    overlap_count : float
        How often ``c_gate`` and ``c_drain`` contain the drain's overlap. Once as a driver sees it:
        up to half its swing the next drain has hardly begun to move; twice by the rule for ends
        that move against each other.
    """

    threshold: float | None = None
    alpha: float | None = None
    current: float | None = None
    saturation: float | None = None
    modulation: float = 0.0
    body: float = 0.0
    phi: float = 0.6
    overlap_source: float | None = None
    overlap_drain: float | None = None
    overlap_count: float = 1.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Transistor:
    """One transistor type of a process; SI units, see the process file's key table in README.

    Parameters
    ----------
    models : tuple of Pattern
        Model or subcircuit names covered.
    polarity : {"n", "p"}
        Channel type.
    length : float
        L0, the length the constants were measured at, m.
    r_w, r_fixed : float
        ohm m; ohm per device.
    stack : float
        Of n conducting devices in series each counts ``(1 + stack (n - 1))/n`` times its own R.
    c_gate, c_gate_fixed, c_drain, c_drain_fixed : float
        F/m, F, F/m, F.
    slope, slope_power, shape, shape_carry : float
        Transition constants of the arc model: with input transition T and Elmore delay E, delay
        ``E + slope T^slope_power E^(1 - slope_power)``, output transition
        ``sqrt((shape E)^2 + (shape_carry T)^2)``.
    slope_stack, shape_stack : float
        Which part of ``stack`` counts in what the input's transition adds, and in the output's
        transition: slope and shape of n devices in series are those of one times ``(1 + slope_stack
        stack (n - 1)) / (1 + stack (n - 1))``, and likewise. A slow input hides some of what the
        stack costs.
    weak_swing : float
        How much counts of the capacitance behind a transistor that conducts towards the wrong
        supply, n upwards and p downwards, beside the pull that moves the output: it passes a weak
        level and lags behind the output.
    drain_shared, drain_inner : float
        What an end counts that shares its diffusion with a neighbour, relative to one that stands
        alone: in general, and between two devices in series that nothing else meets.
    junctions : Junctions, optional
        Used in place of ``c_drain`` where a card gives areas and perimeters.
    channel : Channel
        For simulation alone.
    width_parameter, width_is, fingers_parameter : str
        Which card parameter holds the width, what it means, which one holds the finger count.
    width_is_said : bool
        Whether a process file says what a width means, or names the finger count.
    width_unit : float, optional
        m per unit of a number without suffix; None: decided from what makes sense.
    width_min, width_max, width_step, finger_width_max : float, optional
        Limits of one drawn width, m.
    """

    models: tuple[Pattern, ...]
    polarity: Polarity
    length: float
    r_w: float
    c_gate: float
    c_drain: float
    r_fixed: float = 0.0
    stack: float = 1.0
    c_gate_fixed: float = 0.0
    c_drain_fixed: float = 0.0
    slope: float = 0.0
    slope_power: float = 1.0
    shape: float = 0.0
    shape_carry: float = 0.0
    slope_stack: float = 1.0
    shape_stack: float = 1.0
    weak_swing: float = 1.0
    drain_shared: float = 1.0
    drain_inner: float = 1.0
    junctions: Junctions | None = None
    channel: Channel = Channel()
    width_parameter: str = "w"
    width_is: WidthMeaning = "total"
    width_is_said: bool = field(default=False, compare=False)
    fingers_parameter: str | None = None
    width_unit: float | None = None
    width_min: float | None = None
    width_max: float | None = None
    width_step: float | None = None
    finger_width_max: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Process:
    """A process: its supply, its unit inverter and its transistor types.

    Parameters
    ----------
    name : str
        For reports.
    supply : float
        V.
    transistors : tuple of Transistor
        At least one of each polarity; the first whose pattern fits a model name counts.
    unit_width : float, optional
        nMOS width of the unit inverter, m; None: the smallest n width of the netlist.
    unit_ratio : float, optional
        P/N width ratio of the unit inverter; None: r_w of p over r_w of n.
    origin : {"file", "models", "generic"}
        Where the constants come from.
    source : SourceText, optional
        The process file.
    notices : tuple of Notice
        What was assumed while the constants were derived.
    """

    name: str
    supply: float
    transistors: tuple[Transistor, ...]
    unit_width: float | None = None
    unit_ratio: float | None = None
    origin: Literal["file", "models", "generic"] = "file"
    source: SourceText | None = None
    notices: tuple[Notice, ...] = ()

    def type_of(self, model: str) -> int | None:
        """Return the index of the first transistor type that covers a model name, or None."""
        for index, transistor in enumerate(self.transistors):
            if any(pattern.fits(model) for pattern in transistor.models):
                return index
        return None

    def first(self, polarity: Polarity) -> Transistor:
        """Return the first transistor type of a polarity; it makes the unit inverter."""
        return next(t for t in self.transistors if t.polarity == polarity)

    @property
    def drawing(self) -> tuple[object, ...]:
        """What the layout of a netlist takes from it: equal for corners of one process."""
        return tuple(
            (
                tuple(pattern.text for pattern in one.models),
                *(one.polarity, one.length, one.width_parameter, one.width_is, one.width_is_said),
                *(one.fingers_parameter, one.width_unit, one.width_min),
            )
            for one in self.transistors
        )
