"""Files written all together or not at all.

``--output`` names the main file. Included files from its folder or below keep their place relative
to it: changed ones always, unchanged ones where the output stands in another folder, so that
relative includes go on working. A file that goes by several names, links to it, is written under
each of them. Included files from elsewhere are never written.
"""

from __future__ import annotations

import os
import stat
import tempfile
from contextlib import suppress
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

from evenstage.errors import Notice, OutputError

if TYPE_CHECKING:
    from collections.abc import Mapping, Sequence

    from evenstage.netlist.netlist import Netlist


def output_paths(netlist: Netlist, output: Path) -> dict[Path, tuple[Path, ...]]:
    """Return the places where each file of a netlist goes that may be written.

    Parameters
    ----------
    netlist : Netlist
        The netlist.
    output : Path
        Where its main file goes.

    Returns
    -------
    dict of Path to tuple of Path
        By the path of the source, main file first; files with no name in the main file's folder do
        not occur.
    """
    folder, new_folder = netlist.folder, output.absolute().parent
    places: dict[Path, tuple[Path, ...]] = {netlist.sources[0].path: (output,)}
    for path, names in netlist.names.items():
        inside = (name.relative_to(folder) for name in names if name.is_relative_to(folder))
        by_file = {os.path.realpath(new_folder / name): new_folder / name for name in inside}
        if by_file:
            places.setdefault(path, tuple(by_file.values()))
    return places


def output_files(netlist: Netlist, texts: Mapping[Path, bytes], output: Path) -> dict[Path, bytes]:
    """Return all files to be written for a netlist, the main file first.

    Parameters
    ----------
    netlist : Netlist
        As read.
    texts : Mapping of Path to bytes
        New contents of the sources that change, from ``rewrite``.
    output : Path
        Where the main file goes; it is written even if it does not change.
    """
    data = {source.path: source.data for source in netlist.sources} | dict(texts)
    main = netlist.sources[0].path
    return {
        target: data[path]
        for path, targets in output_paths(netlist, output).items()
        for target in targets
        if path == main or not _holds(target, data[path])
    }


def lost_includes(netlist: Netlist, output: Path) -> tuple[Notice, ...]:
    """Return a notice if files are included that cannot be found from the output's place."""
    folder, new_folder = netlist.folder, output.absolute().parent
    # An include that names its file from the root is found from anywhere.
    lost = [
        source
        for source in netlist.sources
        if source.path not in netlist.rooted
        for name in netlist.names[source.path]
        if not name.is_relative_to(folder)
        and (new_folder / os.path.relpath(name, folder)).resolve() != source.path
    ]
    if not lost:
        return ()
    message = (
        f"'{lost[0].label}' lies outside the folder of the main file and is included by a relative "
        f"path that does not lead there from '{output}'"
    )
    return (Notice("include-lost", message, names=tuple(s.label for s in lost)),)


def write_files(files: Mapping[Path, bytes], *, force: bool) -> None:
    """Write some files together.

    All are written beside their places under other names first and then renamed. If anything goes
    wrong, or the run is interrupted, every file is left as it was.

    Parameters
    ----------
    files : Mapping of Path to bytes
        New contents; the first file's folder must exist, those of the others are made.
    force : bool
        Whether existing files, inputs among them, may be overwritten.

    Raises
    ------
    OutputError
        If a file exists and ``force`` is not given, or one cannot be written.
    """
    for path in files:
        _check_place(path, force=force)
    _check_folder(next(iter(files), Path()))
    exchange = _Exchange()
    path = Path()
    try:
        for path, data in files.items():
            exchange.stage(Path(os.path.realpath(path)), data)
        for path in files:
            exchange.put_in_place(Path(os.path.realpath(path)))
    except OSError as error:
        exchange.undo()
        reason = (error.strerror or str(error)).lower()
        raise OutputError(
            f"cannot write '{path}': {reason}; nothing was changed", code="cannot-write"
        ) from error
    except BaseException:
        exchange.undo()
        raise
    exchange.finish()


def _holds(path: Path, data: bytes) -> bool:
    """Tell whether a file exists with just these contents."""
    try:
        return path.read_bytes() == data
    except OSError:
        return False


def _check_folder(path: Path) -> None:
    """Refuse to write where there is no folder."""
    if not path.absolute().parent.is_dir():
        raise OutputError(
            f"there is no folder '{path.parent}' to write '{path.name}' to; make it first",
            code="no-folder",
        )


def _check_place(path: Path, *, force: bool) -> None:
    """Refuse to write over what is there."""
    if not os.path.lexists(path):
        return
    if not path.is_file():
        raise OutputError(
            f"'{path}' is there and is not a file; choose another name", code="output-exists"
        )
    if not force:
        raise OutputError(
            f"'{path}' exists; choose another name, or say --force to overwrite it",
            code="output-exists",
        )


@dataclass(frozen=True, slots=True)
class _Exchange:
    """New files for old ones, with a way back until the last moment."""

    staged: dict[Path, Path] = field(default_factory=dict)
    kept: dict[Path, Path] = field(default_factory=dict)
    placed: list[Path] = field(default_factory=list)
    folders: list[Path] = field(default_factory=list)

    def stage(self, path: Path, data: bytes) -> None:
        """Write a file's new contents beside its place, down to the disk."""
        self._make_folder(path.parent)
        self.staged[path] = self._beside(path)
        with self.staged[path].open("wb") as stream:
            stream.write(data)
            stream.flush()
            os.fsync(stream.fileno())
        if path.exists():
            self.staged[path].chmod(stat.S_IMODE(path.stat().st_mode))

    def put_in_place(self, path: Path) -> None:
        """Rename a staged file to its place; the old one is kept under another name."""
        if path.exists():
            self.kept[path] = self._beside(path)
            self.kept[path].write_bytes(path.read_bytes())
            self.kept[path].chmod(stat.S_IMODE(path.stat().st_mode))
        self.placed.append(path)
        self.staged[path].replace(path)

    def undo(self) -> None:
        """Restore every file."""
        for path in self.placed:
            staged = self.staged[path]
            if staged.exists():
                continue
            if path in self.kept:
                self.kept[path].replace(path)
            else:
                path.unlink(missing_ok=True)
        self.finish()
        for folder in reversed(self.folders):
            with suppress(OSError):
                folder.rmdir()

    def finish(self) -> None:
        """Remove what is no longer needed."""
        for path in (*self.staged.values(), *self.kept.values()):
            with suppress(OSError):
                path.unlink(missing_ok=True)

    def _make_folder(self, folder: Path) -> None:
        missing = [f for f in (folder, *folder.parents) if not f.exists()]
        for made in reversed(missing):
            made.mkdir()
            self.folders.append(made)

    @staticmethod
    def _beside(path: Path) -> Path:
        """Return a new empty file in the same folder, readable as any other new file is."""
        handle, name = tempfile.mkstemp(prefix=f".{path.name}.", dir=path.parent)
        umask = os.umask(0)
        os.umask(umask)
        os.close(handle)
        Path(name).chmod(0o666 & ~umask)
        return Path(name)


def check_place(path: Path, inputs: Sequence[Path] = ()) -> None:
    """Refuse a place for a report before any work is done.

    Raises
    ------
    OutputError
        Where it is one of the files that are read or written besides, is no file, or lies in no
        folder.
    """
    if any(path.resolve() == other.resolve() for other in inputs):
        raise OutputError(
            f"'{path}' is read or written already; choose another name for what is to be written",
            code="output-exists",
        )
    if path.exists() and not path.is_file():
        raise OutputError(
            f"'{path}' is there and is not a file; choose another name", code="output-exists"
        )
    if not path.absolute().parent.is_dir():
        raise OutputError(
            f"there is no folder '{path.parent}' to write '{path.name}' to; make it first",
            code="no-folder",
        )
