"""What may stand where in the tree, and words that must stand nowhere."""

from __future__ import annotations

import ast
import re
from fnmatch import fnmatch
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Final

import pytest
from lark import Lark

if TYPE_CHECKING:
    from collections.abc import Iterable

ROOT: Final = Path(__file__).parents[2]

TOP_LEVEL: Final = frozenset(
    {
        *("README.md", "DEVELOPERS.md", "pyproject.toml", "LICENSE"),
        *("src", "tests", "sample_netlists", "grammar"),
    }
)

#: One letter of each word stands in brackets, so that this file does not hold the word itself.
NOT_OURS: Final = re.compile(
    r"\b(tran[s]cripts?|lectu[r]es?|lectu[r]er|pro[f]essor|cour[s]ework|home[w]ork)\b",
    re.IGNORECASE,
)
REGISTRIES: Final = re.compile(
    r"pypi\.(?:org|python)|files\.python[h]osted|registry\.np[m]js|deb\.debi[a]n", re.IGNORECASE
)
MACHINE_PATHS: Final = re.compile(r"(?<![\w.])/(?:work|farm|home|root|Users|tmp|mnt|opt)/\w")
UNFINISHED: Final = re.compile(r"\b(?:TO[D]O|FIXM[E]|XX[X]|HAC[K])\b|NotImplemented[E]rror")

SUPPRESSIONS_AT_MOST: Final = 20


@cache
def files() -> tuple[Path, ...]:
    """Return every file of the tree but those that .gitignore leaves out."""
    ignored = [line.rstrip("/") for line in (ROOT / ".gitignore").read_text("utf-8").split()]
    return tuple(_walk(ROOT, [*ignored, ".git"]))


def _walk(folder: Path, ignored: list[str]) -> Iterable[Path]:
    for path in sorted(folder.iterdir()):
        if any(fnmatch(path.name, pattern) for pattern in ignored):
            continue
        if path.is_dir():
            yield from _walk(path, ignored)
        else:
            yield path


def places(pattern: re.Pattern[str], paths: Iterable[Path]) -> list[str]:
    """Return ``file:line: words`` for every match, bytes that are not UTF-8 notwithstanding."""
    return [
        f"{path.relative_to(ROOT)}:{number}: {match[0]}"
        for path in paths
        for number, line in enumerate(path.read_text("utf-8", "replace").split("\n"), 1)
        for match in pattern.finditer(line)
    ]


def python(folder: str) -> list[Path]:
    return [path for path in files() if path.suffix == ".py" and path.is_relative_to(ROOT / folder)]


class TestLayout:
    def test_top_level_holds_what_was_agreed(self) -> None:
        found = {path.relative_to(ROOT).parts[0] for path in files()}
        assert {name for name in found if not name.startswith(".")} == TOP_LEVEL

    def test_grammars_stand_in_one_folder(self) -> None:
        assert {path.parent for path in files() if path.suffix == ".lark"} == {ROOT / "grammar"}

    def test_no_grammar_hides_in_code(self) -> None:
        directive = re.compile(r"^\s*%(?:import|ignore|declare|extend|override)\b", re.MULTILINE)
        hidden = [
            f"{path.relative_to(ROOT)}:{node.lineno}"
            for path in python("src")
            for node in ast.walk(ast.parse(path.read_bytes()))
            if isinstance(node, ast.Constant)
            and isinstance(node.value, str)
            and directive.search(node.value)
        ]
        assert hidden == []

    def test_tests_stand_in_the_rooms_they_test(self) -> None:
        rooms = {path.name for path in (ROOT / "src" / "evenstage").iterdir() if path.is_dir()}
        others = {"house", "reference", "benchmarks", "golden", "support"}
        tested = {path.relative_to(ROOT / "tests").parts[0] for path in python("tests")}
        assert {name for name in tested if not name.endswith(".py")} <= rooms | others


class TestGrammars:
    @pytest.mark.parametrize(
        "path", sorted((ROOT / "grammar").glob("*.lark")), ids=lambda p: p.stem
    )
    def test_is_free_of_collisions(self, path: Path) -> None:
        """A strict LALR table has no conflict, and no two terminals match one text."""
        start = re.search(r"^[?!]?([a-z]\w*)", path.read_text("utf-8"), re.MULTILINE)
        assert start is not None
        flags = re.IGNORECASE
        Lark.open(str(path), parser="lalr", strict=True, start=start[1], g_regex_flags=flags)


class TestWords:
    @pytest.mark.parametrize("pattern", [NOT_OURS, REGISTRIES, MACHINE_PATHS])
    def test_stand_nowhere(self, pattern: re.Pattern[str]) -> None:
        assert places(pattern, files()) == []

    def test_no_unfinished_marks(self) -> None:
        assert places(UNFINISHED, python("src")) == []

    def test_checks_are_seldom_switched_off(self) -> None:
        found = places(re.compile(r"# (?:noqa|type: ignore)\b.*"), python("src"))
        assert len(found) <= SUPPRESSIONS_AT_MOST, found

    @pytest.mark.parametrize(
        ("pattern", "text"),
        [
            (NOT_OURS, "from the Lec" + "ture"),
            (REGISTRIES, "https://pypi" + ".org/simple"),
            (MACHINE_PATHS, "open('/" + "home/somebody')"),
            (UNFINISHED, "# TO" + "DO"),
        ],
    )
    def test_would_be_seen(self, pattern: re.Pattern[str], text: str) -> None:
        assert pattern.search(text)
