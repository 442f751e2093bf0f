"""Pages in a browser: quiet, legible at any width and in print, sortable, and open to everyone."""

from __future__ import annotations

import os
import re
from pathlib import Path
from typing import TYPE_CHECKING, Final

import pytest

from evenstage.cli import main
from support.browser import CHROMIUM, Browser

if TYPE_CHECKING:
    from collections.abc import Iterator

ROOT: Final = Path(__file__).parents[3]
SAMPLES: Final = sorted((ROOT / "sample_netlists").iterdir())
AXE: Final = Path(
    os.environ.get("EVENSTAGE_AXE", ROOT / ".venv" / "node_modules" / "axe-core" / "axe.min.js")
)

pytestmark = pytest.mark.skipif(CHROMIUM is None, reason="no chromium is installed")

#: Pairs of texts of one drawing that touch, and texts that stick out of their drawing's box.
CLASHES: Final = """
(() => {
  const found = [];
  for (const drawing of document.querySelectorAll("svg[role=img]")) {
    const frame = drawing.getBoundingClientRect();
    const texts = Array.from(drawing.querySelectorAll("text")).map((text) => {
      const box = text.getBoundingClientRect();
      const says = text.textContent;
      if (says && (box.left < frame.left - 1 || box.right > frame.right + 1 ||
          box.top < frame.top - 1 || box.bottom > frame.bottom + 1))
        found.push(`sticks out: ${says}`);
      return [says, box];
    });
    texts.forEach(([says, a], i) => texts.slice(i + 1).forEach(([other, b]) => {
      const across = Math.min(a.right, b.right) - Math.max(a.left, b.left);
      const down = Math.min(a.bottom, b.bottom) - Math.max(a.top, b.top);
      if (across > 1 && down > 3) found.push(`touch: ${says} and ${other}`);
    }));
  }
  return found;
})()
"""

#: Texts of drawings that lines or symbols cross.
CROSSED: Final = """
(() => {
  const found = [];
  for (const tile of document.querySelectorAll("svg.tile")) {
    const lines = Array.from(tile.querySelectorAll("line.wire")).map(
      (line) => line.getBoundingClientRect());
    for (const text of tile.querySelectorAll("text")) {
      const a = text.getBoundingClientRect();
      for (const b of lines)
        if (Math.min(a.right, b.right) - Math.max(a.left, b.left) > 1 &&
            Math.min(a.bottom, b.bottom + 1) - Math.max(a.top, b.top) > 2.5)
          found.push(text.textContent);
    }
  }
  return found;
})()
"""

TOO_WIDE: Final = "document.documentElement.scrollWidth - document.documentElement.clientWidth"

SORTED: Final = """
(() => {
  const table = document.querySelector("#changes ~ .scroll table");
  const column = Array.from(table.tHead.rows[0].cells).findIndex(
    (cell) => cell.textContent.startsWith("factor"));
  const head = table.tHead.rows[0].cells[column];
  const read = () => Array.from(table.tBodies[0].rows).map(
    (row) => Number(row.cells[column].textContent.slice(1)));
  const seen = [];
  for (const _ of [1, 2]) {
    head.querySelector("button").click();
    seen.push([head.getAttribute("aria-sort"), read()]);
  }
  return seen;
})()
"""


@pytest.fixture(scope="module")
def browser() -> Iterator[Browser]:
    with Browser() as one:
        yield one


@pytest.fixture(scope="module")
def pages(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    """Return a page for each sample's resizing, and one for each other command."""
    folder = tmp_path_factory.mktemp("pages")
    made = {sample.name: folder / f"{sample.name}.html" for sample in SAMPLES}
    for sample in SAMPLES:
        asked = ["resize", str(sample / "netlist.sp"), *files(sample)]
        written = str(folder / f"{sample.name}.sp")
        assert main([*asked, "--output", written, "--html", str(made[sample.name])]) == 0
    sample = ROOT / "sample_netlists" / "pad_predriver"
    old, new = str(sample / "netlist.sp"), str(folder / "pad_predriver.sp")
    for name, asked in {
        "analyse": ["analyse", old, "--count", "4"],
        "diff": ["diff", old, new],
        "simulate": ["simulate", old, "--after", new],
        "fit": ["fit", "--simulated", old],
        "corners": ["analyse", old, "--process", str(fast_corner(sample, folder))],
    }.items():
        made[name] = folder / f"{name}.html"
        given = files(sample)[: 2 if name == "fit" else 4]
        assert main([*asked, *given, "--html", str(made[name])]) == 0
    return made


def fast_corner(sample: Path, folder: Path) -> Path:
    """Return the sample's process under another name."""
    text = (sample / "process.toml").read_text("utf-8")
    path = folder / "fast.toml"
    path.write_text(
        re.sub(r'^name = "', 'name = "fast ', text, count=1, flags=re.MULTILINE), "utf-8"
    )
    return path


def files(sample: Path) -> list[str]:
    return ["--process", str(sample / "process.toml"), "--brief", str(sample / "brief.toml")]


NAMES: Final = [
    *(sample.name for sample in SAMPLES),
    "analyse",
    "diff",
    "simulate",
    "fit",
    "corners",
]


class TestLook:
    @pytest.mark.parametrize("name", NAMES)
    @pytest.mark.parametrize(
        ("width", "media"), [(1400, "screen"), (800, "screen"), (680, "print")]
    )
    def test_is_quiet_and_legible(
        self, browser: Browser, pages: dict[str, Path], name: str, width: int, media: str
    ) -> None:
        browser.open(pages[name], width, media)
        assert browser.complaints == []
        assert browser.run(CLASHES) == []
        assert browser.run(CROSSED) == []
        assert browser.run(TOO_WIDE) <= 0

    def test_the_check_sees_texts_that_touch(self, browser: Browser, tmp_path: Path) -> None:
        page = tmp_path / "page.html"
        texts = '<text x="5" y="30">one</text><text x="9" y="32">two</text><text x="190" y="30">'
        page.write_text(f'<svg role="img" width="200">{texts}three</text></svg>', "utf-8")
        browser.open(page, 800)
        assert browser.run(CLASHES) == ["sticks out: three", "touch: one and two"]


class TestUse:
    def test_tables_sort_both_ways(self, browser: Browser, pages: dict[str, Path]) -> None:
        browser.open(pages["row_decoder"], 1400)
        (up, ascending), (down, descending) = browser.run(SORTED)
        assert (up, down) == ("ascending", "descending")
        assert len(ascending) > 5
        assert ascending == sorted(ascending)
        assert descending == sorted(descending, reverse=True)
        assert ascending != descending

    @pytest.mark.skipif(not AXE.is_file(), reason="axe-core is not installed")
    @pytest.mark.parametrize("scheme", ["light", "dark"])
    @pytest.mark.parametrize("name", ["row_decoder", "carry_chain", *NAMES[-5:]])
    def test_an_accessibility_checker_finds_nothing(
        self, browser: Browser, pages: dict[str, Path], name: str, scheme: str
    ) -> None:
        browser.open(pages[name], 1400, scheme=scheme)
        browser.run(AXE.read_text("utf-8") + ";0")
        script = "axe.run().then((r) => r.violations.map((v) => v.id + ': ' + v.nodes[0].html))"
        assert browser.run(script) == []
