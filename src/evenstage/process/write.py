"""A `Process` as a process file."""

from __future__ import annotations

from dataclasses import fields
from typing import TYPE_CHECKING, Final

from evenstage.process.junction_keys import junction_values
from evenstage.process.process import Channel, Transistor

if TYPE_CHECKING:
    from collections.abc import Iterable

    from evenstage.process.process import Process

#: Keys written even where they have their default value.
_ALWAYS: Final = frozenset({"length", "r_w", "c_gate", "c_drain"})

#: What a file has no key for, and what is written apart.
_APART: Final = frozenset({"models", "polarity", "junctions", "channel", "width_is_said"})

#: The keys of what a channel knows.
_CHANNEL_KEYS: Final = {
    "threshold": "vto",
    "alpha": "alpha",
    "current": "i_dsat",
    "saturation": "v_dsat",
    "modulation": "lambda",
    "body": "gamma",
    "phi": "phi",
    "overlap_source": "cgso",
    "overlap_drain": "cgdo",
}

_DIGITS: Final = 6


def process_text(process: Process, head: Iterable[str] = ()) -> str:
    """Return a process file's text that `read_process` reads back.

    Numbers are in SI units, rounded to six digits.

    Parameters
    ----------
    process : Process
    head : iterable of str
        Lines of comment at the top.
    """
    lines = [f"# {line}".rstrip() for line in head]
    lines += [f"name = {_quoted(process.name)}", f"supply = {_number(process.supply)}"]
    for key, value in (("unit_width", process.unit_width), ("unit_ratio", process.unit_ratio)):
        if value is not None:
            lines.append(f"{key} = {_number(value)}")
    for transistor in process.transistors:
        lines += ["", "[[transistor]]", *_transistor_lines(transistor)]
    return "\n".join(lines) + "\n"


def _transistor_lines(transistor: Transistor) -> list[str]:
    names = ", ".join(_quoted(pattern.text) for pattern in transistor.models)
    lines = [f"models = [{names}]", f"polarity = {_quoted(transistor.polarity)}"]
    for field in fields(Transistor):
        value = getattr(transistor, field.name)
        always = field.name in _ALWAYS or (field.name == "width_is" and transistor.width_is_said)
        if field.name in _APART or (value == field.default and not always):
            continue
        shown = _number(value) if isinstance(value, float) else _quoted(value)
        lines.append(f"{field.name} = {shown}")
    for field in fields(Channel):
        value = getattr(transistor.channel, field.name)
        if field.name in _CHANNEL_KEYS and value != field.default:
            lines.append(f"{_CHANNEL_KEYS[field.name]} = {_number(value)}")
    if transistor.junctions is not None:
        given = junction_values(transistor.junctions)
        lines += [f"{key} = {_number(value)}" for key, value in given]
    return lines


def _number(value: float) -> str:
    """Return a number as TOML spells a float."""
    text = f"{value:.{_DIGITS}g}"
    return text if any(mark in text for mark in ".en") else f"{text}.0"


def _quoted(text: str) -> str:
    """Return a TOML basic string."""
    escapes = {'"': '\\"', "\\": "\\\\"}
    shown = (
        f"\\u{ord(c):04x}" if ord(c) < 0x20 or ord(c) == 0x7F else escapes.get(c, c) for c in text
    )
    return f'"{"".join(shown)}"'
