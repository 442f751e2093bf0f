"""Arguments in, exit status out; everything between is `evenstage.flow`."""

from __future__ import annotations

import argparse
import os
import sys
import traceback
from pathlib import Path
from typing import TYPE_CHECKING

from evenstage import __version__, flow
from evenstage.errors import EvenstageError
from evenstage.units import parse_number

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

DONE, WRONG_INPUT, WRONG_USAGE, OUR_FAULT, INTERRUPTED = 0, 1, 2, 3, 130

_CAUTION = "Figures are estimates, not sign-off: simulate at all corners before you rely on them."


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
        asked = _parser().parse_args(arguments)
    except SystemExit as stop:
        return int(stop.code or 0)
    try:
        _show(asked.command(asked), asked)
        sys.stdout.flush()
    except EvenstageError as error:
        _say(str(error))
        return WRONG_INPUT
    except KeyboardInterrupt:
        _say("interrupted; no file is left half-written")
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
    """Write a message to standard error, whatever its characters."""
    encoding = sys.stderr.encoding or "utf-8"
    print(message.encode(encoding, "replace").decode(encoding), file=sys.stderr)


def _show(result: flow.Result, asked: argparse.Namespace) -> None:
    """Print a result and its notices where they were asked for.

    A report holds its notices; JSON is for scripts, so there people find them on standard error.
    """
    if asked.json == "-":
        sys.stdout.write(flow.json(result))
        for notice in () if asked.quiet else flow.notices(result):
            _say(f"notice: {notice}")
        return
    if asked.json:
        flow.write_text(Path(asked.json), flow.json(result), force=True)
    encoding = sys.stdout.encoding or "ascii"
    unicode = encoding.lower().startswith("utf")
    report = flow.text(result, width=_width(), unicode=unicode, with_notices=not asked.quiet)
    sys.stdout.write(report.encode(encoding, "replace").decode(encoding))


def _width() -> int:
    """Return the width of the report: the terminal's within reason, 100 where there is none."""
    given = os.environ.get("COLUMNS", "")
    if given.isdigit():
        columns = int(given)
    elif sys.stdout.isatty():
        columns = os.get_terminal_size(sys.stdout.fileno()).columns
    else:
        columns = 100
    return min(max(columns, 80), 160)


def _analyse(asked: argparse.Namespace) -> flow.Result:
    return flow.analyse(asked.netlist, _question(asked))


def _resize(asked: argparse.Namespace) -> flow.Result:
    wishes = flow.Wishes(
        delay=asked.delay,
        width=asked.width,
        margin=asked.margin / 100,
        scope=asked.scope,
        reclaim=asked.reclaim,
    )
    return flow.resize(asked.netlist, _question(asked), wishes, asked.output, force=asked.force)


def _diff(asked: argparse.Namespace) -> flow.Result:
    return flow.diff(asked.before, asked.after, _question(asked))


def _question(asked: argparse.Namespace) -> flow.Question:
    return flow.Question(
        process=asked.process,
        brief=asked.brief,
        top=asked.top,
        start=getattr(asked, "from"),
        end=asked.to,
        count=getattr(asked, "count", 1),
    )


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="evenstage",
        description="Find the slowest path of a transistor netlist, and widths that make it fast.",
        epilog=_CAUTION,
        allow_abbrev=False,
    )
    parser.add_argument("--version", action="version", version=f"evenstage {__version__}")
    commands = parser.add_subparsers(title="commands", metavar="COMMAND", required=True)
    analyse = _command(commands, "analyse", _analyse, "the slowest paths, stage by stage")
    analyse.add_argument("netlist", type=Path, metavar="NETLIST")
    analyse.add_argument(
        "--count", type=_count, default=1, metavar="K", help="how many slowest paths (1)"
    )
    _shared(analyse)
    resize = _command(commands, "resize", _resize, "new widths, written into a new netlist")
    resize.add_argument("netlist", type=Path, metavar="NETLIST")
    resize.add_argument(
        "--output", type=Path, metavar="FILE", help="the netlist to write; without it, only shown"
    )
    _wishes(resize)
    _shared(resize)
    diff = _command(commands, "diff", _diff, "two netlists of one design, side by side")
    diff.add_argument("before", type=Path, metavar="BEFORE")
    diff.add_argument("after", type=Path, metavar="AFTER")
    _shared(diff)
    return parser


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
        epilog=_CAUTION,
        allow_abbrev=False,
    )
    parser.set_defaults(command=command)
    return parser


def _shared(parser: argparse.ArgumentParser) -> None:
    """Add what every command takes."""
    add = parser.add_argument
    add("--process", type=Path, metavar="FILE", help="what a micron of transistor is worth")
    add("--brief", type=Path, metavar="FILE", help="what the netlist does not say: loads, limits")
    add("--top", metavar="NAME", help="the subcircuit to work on (the one nobody calls)")
    add("--from", metavar="NET", help="only paths that begin there; * and ? are wild")
    add("--to", metavar="NET", help="only paths that end there; * and ? are wild")
    add("--json", metavar="FILE", help="the result for scripts; - is standard output")
    add("--quiet", action="store_true", help="no notices")


def _wishes(parser: argparse.ArgumentParser) -> None:
    """Add what only ``resize`` takes."""
    goal = parser.add_mutually_exclusive_group()
    goal.add_argument(
        "--delay", type=_positive, metavar="VALUE", help="the least width for a delay, as in 450p"
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
    parser.add_argument("--force", action="store_true", help="overwrite the output")


def _positive(text: str) -> float:
    try:
        value = parse_number(text)
    except ValueError as error:
        raise argparse.ArgumentTypeError(str(error)) from None
    if value <= 0:
        message = f"must be positive, got '{text}'"
        raise argparse.ArgumentTypeError(message)
    return value


def _percent(text: str) -> float:
    try:
        value = float(text)
    except ValueError:
        value = -1.0
    if not 0 <= value <= 1000:
        message = f"must be a percentage from 0 on, got '{text}'"
        raise argparse.ArgumentTypeError(message)
    return value


def _count(text: str) -> int:
    if not (text.isdecimal() and 0 < int(text) <= 10_000):
        message = f"must be a whole number from 1 to 10000, got '{text}'"
        raise argparse.ArgumentTypeError(message)
    return int(text)
