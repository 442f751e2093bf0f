"""Progress: told to whoever listens, shown on a terminal, and gone afterwards."""

from __future__ import annotations

import io
import re
import time
from pathlib import Path
from typing import TYPE_CHECKING, Final

import pytest

from evenstage import flow
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read_bytes
from evenstage.netlist.rewriting.edits import rewrite
from evenstage.progress import listening, shown_on, tell
from support.large_netlists import flat

if TYPE_CHECKING:
    from collections.abc import Callable


GAP: Final = re.compile(r"sizing, at most (\S+) % from the best")


class Terminal(io.StringIO):
    """Keeps what was written to it."""

    def isatty(self) -> bool:
        return True

    @property
    def screen(self) -> str:
        """What a reader sees in the line: later characters stand over earlier ones."""
        line: list[str] = []
        for text in self.getvalue().split("\r"):
            line[: len(text)] = text
        return "".join(line).rstrip()


class Gone(Terminal):
    """A terminal that was closed."""

    def write(self, _: str) -> int:
        raise OSError


@pytest.fixture
def clock(monkeypatch: pytest.MonkeyPatch) -> Callable[[float], None]:
    """Return what moves the time on by some seconds."""
    now = [100.0]
    monkeypatch.setattr("evenstage.progress.time.monotonic", lambda: now[0])

    def wait(seconds: float) -> None:
        now[0] += seconds

    return wait


class TestTell:
    def test_is_heard_by_who_listens_and_by_nobody_else(self) -> None:
        heard: list[tuple[str, float | None]] = []
        tell("before")
        with listening(lambda stage, done: heard.append((stage, done))):
            tell("inside", 0.25)
        tell("after")
        assert heard == [("inside", 0.25)]

    def test_the_rooms_tell_what_they_do(self) -> None:
        heard: list[tuple[str, float | None]] = []
        with listening(lambda stage, done: heard.append((stage, done))):
            netlist = read_bytes(flat(6000), "flat.sp", Path())
            elaborate(netlist)
            rewrite(netlist, ())
        assert list(dict(heard)) == ["reading", "laying out", "writing"]
        reading = [done for stage, done in heard if stage == "reading" and done is not None]
        assert len(reading) > 3
        assert reading == sorted(reading)
        assert all(0 <= done < 1 for done in reading)

    @pytest.mark.parametrize("small", [True, False])
    def test_sizing_tells_its_gap_falling(
        self, *, small: bool, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
    ) -> None:
        """By either optimiser."""
        monkeypatch.setattr("evenstage.sizing.optimum.is_small", lambda _: small)
        heard: list[str] = []
        (tmp_path / "flat.sp").write_bytes(flat(1200))
        with listening(lambda stage, _: heard.append(stage)):
            flow.resize(tmp_path / "flat.sp", flow.Question())
        assert heard.index("recognising") < heard.index("timing") < heard.index("sizing")
        gaps = [float(found[1]) for one in heard if (found := GAP.fullmatch(one))]
        assert len(gaps) > 3
        assert min(gaps) < 0.02 < max(gaps)


class TestShownOn:
    def test_short_work_shows_nothing(self, clock: Callable[[float], None]) -> None:
        terminal = Terminal()
        with shown_on(terminal):
            clock(0.9)
            tell("reading", 0.5)
        assert terminal.getvalue() == ""

    def test_long_work_is_shown_in_one_line_that_goes(self, clock: Callable[[float], None]) -> None:
        terminal = Terminal()
        with shown_on(terminal):
            clock(1.1)
            tell("laying out", 0.501)
            assert terminal.screen == "laying out  50%"
            clock(0.2)
            tell("sizing")
            assert terminal.screen == "sizing"
        assert terminal.screen == ""
        assert terminal.getvalue().endswith("\r")
        assert "\n" not in terminal.getvalue()

    def test_seconds_are_counted_where_nothing_is_told(self) -> None:
        terminal = Terminal()
        with shown_on(terminal):
            tell("sizing")
            deadline = time.monotonic() + 10
            while terminal.screen != "sizing, for 1 s" and time.monotonic() < deadline:
                time.sleep(0.05)
            assert terminal.screen == "sizing, for 1 s"
        assert terminal.screen == ""
        written = terminal.getvalue()
        time.sleep(1.1)
        assert terminal.getvalue() == written

    def test_line_changes_at_most_ten_times_a_second(self, clock: Callable[[float], None]) -> None:
        terminal = Terminal()
        with shown_on(terminal):
            clock(2)
            for _ in range(20):
                tell("reading", 0.1)
                clock(0.01)
            assert terminal.getvalue().count("reading") == 2

    @pytest.mark.parametrize("stream", [None, io.StringIO(), Terminal()])
    def test_interrupt_says_what_it_interrupted(self, stream: io.StringIO | None) -> None:
        def interrupted() -> None:
            with shown_on(stream):
                tell("reading", 0.1)
                tell("laying out", 0.9)
                raise KeyboardInterrupt

        with pytest.raises(KeyboardInterrupt) as caught:
            interrupted()
        assert caught.value.__notes__ == ["laying out"]

    def test_line_goes_when_the_work_fails(self, clock: Callable[[float], None]) -> None:
        terminal = Terminal()

        def fail() -> None:
            with shown_on(terminal):
                clock(2)
                tell("reading", 0.1)
                raise KeyboardInterrupt

        with pytest.raises(KeyboardInterrupt):
            fail()
        assert terminal.screen == ""

    def test_file_gets_nothing(self, clock: Callable[[float], None]) -> None:
        stream = io.StringIO()
        with shown_on(stream), shown_on(None):
            clock(2)
            tell("reading", 0.5)
        assert stream.getvalue() == ""

    def test_closed_terminal_does_not_end_the_work(self, clock: Callable[[float], None]) -> None:
        with shown_on(Gone()):
            clock(2)
            tell("reading", 0.5)
