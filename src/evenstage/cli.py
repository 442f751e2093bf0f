"""Arguments in, exit status out; everything between is `evenstage.flow`.

It is imported only when a command runs: help comes at once, and an interrupt finds someone to
answer it.
"""

from __future__ import annotations

import os
import sys
import traceback
from contextlib import suppress
from pathlib import Path
from typing import TYPE_CHECKING, Final, TextIO

from evenstage import __version__
from evenstage.arguments import parsed
from evenstage.errors import EvenstageError, OutputError
from evenstage.progress import shown_on

if TYPE_CHECKING:
    import argparse
    from collections.abc import Sequence

    from evenstage import flow

DONE, WRONG_INPUT, WRONG_USAGE, OUR_FAULT, INTERRUPTED = 0, 1, 2, 3, 130


def run() -> None:
    """Run the program on the command line's arguments and leave with its status."""
    sys.exit(main(sys.argv[1:]))


def main(arguments: Sequence[str]) -> int:
    """Run one command.

    Parameters
    ----------
    arguments : sequence of str
        Without the program's name.

    Returns
    -------
    int
        0 done; 1 the input is wrong or cannot be met; 2 usage; 3 a fault of ours; 130 interrupted.
    """
    try:
        asked = parsed(arguments, _print)
        _run(asked)
    except SystemExit as stop:
        return int(stop.code or 0)
    except EvenstageError as error:
        _say(str(error))
        return WRONG_INPUT
    except KeyboardInterrupt as stop:
        stage = "".join(f" while {note}" for note in getattr(stop, "__notes__", ()))
        _say(f"interrupted{stage}; no file is left half-written")
        return INTERRUPTED
    except BrokenPipeError:
        # Whoever read the report has read enough.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return DONE
    except Exception:  # noqa: BLE001 -- the last line of defence
        _say(traceback.format_exc())
        _say(f"this is a fault of evenstage {__version__}; please report the lines above")
        return OUR_FAULT
    return DONE


def _say(message: str) -> None:
    """Write a message to standard error, whatever its characters, as far as there is one."""
    if sys.stderr is not None:
        with suppress(OSError):
            print(_encodable(message, sys.stderr), file=sys.stderr, flush=True)


def _encodable(text: str, stream: TextIO) -> str:
    """Return a text with what a stream cannot take replaced."""
    encoding = stream.encoding or "utf-8"
    return text.encode(encoding, "replace").decode(encoding)


def _run(asked: argparse.Namespace) -> None:
    """Run a command and put its result where it was asked for.

    A report holds its notices; JSON is for scripts, so there people find them on standard error.
    """
    from evenstage import flow

    on_screen = asked.json == Path("-")
    page = getattr(asked, "html", None)
    _check_places(asked)
    result, origin = _answer(asked)
    if page and origin is not None:
        flow.write_text(page, flow.html(result, origin), force=True)
    if on_screen:
        _print(flow.json(result, origin))
        for notice in () if asked.quiet else flow.notices(result):
            _say(f"notice: {notice}")
        return
    if asked.json:
        flow.write_text(asked.json, flow.json(result, origin), force=True)
    _print(
        flow.text(result, width=_width(), unicode=_unicode(), with_notices=not asked.quiet),
    )
    if asked.command == "resize" and asked.output is None and not asked.quiet:
        _say("no netlist was written: name one with --output FILE")


def _check_places(asked: argparse.Namespace) -> None:
    """Refuse at once to write over what is read, or twice to one file."""
    from evenstage import flow

    taken = _inputs(asked)
    for name in ("json", "graph", "waveforms", "html"):
        path = getattr(asked, name, None)
        if path and path != Path("-"):
            flow.check_place(path, taken)
            taken.append(path)


def _answer(asked: argparse.Namespace) -> tuple[flow.Result, flow.Origin | None]:
    """Return the result of a command, and where it comes from if that is written anywhere."""
    from evenstage import flow

    if asked.command == "report":
        return flow.report(asked.result, __version__, asked.arguments)
    with shown_on(None if asked.quiet else sys.stderr):
        result = _COMMANDS[asked.command](asked)
    if not asked.json and not getattr(asked, "html", None):
        return result, None
    return result, flow.origin(__version__, asked.arguments, _inputs(asked), result)


def _inputs(asked: argparse.Namespace) -> list[Path]:
    """Return the files that a command reads, and the netlist that it writes."""
    names = (
        "netlist",
        "before",
        "after",
        "measurements",
        "cells",
        "simulated",
        "brief",
        "output",
        "result",
    )
    others = [path for name in names if (path := getattr(asked, name, None)) is not None]
    return [*asked.process, *others]


def _print(text: str) -> None:
    """Write a result to standard output."""
    if sys.stdout is None:
        raise OutputError("there is no standard output to print to", code="cannot-write")
    try:
        sys.stdout.write(_encodable(text, sys.stdout))
        sys.stdout.flush()
    except BrokenPipeError:
        raise
    except OSError as error:
        # What is left in the buffer must not fail once more when Python ends.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        reason = (error.strerror or str(error)).lower()
        raise OutputError(f"cannot print: {reason}", code="cannot-write") from None


def _unicode() -> bool:
    """Tell whether the report may hold more than ASCII: not where the locale is explicitly C."""
    locale = os.environ.get("LC_ALL") or os.environ.get("LANG") or ""
    able = sys.stdout is not None and sys.stdout.encoding.lower().startswith("utf")
    return able and locale not in {"C", "POSIX"}


def _width() -> int:
    """Return the width of the report: the terminal's within reason, 100 where there is none."""
    given = os.environ.get("COLUMNS", "")
    if given.isdecimal():
        columns = int(given)
    elif sys.stdout is not None and sys.stdout.isatty():
        columns = os.get_terminal_size(sys.stdout.fileno()).columns
    else:
        columns = 100
    return min(max(columns, 80), 160)


def _analyse(asked: argparse.Namespace) -> flow.Result:
    from evenstage import flow

    return flow.analyse(asked.netlist, _question(asked))


def _recognise(asked: argparse.Namespace) -> flow.Result:
    from evenstage import flow

    return flow.recognise(asked.netlist, _question(asked), asked.graph)


def _resize(asked: argparse.Namespace) -> flow.Result:
    from evenstage import flow

    wishes = flow.Wishes(
        delay=asked.delay,
        width=asked.width,
        margin=asked.margin / 100,
        scope=asked.scope,
        reclaim=asked.reclaim,
        apart=asked.apart,
        changes=asked.changes,
    )
    return flow.resize(
        asked.netlist,
        _question(asked),
        wishes,
        asked.output,
        force=asked.force,
        curve=asked.curve,
        spend=asked.spend,
    )


def _simulate(asked: argparse.Namespace) -> flow.Result:
    from evenstage import flow

    return flow.simulate(
        asked.netlist,
        _question(asked),
        after=asked.after,
        side_branches=asked.side_branches,
        waveforms=asked.waveforms,
    )


def _diff(asked: argparse.Namespace) -> flow.Result:
    from evenstage import flow

    return flow.diff(asked.before, asked.after, _question(asked))


def _fit(asked: argparse.Namespace) -> flow.Result:
    from evenstage import flow

    if asked.simulated is not None:
        return flow.fit_simulated(
            asked.simulated, _question(asked), asked.output, force=asked.force
        )
    if asked.deck is not None:
        return flow.write_deck(asked.deck, asked.cells, _question(asked), force=asked.force)
    return flow.fit(
        asked.measurements,
        asked.cells,
        _question(asked),
        asked.output,
        results=asked.results,
        force=asked.force,
    )


def _question(asked: argparse.Namespace) -> flow.Question:
    from evenstage import flow

    conflicts = getattr(asked, "conflicts", None)
    return flow.Question(
        process=asked.process[0] if asked.process else None,
        corners=tuple(asked.process[1:]),
        brief=asked.brief,
        top=asked.top,
        start=getattr(asked, "from", None),
        end=getattr(asked, "to", None),
        count=getattr(asked, "count", 1),
        **({} if conflicts is None else {"conflicts": conflicts}),
    )


_COMMANDS: Final = {
    "analyse": _analyse,
    "resize": _resize,
    "diff": _diff,
    "simulate": _simulate,
    "recognise": _recognise,
    "fit": _fit,
}
