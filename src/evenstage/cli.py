"""Arguments in, exit status out; everything between is `evenstage.flow`.

It is imported only when a command runs: help comes at once, and an interrupt finds someone to
answer it.
"""

from __future__ import annotations

import argparse
import os
import sys
import traceback
from contextlib import suppress
from pathlib import Path
from typing import TYPE_CHECKING, Final, TextIO

from evenstage import __version__
from evenstage.completion import completion
from evenstage.errors import EvenstageError, OutputError
from evenstage.progress import shown_on
from evenstage.units import parse_number

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

    from evenstage import flow

DONE, WRONG_INPUT, WRONG_USAGE, OUR_FAULT, INTERRUPTED = 0, 1, 2, 3, 130

#: Longest delay that can be meant, s; beyond it a suffix was forgotten.
_DELAY_MOST = 1e-3

_CAUTION = """\
Figures are estimates, not sign-off: simulate at all corners before you rely on
them."""

#: What the help of each command shows it at.
_EXAMPLES: Final = {
    "analyse": (
        "the three slowest paths that end at a word line:\n"
        "  evenstage analyse decoder.sp --process kit.toml --to 'wl*' --count 3\n"
    ),
    "resize": (
        "the least width that meets 450 ps, written into a new netlist:\n"
        "  evenstage resize decoder.sp --process kit.toml --delay 450p --output faster.sp\n"
    ),
    "diff": ("what a sizing changed:\n  evenstage diff decoder.sp faster.sp --process kit.toml\n"),
    "simulate": (
        "how much faster a new netlist is, claimed and simulated:\n"
        "  evenstage simulate decoder.sp --process kit.toml --after faster.sp\n"
    ),
    "recognise": (
        "what was understood, and the graph of gates as a file:\n"
        "  evenstage recognise decoder.sp --graph gates.graphml\n"
    ),
    "fit": (
        "a process file from delays measured, and from simulated ones:\n"
        "  evenstage fit delays.csv --netlist cells.sp --output kit.toml\n"
        "  evenstage fit --simulated cells.sp --output kit.toml\n"
    ),
}


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
        asked = _parsed(arguments)
        asked.arguments = tuple(arguments)
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
            print(_fit(message, sys.stderr), file=sys.stderr, flush=True)


def _fit(text: str, stream: TextIO) -> str:
    """Return a text with what a stream cannot take replaced."""
    encoding = stream.encoding or "utf-8"
    return text.encode(encoding, "replace").decode(encoding)


def _run(asked: argparse.Namespace) -> None:
    """Run a command and put its result where it was asked for.

    A report holds its notices; JSON is for scripts, so there people find them on standard error.
    """
    from evenstage import flow

    on_screen = asked.json == Path("-")
    written = getattr(asked, "graph", None) or getattr(asked, "waveforms", None)
    if asked.json and not on_screen:
        flow.check_place(asked.json, _inputs(asked))
    others = [path for path in (asked.json, written) if path and path != Path("-")]
    page = getattr(asked, "html", None)
    if written:
        flow.check_place(written, [*_inputs(asked), *([asked.json] if asked.json else [])])
    if page:
        flow.check_place(page, [*_inputs(asked), *others])
    with shown_on(None if asked.quiet else sys.stderr):
        result = asked.command(asked)
    if page:
        origin = flow.origin(
            __version__, asked.arguments, _inputs(asked), getattr(asked, "delay", None)
        )
        flow.write_text(page, flow.html(result, origin), force=True)
    if on_screen:
        _print(flow.json(result))
        for notice in () if asked.quiet else flow.notices(result):
            _say(f"notice: {notice}")
        return
    if asked.json:
        flow.write_text(asked.json, flow.json(result), force=True)
    _print(
        flow.text(result, width=_width(), unicode=_unicode(), with_notices=not asked.quiet),
    )
    if asked.command is _resize and asked.output is None and not asked.quiet:
        _say("no netlist was written: name one with --output FILE")


def _inputs(asked: argparse.Namespace) -> list[Path]:
    """Return the files that a command reads, and the netlist that it writes."""
    names = ("netlist", "before", "after", "measurements", "cells", "simulated", "brief", "output")
    others = [path for name in names if (path := getattr(asked, name, None)) is not None]
    return [*asked.process, *others]


def _print(text: str) -> None:
    """Write a result to standard output."""
    if sys.stdout is None:
        raise OutputError("there is no standard output to print to", code="cannot-write")
    try:
        sys.stdout.write(_fit(text, sys.stdout))
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


def _fit_process(asked: argparse.Namespace) -> flow.Result:
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


def _parsed(arguments: Sequence[str]) -> argparse.Namespace:
    """Return the arguments read, where those of ``fit`` say one source of delays and no more."""
    parser = _parser()
    asked = parser.parse_args(arguments)
    if asked.command is _fit_process:
        given = (asked.measurements, asked.simulated, asked.deck)
        if sum(one is not None for one in given) != 1:
            parser.error(
                "fit: give MEASUREMENTS or --deck FILE with --netlist CELLS, or --simulated NETLIST"
            )
        if (asked.simulated is None) != (asked.cells is not None):
            parser.error("fit: MEASUREMENTS or --deck FILE and --netlist CELLS go together")
    return asked


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="evenstage",
        description="Find the slowest path of a transistor netlist, and widths that make it fast.",
        epilog=f"evenstage COMMAND --help shows each with an example.\n\n{_CAUTION}",
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("--version", action="version", version=f"evenstage {__version__}")
    parser.add_argument(
        "--json-schema", action=_Schema, nargs=0, help="print the JSON Schema of --json, and leave"
    )
    parser.add_argument(
        "--completion",
        action=_Completion,
        choices=("bash", "fish", "zsh"),
        metavar="SHELL",
        help="print what teaches bash, fish or zsh to complete, and leave",
    )
    commands = parser.add_subparsers(title="commands", metavar="COMMAND", required=True)
    analyse = _command(commands, "analyse", _analyse, "the slowest paths, stage by stage")
    analyse.add_argument("netlist", type=_file, metavar="NETLIST")
    analyse.add_argument(
        "--count", type=_count, default=1, metavar="K", help="how many slowest paths (1)"
    )
    analyse.add_argument(
        "--conflicts",
        type=_conflicts,
        metavar="N",
        help="give up the search for a path's input vector after N conflicts (20000; 0: no search)",
    )
    _shared(analyse)
    resize = _command(commands, "resize", _resize, "new widths, written into a new netlist")
    resize.add_argument("netlist", type=_file, metavar="NETLIST")
    resize.add_argument(
        "--output",
        type=_output,
        metavar="FILE",
        help="the netlist to write; without it, only shown",
    )
    _wishes(resize)
    _shared(resize)
    diff = _command(commands, "diff", _diff, "two netlists of one design, side by side")
    diff.add_argument("before", type=_file, metavar="BEFORE")
    diff.add_argument("after", type=_file, metavar="AFTER")
    _shared(diff)
    simulate = _command(
        commands,
        "simulate",
        _simulate,
        "the slowest path as a nonlinear circuit, beside its estimate",
    )
    simulate.add_argument("netlist", type=_file, metavar="NETLIST")
    simulate.add_argument(
        "--after",
        type=_file,
        metavar="FILE",
        help="the same design after a change, for the speed-up",
    )
    simulate.add_argument(
        "--count", type=_count, default=1, metavar="K", help="how many slowest paths (1)"
    )
    simulate.add_argument(
        "--side-branches",
        choices=("gates", "capacitances"),
        default="gates",
        help="what hangs on a path: as gates (default), or as constant capacitances",
    )
    simulate.add_argument(
        "--waveforms", type=_file, metavar="FILE", help="the voltages over time, as CSV"
    )
    _shared(simulate)
    recognise = _command(
        commands, "recognise", _recognise, "what each group of transistors is, and what it computes"
    )
    recognise.add_argument("netlist", type=_file, metavar="NETLIST")
    recognise.add_argument(
        "--graph", type=_file, metavar="FILE", help="the graph of gates, as GraphML"
    )
    _shared(recognise, paths=False, page=False)
    fit = _command(commands, "fit", _fit_process, "process constants from delays that you measured")
    fit.add_argument("measurements", type=_file, nargs="?", metavar="MEASUREMENTS")
    fit.add_argument(
        "--simulated",
        type=_file,
        metavar="NETLIST",
        help="in their place: the netlist whose cells are measured by simulation",
    )
    fit.add_argument(
        "--deck",
        type=_output,
        metavar="FILE",
        help="write a deck that measures the cells, and beside it the table it fills",
    )
    fit.add_argument(
        "--results",
        type=_file,
        metavar="FILE",
        help="what the simulator printed, for the names in the table",
    )
    fit.add_argument(
        "--netlist",
        type=_file,
        dest="cells",
        metavar="CELLS",
        help="the netlist that holds the measured cells",
    )
    fit.add_argument("--output", type=_output, metavar="FILE", help="the process file to write")
    fit.add_argument("--force", action="store_true", help="overwrite the output")
    _shared(fit, paths=False)
    return parser


class _Completion(argparse.Action):
    """Print the completion for a shell and leave."""

    def __call__(
        self, parser: argparse.ArgumentParser, _: object, shell: object, *__: object
    ) -> None:
        _print(completion(parser, str(shell)))
        parser.exit()


class _Schema(argparse.Action):
    """Print the published JSON Schema and leave."""

    def __call__(self, parser: argparse.ArgumentParser, *_: object) -> None:
        from evenstage import flow

        _print(flow.schema_text())
        parser.exit()


def _command(
    commands: argparse._SubParsersAction[argparse.ArgumentParser],
    name: str,
    command: Callable[[argparse.Namespace], flow.Result],
    words: str,
) -> argparse.ArgumentParser:
    parser = commands.add_parser(
        name,
        help=words,
        description=f"{words[0].upper()}{words[1:]}.",
        epilog=f"example: {_EXAMPLES[name]}\n{_CAUTION}",
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.set_defaults(command=command)
    return parser


def _shared(parser: argparse.ArgumentParser, *, paths: bool = True, page: bool = True) -> None:
    """Add what every command takes, what those on paths take, and those that make a page."""
    add = parser.add_argument
    add(
        "--process",
        type=_file,
        action="append",
        default=[],
        metavar="FILE",
        help="what a micron of transistor is worth; again for each further corner",
    )
    add("--brief", type=_file, metavar="FILE", help="what the netlist does not say: loads, limits")
    add("--top", metavar="NAME", help="the subcircuit to work on (the one nobody calls)")
    if paths:
        add("--from", metavar="NET", help="only paths that begin there; * and ? are wild")
        add("--to", metavar="NET", help="only paths that end there; * and ? are wild")
    if page:
        add("--html", type=_file, metavar="FILE", help="a page to hold a review on")
    add("--json", type=_file, metavar="FILE", help="the result for scripts; - is standard output")
    add("--quiet", action="store_true", help="no notices, no progress")


def _wishes(parser: argparse.ArgumentParser) -> None:
    """Add what only ``resize`` takes."""
    goal = parser.add_mutually_exclusive_group()
    goal.add_argument(
        "--delay", type=_delay, metavar="VALUE", help="the least width for a delay, as in 450p"
    )
    goal.add_argument(
        "--width",
        type=_positive,
        metavar="FACTOR",
        help="the fastest within a width, against today",
    )
    parser.add_argument(
        "--margin",
        type=_percent,
        default=1.0,
        metavar="PERCENT",
        help="how much delay may be given up for less width (1; 0: the fastest)",
    )
    parser.add_argument(
        "--scope",
        choices=("path", "block"),
        default="path",
        help="what may move: the slowest paths' gates (default), or all",
    )
    parser.add_argument(
        "--reclaim", action="store_true", help="also make smaller what is off the slowest paths"
    )
    parser.add_argument(
        "--spend",
        choices=("width", "energy"),
        help="what is kept small: total width, or switched capacitance (the brief's aim.spend)",
    )
    parser.add_argument(
        "--changes", type=_count, metavar="N", help="change at most so many cards, the best found"
    )
    parser.add_argument(
        "--curve",
        action="store_true",
        help="also the least width for a dozen delays, from today's to the least possible",
    )
    parser.add_argument("--force", action="store_true", help="overwrite the output")


def _file(text: str) -> Path:
    if not text:
        message = "a file name is empty"
        raise argparse.ArgumentTypeError(message)
    return Path(text)


def _output(text: str) -> Path:
    if text == "-":
        message = "a netlist is written to a file; say ./- for one of that name"
        raise argparse.ArgumentTypeError(message)
    return _file(text)


def _delay(text: str) -> float:
    value = _positive(text)
    if value > _DELAY_MOST:
        message = f"must be at most 1 ms, as in 450p, got '{text}'"
        raise argparse.ArgumentTypeError(message)
    return value


def _positive(text: str) -> float:
    try:
        value = parse_number(text)
    except ValueError as error:
        raise argparse.ArgumentTypeError(str(error)) from None
    if value <= 0:
        message = f"must be positive, got '{text}'"
        raise argparse.ArgumentTypeError(message)
    return value


def _conflicts(text: str) -> int:
    if not text.isascii() or not text.isdigit():
        message = f"must be a whole number, 0 or more, got '{text}'"
        raise argparse.ArgumentTypeError(message)
    return int(text)


def _percent(text: str) -> float:
    try:
        value = float(text)
    except ValueError:
        value = -1.0
    if not 0 <= value <= 1000:
        message = f"must be a percentage from 0 to 1000, got '{text}'"
        raise argparse.ArgumentTypeError(message)
    return value


def _count(text: str) -> int:
    if not (text.isdecimal() and 0 < int(text) <= 10_000):
        message = f"must be a whole number from 1 to 10000, got '{text}'"
        raise argparse.ArgumentTypeError(message)
    return int(text)
