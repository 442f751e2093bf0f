"""How far the work has come, for whoever wants to know.

Whoever works calls ``tell`` at moments that cost nothing: for each block of text or round of the
optimiser, never for each card. Nobody need listen; where somebody does, ``listening`` says who.
"""

from __future__ import annotations

import time
from contextlib import contextmanager, suppress
from contextvars import ContextVar
from threading import Event, Lock, Thread
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator
    from typing import TextIO

    #: Takes what is told.
    Listener = Callable[[str, float | None], None]

#: Work shorter than this is not worth a line, s.
_PATIENCE: Final = 1.0
#: Between two changes of the line, s.
_PAUSE: Final = 0.1
#: Between two looks at whether anything was told, s.
_TICK: Final = 0.5


_listener: ContextVar[Listener | None] = ContextVar("listener", default=None)


def tell(stage: str, done: float | None = None) -> None:
    """Say which stage the work is in, and how much of that is done.

    Parameters
    ----------
    stage : str
        What is being done, in a word or two: ``reading``.
    done : float, optional
        From 0 to 1; None where nobody knows.
    """
    listener = _listener.get()
    if listener is not None:
        listener(stage, done)


def tell_gap(gap: float) -> None:
    """Say how far a sizing can still be from the best.

    Parameters
    ----------
    gap : float
        Relative distance of the best sizes so far to the best bound so far; infinite before both.

    Examples
    --------
    >>> with listening(lambda stage, done: print(stage)):
    ...     tell_gap(0.0042)
    sizing, at most 0.42 % from the best
    """
    percent = 100 * max(gap, 1e-5)
    tell(f"sizing, at most {percent:.2g} % from the best" if gap < 1.0 else "sizing")


@contextmanager
def listening(listener: Listener) -> Iterator[None]:
    """Let somebody hear of the work inside.

    Examples
    --------
    >>> with listening(lambda stage, done: print(stage, done)):
    ...     tell("reading", 0.5)
    reading 0.5
    """
    token = _listener.set(listener)
    try:
        yield
    finally:
        _listener.reset(token)


@contextmanager
def shown_on(stream: TextIO | None) -> Iterator[None]:
    """Show the progress of the work inside in one line of a terminal, gone afterwards.

    An interrupt of the work leaves with a note that says which stage it was in.

    Parameters
    ----------
    stream : TextIO, optional
        Nothing is shown where it is None or no terminal.
    """
    line = _Line(stream if stream is not None and stream.isatty() else None)
    try:
        with listening(line.show):
            yield
    except KeyboardInterrupt as stop:
        if line.stage:
            stop.add_note(line.stage)
        raise
    finally:
        line.clear()


class _Line:
    """One line of a terminal, if there is one, written over itself; and the stage last told.

    Where nobody tells anything for a while, the line counts the seconds.
    """

    def __init__(self, stream: TextIO | None) -> None:
        self.stage = ""
        self._text = ""
        self._stream = stream
        self._width = 0
        self._told = time.monotonic()
        self._due = self._told + _PATIENCE
        self._writing = Lock()
        self._ended = Event()
        if stream is not None:
            Thread(target=self._count, daemon=True).start()

    def show(self, stage: str, done: float | None) -> None:
        """Write a stage, unless the line was written a moment ago."""
        self.stage = stage
        if self._stream is None:
            return
        with self._writing:
            self._text = stage if done is None else f"{stage} {min(max(done, 0.0), 1.0):4.0%}"
            self._told = time.monotonic()
            if self._told >= self._due:
                self._write(self._text)
                self._due = self._told + _PAUSE

    def clear(self) -> None:
        """Leave an empty line."""
        self._ended.set()
        with self._writing:
            if self._width:
                self._write("")
                self._write("")

    def _count(self) -> None:
        """Say for how long nothing was told, each second, until the work has ended."""
        while not self._ended.wait(_TICK):
            with self._writing:
                silent = time.monotonic() - self._told
                if self._text and silent >= _PATIENCE and not self._ended.is_set():
                    self._write(f"{self._text}, for {silent:.0f} s")

    def _write(self, text: str) -> None:
        assert self._stream is not None
        with suppress(OSError, ValueError):  # a closed terminal must not end the work
            self._stream.write(f"\r{text:<{self._width}}")
            self._stream.flush()
        self._width = len(text)
