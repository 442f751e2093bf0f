"""The command line: its commands, options, help and examples."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Final

from evenstage import __version__
from evenstage.completion import completion
from evenstage.report.published import schema_text
from evenstage.units import parse_number

if TYPE_CHECKING:
    from collections.abc import Callable, Sequence

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
    "report": (
        "a page from a result that was kept:\n  evenstage report result.json --html page.html\n"
    ),
    "fit": (
        "a process file from delays measured, and from simulated ones:\n"
        "  evenstage fit delays.csv --netlist cells.sp --output kit.toml\n"
        "  evenstage fit --simulated cells.sp --output kit.toml\n"
    ),
}


def parsed(arguments: Sequence[str], show: Callable[[str], object] = print) -> argparse.Namespace:
    """Return the arguments read, where those of ``fit`` say one source of delays and no more.

    Parameters
    ----------
    arguments : sequence of str
        Without the program's name.
    show : callable, optional
        Takes a text that is all that was asked for: the JSON Schema, or a completion.

    Raises
    ------
    SystemExit
        Where help or such a text was asked for, with 0; for wrong usage, with 2.
    """
    parser = _parser(show)
    asked = parser.parse_args(arguments)
    if asked.command == "fit":
        given = (asked.measurements, asked.simulated, asked.deck)
        if sum(one is not None for one in given) != 1:
            parser.error(
                "fit: give MEASUREMENTS or --deck FILE with --netlist CELLS, or --simulated NETLIST"
            )
        if (asked.simulated is None) != (asked.cells is not None):
            parser.error("fit: MEASUREMENTS or --deck FILE and --netlist CELLS go together")
    asked.arguments = tuple(arguments)
    return asked


def _parser(show: Callable[[str], object]) -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="evenstage",
        description="Find the slowest path of a transistor netlist, and widths that make it fast.",
        epilog=f"evenstage COMMAND --help shows each with an example.\n\n{_CAUTION}",
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("--version", action="version", version=f"evenstage {__version__}")
    parser.add_argument(
        "--json-schema",
        action=_Text,
        nargs=0,
        made=lambda *_: schema_text(),
        show=show,
        help="print the JSON Schema of --json, and leave",
    )
    parser.add_argument(
        "--completion",
        action=_Text,
        made=completion,
        show=show,
        choices=("bash", "fish", "zsh"),
        metavar="SHELL",
        help="print what teaches bash, fish or zsh to complete, and leave",
    )
    commands = parser.add_subparsers(title="commands", metavar="COMMAND", required=True)
    analyse = _command(commands, "analyse", "the slowest paths, stage by stage")
    analyse.add_argument("netlist", type=_file, metavar="NETLIST")
    analyse.add_argument(
        "--count", type=_count, default=1, metavar="K", help="how many slowest paths (1)"
    )
    _search(analyse)
    _shared(analyse)
    resize = _command(commands, "resize", "new widths, written into a new netlist")
    resize.add_argument("netlist", type=_file, metavar="NETLIST")
    resize.add_argument(
        "--output",
        type=_output,
        metavar="FILE",
        help="the netlist to write; without it, only shown",
    )
    _wishes(resize)
    _shared(resize)
    diff = _command(commands, "diff", "two netlists of one design, side by side")
    diff.add_argument("before", type=_file, metavar="BEFORE")
    diff.add_argument("after", type=_file, metavar="AFTER")
    _shared(diff)
    simulate = _command(
        commands,
        "simulate",
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
    _search(simulate)
    _shared(simulate)
    recognise = _command(
        commands, "recognise", "what each group of transistors is, and what it computes"
    )
    recognise.add_argument("netlist", type=_file, metavar="NETLIST")
    recognise.add_argument(
        "--graph", type=_file, metavar="FILE", help="the graph of gates, as GraphML"
    )
    _shared(recognise, paths=False, page=False)
    fit = _command(commands, "fit", "process constants from delays that you measured")
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
    report = _command(commands, "report", "a result that was kept as JSON, shown again")
    report.add_argument("result", type=_file, metavar="FILE")
    report.add_argument("--html", type=_file, metavar="FILE", help="a page to hold a review on")
    report.add_argument("--quiet", action="store_true", help="no notices, no progress")
    report.set_defaults(json=None, process=[])
    return parser


class _Text(argparse.Action):
    """Show a text that is all that was asked for, and leave."""

    def __init__(
        self,
        option_strings: Sequence[str],
        dest: str,
        made: Callable[[argparse.ArgumentParser, str], str],
        show: Callable[[str], object],
        nargs: int | None = None,
        choices: Sequence[str] | None = None,
        metavar: str | None = None,
        help: str | None = None,  # noqa: A002 -- argparse's word
    ) -> None:
        super().__init__(
            option_strings, dest, nargs=nargs, choices=choices, metavar=metavar, help=help
        )
        self._made, self._show = made, show

    def __call__(
        self, parser: argparse.ArgumentParser, _: object, value: object, *__: object
    ) -> None:
        self._show(self._made(parser, str(value)))
        parser.exit()


def _command(
    commands: argparse._SubParsersAction[argparse.ArgumentParser],
    name: str,
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
    parser.set_defaults(command=name)
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
        "--apart",
        action="store_true",
        help="size pull-up and pull-down of a gate apart, within the brief's skew",
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
        message = f"is in seconds, at most 1 ms: 450p or 450ps for 450 ps, got '{text}'"
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


def _search(command: argparse.ArgumentParser) -> None:
    """Add what the search for vectors may cost."""
    command.add_argument(
        "--conflicts",
        type=_conflicts,
        metavar="N",
        help="give up the search for a path's input vector after N conflicts (20000; 0: no search)",
    )


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
