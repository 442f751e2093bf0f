"""Every mistake a user can make, and the notices that need not stop a run."""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from evenstage.source import Span

_LINE_END = re.compile(r"[\r\n]")
_STEERING = re.compile(r"[\x00-\x08\x0b-\x1f\x7f-\x9f]")
_TAB = 8
#: How many mistakes of one run are told.
_TOLD = 20
#: Longest line shown whole, and how much of a longer one stands before the cause.
_WIDTH = 100
#: Longest message told whole.
_MOST = 1000
_LEAD = 40


class EvenstageError(Exception):
    """A mistake in the user's input or a wish that cannot be met.

    Parameters
    ----------
    message : str
        What was found, what was expected and what to do; lower case, no full stop.
    code : str
        A short stable name of the mistake, as in ``bad-width``.
    span : Span, optional
        The bytes at fault.
    notes : tuple of str
        Further lines, for instance where the enclosing subcircuit begins.
    """

    def __init__(
        self, message: str, *, code: str, span: Span | None = None, notes: tuple[str, ...] = ()
    ) -> None:
        super().__init__(message)
        self.message = message
        self.code = code
        self.span = span
        self.notes = notes

    def __str__(self) -> str:
        lines = [f"{_short(self.message)} ({self.code})", *map(_short, self.notes)]
        if self.span is not None:
            lines[:1] = [f"{self.span.place}: {lines[0]}", *excerpt(self.span)]
        return _printable("\n".join(lines))


class SettingsError(EvenstageError):
    """A process file or a brief is wrong."""


class NetlistError(EvenstageError):
    """The text of a netlist is wrong."""


class ElaborationError(EvenstageError):
    """The cards do not fit together."""


class MistakesError(ElaborationError):
    """Several mistakes that are told together.

    Parameters
    ----------
    errors : tuple of ElaborationError
        In the order of the text.
    """

    def __init__(self, errors: tuple[ElaborationError, ...]) -> None:
        codes = {error.code for error in errors}
        code = codes.pop() if len(codes) == 1 else "several-mistakes"
        super().__init__(f"{len(errors)} mistakes", code=code, span=errors[0].span)
        self.errors = errors

    def __str__(self) -> str:
        shown = [str(error) for error in self.errors[:_TOLD]]
        more = len(self.errors) - _TOLD
        return "\n\n".join([*shown, *([f"and {more} more"] if more > 0 else [])])


class CircuitError(EvenstageError):
    """The transistors do not form something that can be timed."""


class NoPathError(EvenstageError):
    """No path connects what was asked for."""


class InfeasibleError(EvenstageError):
    """The wishes for the sizes contradict each other or cannot be met."""


class NotConvergedError(EvenstageError):
    """The optimiser stopped before it could prove its answer."""


class SimulationError(EvenstageError):
    """A path could not be simulated."""


class FitError(EvenstageError):
    """The measurements are wrong, or too few to fit a process to."""


class DocumentError(EvenstageError):
    """A file is no result that was written as JSON."""


class OutputError(EvenstageError):
    """A result could not be written."""


@dataclass(frozen=True, slots=True)
class Notice:
    """Something that was not understood, assumed or left out, and need not stop the run.

    Parameters
    ----------
    code : str
        A short stable name, as in ``resistor-joined``.
    message : str
        What was done about what, for the user.
    place : str
        ``file:line:column`` of the first cause, or empty.
    names : tuple of str
        All devices, nets or cards concerned.
    """

    code: str
    message: str
    place: str = ""
    names: tuple[str, ...] = ()

    def __str__(self) -> str:
        return f"{self.place}: {self.message}" if self.place else self.message


def excerpt(span: Span) -> list[str]:
    """Return the line a span begins in and a line of carets under the span's part of it.

    Of a line longer than some hundred columns only the part around the cause is shown.
    """
    source = span.source
    line = source.line(span.start)
    left = source.column(span.start) - 1
    marked = min(len(_LINE_END.split(span.text, maxsplit=1)[0]), len(line) - left)
    line, left = _window(line, left)
    before = line[:left].expandtabs(_TAB)
    under = line[: left + marked].expandtabs(_TAB)
    shown = _printable(line.expandtabs(_TAB))
    carets = "^" * max(1, min(len(under), len(shown)) - len(before))
    return [f"    {shown}", f"    {' ' * len(before)}{carets}"]


def _short(text: str) -> str:
    """Return a text without the middle of it if it is very long."""
    return text if len(text) <= _MOST else f"{text[: _MOST // 2]} ... {text[-_MOST // 4 :]}"


def _printable(text: str) -> str:
    """Return a text with ``?`` for bytes that are not UTF-8, and signs that steer terminals."""
    return _STEERING.sub("?", text.encode("utf-8", "replace").decode())


def _window(line: str, left: int) -> tuple[str, int]:
    """Return the part of a line around a place in it, and the place in that part."""
    if len(line) <= _WIDTH:
        return line, left
    first = max(0, min(left - _LEAD, len(line) - _WIDTH))
    head = "..." if first else ""
    tail = "..." if first + _WIDTH < len(line) else ""
    return f"{head}{line[first : first + _WIDTH]}{tail}", left - first + len(head)
