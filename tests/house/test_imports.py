"""The order of the rooms: a room imports only from rooms above it, and nothing runs in circles."""

from __future__ import annotations

import ast
from dataclasses import dataclass
from graphlib import CycleError, TopologicalSorter
from pathlib import Path
from typing import TYPE_CHECKING, Final

import pytest

if TYPE_CHECKING:
    from collections.abc import Iterator

SOURCE: Final = Path(__file__).parents[2] / "src"

#: Top to bottom; rooms of one line do not know each other. ``__init__`` is the package's own file.
ORDER: Final = (
    (
        *("errors", "units", "source", "pattern", "progress", "tabular"),
        *("toml_places", "schema", "settings", "brief"),
    ),
    ("process",),
    ("netlist",),
    ("logic",),
    ("circuit",),
    ("timing",),
    ("sizing", "simulation", "fitting"),
    ("report",),
    ("flow",),
    ("__init__",),
    ("completion",),
    ("arguments",),
    ("cli",),
    ("__main__",),
)
RANK: Final = {room: rank for rank, rooms in enumerate(ORDER) for room in rooms}

#: Inside the netlist room, along the pipeline; what they share stands in the room itself.
NETLIST_ORDER: Final = ("netlist", "reading", "elaboration", "rewriting")

#: The single modules at the top; they may use each other.
LEAVES: Final = frozenset(ORDER[0])

#: What a file that only reads arguments and sets an exit status needs.
CLI_IMPORTS: Final = frozenset(
    {
        *("__future__", "argparse", "collections", "contextlib", "importlib", "os", "pathlib"),
        *("signal", "sys", "traceback", "typing"),
        *("evenstage", "evenstage.errors", "evenstage.flow", "evenstage.progress"),
        "evenstage.arguments",
    }
)


@dataclass(frozen=True, slots=True)
class Import:
    """One imported module: who imports it, where, and whether for the type checker alone."""

    importer: str
    module: str
    line: int
    typing_only: bool

    def __str__(self) -> str:
        return f"{self.importer}:{self.line} imports {self.module}"


def modules(source: Path) -> dict[str, Path]:
    """Return every module under a source folder by its dotted name."""
    return {
        ".".join(path.relative_to(source).with_suffix("").parts).removesuffix(".__init__"): path
        for path in sorted(source.rglob("*.py"))
    }


def imports(source: Path) -> list[Import]:
    """Return every import of every module; a name of a package counts as its submodule."""
    known = modules(source)
    return [
        Import(importer, module, node.lineno, typing_only)
        for importer, path in known.items()
        for node, typing_only in _import_nodes(ast.parse(path.read_bytes()), typing_only=False)
        for module in _targets(node, known)
    ]


def _import_nodes(
    node: ast.AST, *, typing_only: bool
) -> Iterator[tuple[ast.Import | ast.ImportFrom, bool]]:
    if isinstance(node, ast.Import | ast.ImportFrom):
        yield node, typing_only
    if isinstance(node, ast.If) and ast.unparse(node.test) == "TYPE_CHECKING":
        typing_only = True
    for child in ast.iter_child_nodes(node):
        yield from _import_nodes(child, typing_only=typing_only)


def _targets(node: ast.Import | ast.ImportFrom, known: dict[str, Path]) -> list[str]:
    if isinstance(node, ast.Import):
        return [alias.name for alias in node.names]
    assert node.level == 0, "relative imports hide which room is meant"
    base = node.module or ""
    submodules = [f"{base}.{alias.name}" for alias in node.names]
    return [name if name in known else base for name in submodules]


def room(module: str) -> str:
    """Return the room of a module of the program."""
    return module.split(".")[1] if "." in module else "__init__"


def against_the_order(found: list[Import]) -> list[str]:
    """Return the imports of the program's own modules that do not point upwards."""
    return [
        str(entry)
        for entry in found
        if entry.module.split(".")[0] == "evenstage"
        and not _may_import(room(entry.importer), room(entry.module))
    ]


def _may_import(importer: str, imported: str) -> bool:
    if importer == imported or {importer, imported} <= LEAVES:
        return True
    return RANK[imported] < RANK[importer]


def against_the_pipeline(found: list[Import]) -> list[str]:
    """Return the imports inside the netlist room that point forwards along its pipeline."""
    return [
        str(entry)
        for entry in found
        if room(entry.importer) == room(entry.module) == "netlist"
        and NETLIST_ORDER.index(_part(entry.importer)) < NETLIST_ORDER.index(_part(entry.module))
    ]


def _part(module: str) -> str:
    """Return the folder of the netlist room that a module stands in."""
    part = [*module.split("."), "netlist"][2]
    return part if part in NETLIST_ORDER else "netlist"


def cycle(found: list[Import]) -> list[str]:
    """Return the modules of one circle of imports that happen when the program runs."""
    graph: dict[str, set[str]] = {}
    for entry in found:
        if not entry.typing_only:
            graph.setdefault(entry.importer, set()).add(entry.module)
    try:
        TopologicalSorter(graph).prepare()
    except CycleError as error:
        return list(error.args[1])
    return []


@pytest.fixture(scope="module")
def found() -> list[Import]:
    return imports(SOURCE)


class TestTheProgram:
    def test_every_module_belongs_to_a_room(self) -> None:
        assert [name for name in modules(SOURCE) if room(name) not in RANK] == []

    def test_rooms_import_only_from_above(self, found: list[Import]) -> None:
        assert against_the_order(found) == []

    def test_parts_of_the_netlist_room_import_only_against_the_flow(
        self, found: list[Import]
    ) -> None:
        assert against_the_pipeline(found) == []

    def test_no_module_imports_itself_through_others(self, found: list[Import]) -> None:
        assert cycle(found) == []

    def test_lark_is_known_to_the_netlist_alone(self, found: list[Import]) -> None:
        users = {room(entry.importer) for entry in found if entry.module.split(".")[0] == "lark"}
        assert users <= {"netlist"}

    def test_command_line_holds_no_logic(self, found: list[Import]) -> None:
        used = {entry.module for entry in found if room(entry.importer) == "cli"}
        assert {
            m for m in used if m.split(".")[0] not in CLI_IMPORTS - {"evenstage"}
        } <= CLI_IMPORTS

    def test_running_as_a_module_is_the_command_line(self, found: list[Import]) -> None:
        used = {entry.module for entry in found if room(entry.importer) == "__main__"}
        assert used <= {"__future__", "sys", "evenstage.cli"}


def invented(folder: Path, files: dict[str, str]) -> list[Import]:
    """Return the imports of a small package written for a test."""
    for name, text in files.items():
        path = folder / "evenstage" / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, "utf-8")
    return imports(folder)


class TestTheCheckItself:
    @pytest.mark.parametrize(
        "text",
        [
            "from evenstage.sizing.problem import Problem",
            "from evenstage.sizing import problem",
            "import evenstage.sizing.problem",
            "from evenstage import sizing",
            "def late():\n    import evenstage.sizing.problem",
            "if TYPE_CHECKING:\n    from evenstage.sizing.problem import Problem",
        ],
    )
    def test_sees_every_form_of_a_wrong_import(self, tmp_path: Path, text: str) -> None:
        found = invented(
            tmp_path, {"timing/arcs.py": text, "sizing/__init__.py": "", "sizing/problem.py": ""}
        )
        assert len(against_the_order(found)) == 1

    @pytest.mark.parametrize("neighbour", ["simulation", "fitting"])
    def test_sees_rooms_that_must_not_know_sizing(self, tmp_path: Path, neighbour: str) -> None:
        found = invented(tmp_path, {f"{neighbour}/run.py": "import evenstage.sizing"})
        assert against_the_order(found) == [f"evenstage.{neighbour}.run:1 imports evenstage.sizing"]

    @pytest.mark.parametrize(
        ("importer", "imported", "wrong"),
        [
            ("reading/read.py", "rewriting.edits", 1),
            ("devices.py", "reading.read", 1),
            ("devices.py", "reading", 1),
            ("rewriting/copies.py", "reading.read", 0),
            ("rewriting/copies.py", "devices", 0),
        ],
    )
    def test_sees_parts_that_look_ahead(
        self, tmp_path: Path, importer: str, imported: str, wrong: int
    ) -> None:
        found = invented(tmp_path, {f"netlist/{importer}": f"import evenstage.netlist.{imported}"})
        assert len(against_the_pipeline(found)) == wrong

    def test_accepts_imports_from_above(self, tmp_path: Path) -> None:
        text = "import numpy\nfrom evenstage.netlist import read\nfrom evenstage.errors import X"
        assert against_the_order(invented(tmp_path, {"timing/arcs.py": text})) == []

    def test_sees_a_circle(self, tmp_path: Path) -> None:
        files = {"netlist/a.py": "import evenstage.netlist.b"}
        files["netlist/b.py"] = "from evenstage.netlist import a"
        assert set(cycle(invented(tmp_path, files))) == {
            "evenstage.netlist.a",
            "evenstage.netlist.b",
        }

    def test_lets_the_type_checker_look_in_circles(self, tmp_path: Path) -> None:
        files = {"netlist/a.py": "import evenstage.netlist.b"}
        files["netlist/b.py"] = "if TYPE_CHECKING:\n    from evenstage.netlist import a"
        assert cycle(invented(tmp_path, files)) == []
