"""The wheel works on its own: installed into a fresh environment, run outside the checkout."""

from __future__ import annotations

import os
import shutil
import subprocess
import sys
import sysconfig
import tarfile
import tomllib
import venv
import zipfile
from pathlib import Path
from typing import TYPE_CHECKING, Final

import pytest

if TYPE_CHECKING:
    from collections.abc import Sequence

ROOT: Final = Path(__file__).parents[1]
VERSION: Final = tomllib.loads((ROOT / "pyproject.toml").read_text("utf-8"))["project"]["version"]
SAMPLE: Final = ROOT / "sample_netlists" / "pad_predriver"

#: Runs the command line and prints every file under one folder that was opened meanwhile.
WATCHED: Final = """
import sys

folder, *arguments = sys.argv[1:]
opened = []


def watch(event, values):
    if event == "open" and str(values[0]).startswith(folder):
        opened.append(str(values[0]))


sys.addaudithook(watch)
from evenstage.cli import main

status = main(arguments)
print(*opened, sep="\\n", file=sys.stderr)
sys.exit(status)
"""


def run(
    command: Sequence[str | Path], folder: Path, *, status: int = 0
) -> subprocess.CompletedProcess[str]:
    """Run a command in a folder, without the variables that may lead back into the checkout."""
    kept = {name: text for name, text in os.environ.items() if not name.startswith("PYTHON")}
    done = subprocess.run(
        command, cwd=folder, env=kept, capture_output=True, text=True, check=False, timeout=120
    )
    assert done.returncode == status, done.stderr
    return done


def build(kind: str, project: Path, folder: Path) -> Path:
    """Build an sdist or a wheel with what is installed, and return it."""
    run([sys.executable, "-m", "hatchling", "build", "-t", kind, "-d", folder], project)
    return next(folder.iterdir())


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return build("wheel", ROOT, tmp_path_factory.mktemp("wheel"))


@pytest.fixture(scope="module")
def binaries(wheel: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return the folder of programs of an environment that holds the wheel.

    The libraries it depends on are borrowed from the running environment, behind the wheel's own
    files: installing them anew would take most of a minute and prove nothing about the wheel.
    """
    folder = tmp_path_factory.mktemp("fresh") / "venv"
    venv.create(folder, symlinks=True)
    layout = {"base": str(folder), "platbase": str(folder)}
    site = Path(sysconfig.get_path("purelib", "venv", layout))
    (site / "borrowed.pth").write_text(sysconfig.get_path("purelib"), "utf-8")
    binaries = Path(sysconfig.get_path("scripts", "venv", layout))
    pip = [sys.executable, "-m", "pip", "--python", str(binaries / "python")]
    run([*pip, "install", "--quiet", "--no-deps", "--no-index", str(wheel)], folder.parent)
    return binaries


@pytest.fixture
def sample(tmp_path: Path) -> list[str]:
    """Return the arguments that name a copy of a sample, its process and its brief."""
    copied = shutil.copytree(SAMPLE, tmp_path / "block")
    netlist = next(path for path in copied.iterdir() if path.suffix != ".toml")
    settings = ["--process", copied / "process.toml", "--brief", copied / "brief.toml"]
    return [str(word) for word in (netlist, *settings)]


class TestWheel:
    def test_holds_every_grammar_as_it_is(self, wheel: Path) -> None:
        with zipfile.ZipFile(wheel) as packed:
            held = {n: packed.read(n) for n in packed.namelist() if n.endswith(".lark")}
        assert held == {
            f"evenstage/grammar/{path.name}": path.read_bytes()
            for path in (ROOT / "grammar").glob("*.lark")
        }

    def test_holds_the_package_and_nothing_else(self, wheel: Path) -> None:
        with zipfile.ZipFile(wheel) as packed:
            tops = {name.split("/")[0] for name in packed.namelist()}
            assert "evenstage/py.typed" in packed.namelist()
        assert tops == {"evenstage", f"evenstage-{VERSION}.dist-info"}

    def test_is_the_same_from_the_source_archive(self, wheel: Path, tmp_path: Path) -> None:
        with tarfile.open(build("sdist", ROOT, tmp_path / "sdist")) as archive:
            archive.extractall(tmp_path, filter="data")
        project = tmp_path / f"evenstage-{VERSION}"
        again = build("wheel", project, tmp_path / "again")
        assert again.read_bytes() == wheel.read_bytes()


class TestInstalled:
    def test_states_its_version(self, binaries: Path, tmp_path: Path) -> None:
        shown = run([binaries / "evenstage", "--version"], tmp_path).stdout
        assert shown == f"evenstage {VERSION}\n"

    def test_analyses_without_the_checkout(
        self, binaries: Path, sample: list[str], tmp_path: Path
    ) -> None:
        python = str(binaries / "python")
        done = run([python, "-c", WATCHED, str(ROOT), "analyse", *sample], tmp_path)
        opened_in_checkout = [
            path
            for path in done.stderr.split("\n")
            if path.startswith(str(ROOT)) and not path.startswith(sysconfig.get_path("purelib"))
        ]
        assert opened_in_checkout == []
        assert done.stdout

    def test_runs_as_a_module(self, binaries: Path, sample: list[str], tmp_path: Path) -> None:
        as_module = run([binaries / "python", "-m", "evenstage", "analyse", *sample], tmp_path)
        as_program = run([binaries / "evenstage", "analyse", *sample], tmp_path)
        assert as_module.stdout == as_program.stdout

    def test_mistakes_end_with_their_status(self, binaries: Path, tmp_path: Path) -> None:
        run([binaries / "evenstage", "analyse", "nowhere.sp"], tmp_path, status=1)
        run([binaries / "evenstage", "analyse"], tmp_path, status=2)
