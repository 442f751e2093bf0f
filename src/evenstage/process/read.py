"""A process file into a `Process`."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final, cast

from evenstage.process import level1
from evenstage.process.currents import (
    Derived,
    from_alpha_power,
    from_effective_current,
    from_long_channel,
    from_saturation_current,
)
from evenstage.process.junction_keys import JUNCTION_KEYS, read_junctions
from evenstage.process.process import (
    Channel,
    Polarity,
    Process,
    Transistor,
    WidthMeaning,
)
from evenstage.schema import Entry, Names, Number, Text
from evenstage.settings import Settings, Tables, read_settings

if TYPE_CHECKING:
    from collections.abc import Mapping
    from pathlib import Path

# Upper bounds only catch numbers written in the wrong unit: 2400 where 2.4 kohm*um is meant.
_WIDTH: Final = Number(unit="m", above=0, most=1e-2)
_RESISTANCE_MOST: Final = 10.0
_CAPACITANCE_MOST: Final = 1e-6
_FIXED_MOST: Final = 1e-9

_TRANSISTOR_KEYS: Final[Mapping[str, Entry]] = {
    "models": Names(required=True),
    "polarity": Text(choices=("n", "p"), required=True),
    "length": Number(unit="m", above=0, most=1e-3, required=True),
    "r_w": Number(unit="ohm*m", above=0, most=_RESISTANCE_MOST),
    "r_fixed": Number(unit="ohm", least=0, default=0.0),
    "stack": Number(above=0, most=2, default=1.0),
    "c_gate": Number(unit="F/m", above=0, most=_CAPACITANCE_MOST),
    "tox": Number(unit="m", above=0, most=1e-6),
    "c_gate_fixed": Number(unit="F", least=0, most=_FIXED_MOST, default=0.0),
    "c_drain": Number(unit="F/m", least=0, most=_CAPACITANCE_MOST, required=True),
    "c_drain_fixed": Number(unit="F", least=0, most=_FIXED_MOST, default=0.0),
    **JUNCTION_KEYS,
    "slope": Number(least=0, most=10),
    "slope_power": Number(above=0, most=1, default=1.0),
    "shape": Number(least=0, most=100),
    # From 1 on, transitions along a chain would grow without end.
    "shape_carry": Number(least=0, below=1, default=0.0),
    "vto": Number(unit="V", least=-1000, most=1000),
    "alpha": Number(least=1, most=2),
    "kp": Number(unit="A/V^2", above=0, most=1),
    "i_dsat": Number(unit="A/m", above=0, most=1e5),
    "i_high": Number(unit="A/m", above=0, most=1e5),
    "i_low": Number(unit="A/m", above=0, most=1e5),
    "v_dsat": Number(unit="V", above=0, most=1000),
    "cgdo": Number(unit="F/m", least=0, most=_CAPACITANCE_MOST),
    "cgso": Number(unit="F/m", least=0, most=_CAPACITANCE_MOST),
    "lambda": Number(least=0, most=10, default=0.0),
    "gamma": Number(least=0, most=10, default=0.0),
    "phi": Number(unit="V", above=0, most=10, default=0.6),
    "slope_stack": Number(least=0, most=2, default=1.0),
    "shape_stack": Number(least=0, most=2, default=1.0),
    "weak_swing": Number(least=0, most=1, default=1.0),
    "drain_shared": Number(least=0, most=2, default=1.0),
    "drain_inner": Number(least=0, most=2, default=1.0),
    "width_parameter": Text(default="w"),
    "width_is": Text(choices=("total", "finger", "fins")),
    "fingers_parameter": Text(),
    "width_unit": Number(unit="m", above=0, most=1, word="auto"),
    "width_min": _WIDTH,
    "width_max": _WIDTH,
    "width_step": _WIDTH,
    "finger_width_max": _WIDTH,
}

#: The keys of a process file.
PROCESS_KEYS: Final[Mapping[str, Entry]] = {
    "name": Text(required=True),
    "supply": Number(unit="V", above=0, most=1000, required=True),
    "unit_width": _WIDTH,
    "unit_ratio": Number(above=0, most=100),
    "transistor": Tables(keys=_TRANSISTOR_KEYS, required=True),
}


def read_process(path: str | Path) -> Process:
    """Read a process file.

    Parameters
    ----------
    path : str or Path
        A TOML file with the keys of ``PROCESS_KEYS``.

    Raises
    ------
    SettingsError
        If the file cannot be read, something in it is wrong, or a polarity is missing.

    Examples
    --------
    >>> folder = "sample_netlists/pad_predriver"
    >>> process = read_process(f"{folder}/process.toml")
    >>> process.name, [transistor.polarity for transistor in process.transistors]
    ('invented 350 nm input-output', ['n', 'p'])
    """
    settings = read_settings(path, PROCESS_KEYS)
    supply = settings.number("supply")
    transistors = tuple(_transistor(table, supply) for table in settings.tables("transistor"))
    for polarity in ("n", "p"):
        if all(transistor.polarity != polarity for transistor in transistors):
            raise settings.error(
                "transistor", f'no [[transistor]] has the polarity "{polarity}"', "missing-polarity"
            )
    return Process(
        name=settings.text("name"),
        supply=supply,
        transistors=transistors,
        unit_width=settings.optional_number("unit_width"),
        unit_ratio=settings.optional_number("unit_ratio"),
        source=settings.where.places.source,
    )


def _transistor(table: Settings, supply: float) -> Transistor:
    table.check_order("width_min", "width_max")
    table.check_order("width_min", "finger_width_max")
    fingers = table.optional_text("fingers_parameter")
    c_gate = _gate(table)
    channel = _channel(table, supply, c_gate)
    derived = _derived(table, supply, channel)
    slope, shape = table.optional_number("slope"), table.optional_number("shape")
    said = table.optional_text("width_is")
    return Transistor(
        models=table.names("models"),
        polarity=cast("Polarity", table.text("polarity")),
        length=table.number("length"),
        r_w=derived.r_w,
        r_fixed=table.number("r_fixed"),
        stack=table.number("stack"),
        c_gate=c_gate,
        c_gate_fixed=table.number("c_gate_fixed"),
        c_drain=table.number("c_drain"),
        c_drain_fixed=table.number("c_drain_fixed"),
        junctions=read_junctions(table),
        slope=(derived.slope or 0.0) if slope is None else slope,
        slope_power=table.number("slope_power"),
        shape=(derived.shape or 0.0) if shape is None else shape,
        shape_carry=table.number("shape_carry"),
        channel=channel,
        slope_stack=table.number("slope_stack"),
        shape_stack=table.number("shape_stack"),
        weak_swing=table.number("weak_swing"),
        drain_shared=table.number("drain_shared"),
        drain_inner=table.number("drain_inner"),
        width_parameter=table.text("width_parameter").lower(),
        width_is=cast("WidthMeaning", said or "total"),
        width_is_said=said is not None or fingers is not None,
        fingers_parameter=None if fingers is None else fingers.lower(),
        width_unit=table.optional_number("width_unit"),
        width_min=table.optional_number("width_min"),
        width_max=table.optional_number("width_max"),
        width_step=table.optional_number("width_step"),
        finger_width_max=table.optional_number("finger_width_max"),
    )


def _gate(table: Settings) -> float:
    """Return c_gate, given or from the oxide: ``C_ox L`` and both overlaps, the drain's twice."""
    given, oxide = table.optional_number("c_gate"), table.optional_number("tox")
    if given is not None:
        return given
    if oxide is None:
        raise table.header_error(
            "c_gate is missing in [[transistor]]; give it, or the oxide's thickness as tox",
            "missing-key",
        )
    drain = table.optional_number("cgdo") or 0.0
    source = table.optional_number("cgso")
    overlaps = (drain if source is None else source) + 2 * drain
    return level1.oxide_capacitance(oxide) * table.number("length") + overlaps


def _derived(table: Settings, supply: float, channel: Channel) -> Derived:
    """Return r_w, given or from currents, and what follows with it; see `currents`."""
    high, low = table.optional_number("i_high"), table.optional_number("i_low")
    if (high is None) != (low is None):
        given, missing = ("i_high", "i_low") if low is None else ("i_low", "i_high")
        message = f"{given} comes without {missing}; an effective current needs both"
        raise table.error(given, message, "half-given")
    resistance = table.optional_number("r_w")
    if resistance is not None:
        return Derived(resistance)
    if high is not None and low is not None:
        return from_effective_current(high, low, supply)
    if channel.current is None:
        raise table.header_error(
            "r_w is missing in [[transistor]]; give it, or currents: i_dsat, i_high and i_low, or "
            "kp with vto",
            "missing-key",
        )
    if channel.threshold is None or channel.alpha is None:
        return from_saturation_current(channel.current, supply, table.number("lambda"))
    if table.optional_number("kp") is not None and channel.alpha == 2:
        return from_long_channel(channel.current, channel.threshold, supply)
    overdrive = supply - channel.threshold
    saturation = channel.saturation or channel.alpha / 2 * overdrive
    return from_alpha_power(channel.current, channel.threshold, channel.alpha, saturation, supply)


def _channel(table: Settings, supply: float, c_gate: float) -> Channel:
    """Return what a table says of currents; a threshold counts without its sign, as on cards."""
    vto, kp = table.optional_number("vto"), table.optional_number("kp")
    current, alpha = table.optional_number("i_dsat"), table.optional_number("alpha")
    threshold = None if vto is None else abs(vto)
    if threshold is not None and threshold >= supply:
        raise table.error("vto", f"vto must be below the supply, {supply:g} V", "out-of-range")
    drain, source = table.optional_number("cgdo"), table.optional_number("cgso")
    both = (drain or 0.0) + (drain or 0.0 if source is None else source)
    if both > c_gate or (drain or 0.0) > table.number("c_drain"):
        raise table.error(
            "cgso" if drain is None else "cgdo",
            "overlaps must not exceed what contains them: cgdo c_drain, cgdo and cgso c_gate",
            "out-of-range",
        )
    if kp is not None:
        if current is not None:
            raise table.error("kp", "kp and i_dsat both say the current; keep one", "two-currents")
        if threshold is None:
            raise table.error("kp", "kp needs vto beside it", "missing-vto")
        alpha = 2.0 if alpha is None else alpha
        current = kp / 2 / table.number("length") * (supply - threshold) ** alpha
    return Channel(
        threshold=threshold,
        alpha=alpha,
        current=current,
        saturation=table.optional_number("v_dsat"),
        modulation=table.number("lambda"),
        body=table.number("gamma"),
        phi=table.number("phi"),
        overlap_source=drain if source is None else source,
        overlap_drain=drain,
    )
