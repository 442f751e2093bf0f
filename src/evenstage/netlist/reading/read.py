"""From files to a ``Netlist``: cards, definitions, included files."""

from __future__ import annotations

import os
from pathlib import Path
from typing import TYPE_CHECKING

from evenstage.errors import NetlistError
from evenstage.netlist.collection import without_collection
from evenstage.netlist.reading.case import settle_case
from evenstage.netlist.reading.files import read_file, why_not
from evenstage.netlist.reading.reader import Reader
from evenstage.source import SourceText

if TYPE_CHECKING:
    from evenstage.netlist.netlist import Netlist
    from evenstage.netlist.reading.case import Case
    from evenstage.netlist.reading.opening import FirstLine


def read(
    path: Path | str, case: Case | None = None, first_line: FirstLine | None = None
) -> Netlist:
    """Read a netlist and the files it includes.

    Parameters
    ----------
    path : Path or str
        The main file.
    case : {"any", "exact"}, optional
        Whether case counts in the names of nets; None: only if two ports of one subcircuit differ
        by it alone.
    first_line : {"title", "card"}, optional
        What the main file begins with; None: a title, unless it is plainly something else.

    Raises
    ------
    NetlistError
        If a file cannot be read or its text is no netlist.

    Examples
    --------
    >>> folder = "sample_netlists/pad_predriver"
    >>> [source.path.name for source in read(f"{folder}/netlist.sp").sources]
    ['netlist.sp']
    >>> read("missing.sp")
    Traceback (most recent call last):
    evenstage.errors.NetlistError: there is no file 'missing.sp' (missing-file)
    """
    path = Path(path)
    try:
        data = read_file(path)
    except FileNotFoundError:
        raise NetlistError(f"there is no file '{path}'", code="missing-file") from None
    except (OSError, ValueError) as error:
        message = f"cannot read '{path}': {why_not(error)}"
        raise NetlistError(message, code="unreadable-file") from None
    return _read(SourceText(Path(os.path.realpath(path)), data, str(path)), path, case, first_line)


def read_bytes(
    data: bytes,
    label: str,
    folder: Path,
    case: Case | None = None,
    first_line: FirstLine | None = None,
) -> Netlist:
    r"""Read a netlist that is not (yet) a file.

    Parameters
    ----------
    data : bytes
        The text.
    label : str
        What messages call it.
    folder : Path
        Where the files it includes are looked for.
    case : {"any", "exact"}, optional
        As for ``read``.
    first_line : {"title", "card"}, optional
        As for ``read``.

    Raises
    ------
    NetlistError
        If the text, or that of an included file, is no netlist.

    Examples
    --------
    >>> len(read_bytes(b".subckt inv a y vdd vss\n.ends\n", "inv.sp", Path()))
    0
    """
    name = folder / label
    return _read(SourceText(Path(os.path.realpath(name)), data, label), name, case, first_line)


def _read(
    source: SourceText, name: Path, case: Case | None, first_line: FirstLine | None
) -> Netlist:
    with without_collection():
        reader = Reader()
        absolute = Path(os.path.abspath(name))  # noqa: PTH100 - links stay links
        reader.read_main(source, absolute, first_line)
        netlist = settle_case(reader.finish(), reader.word_numbers, case, reader.clash)
        reader.release()
        return netlist
