"""The same bytes in give the same bytes out, whatever order Python's sets happen to have."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path
from typing import Final

import pytest

SAMPLES: Final = Path(__file__).parents[1] / "sample_netlists"


def resized(sample: Path, folder: Path, seed: int) -> tuple[bytes, bytes]:
    """Return the document and the netlist that a resizing writes under one seed of the hashes."""
    output = folder / f"seed{seed}" / "resized.sp"
    output.parent.mkdir()
    files = [sample / "netlist.sp", "--process", sample / "process.toml", "--output", output.name]
    arguments = ["resize", *files, "--brief", sample / "brief.toml", "--json", "-"]
    done = subprocess.run(
        [sys.executable, "-m", "evenstage", *map(str, arguments)],
        cwd=output.parent,
        env=os.environ | {"PYTHONHASHSEED": str(seed)},
        capture_output=True,
        check=True,
        timeout=120,
    )
    return done.stdout, output.read_bytes()


@pytest.mark.parametrize("sample", sorted(SAMPLES.iterdir()), ids=lambda path: path.name)
def test_resizing_ignores_the_order_of_hashes(sample: Path, tmp_path: Path) -> None:
    assert resized(sample, tmp_path, 11) == resized(sample, tmp_path, 97)
