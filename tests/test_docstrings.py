"""The examples in docstrings are true, and every public verb has one."""

from __future__ import annotations

import doctest
import importlib
import pkgutil
from pathlib import Path
from typing import Final

import pytest

import evenstage

ROOT: Final = Path(__file__).parents[1]
MODULES: Final = sorted(
    found.name
    for found in pkgutil.walk_packages(evenstage.__path__, "evenstage.")
    if not found.name.endswith("__main__")
)
VERBS: Final = [name for name in evenstage.__all__ if name[0].islower()]


def examples(module: str) -> list[doctest.DocTest]:
    """Return the docstrings of a module that hold examples."""
    found = doctest.DocTestFinder(exclude_empty=True).find(importlib.import_module(module))
    return [some for some in found if some.examples]


@pytest.mark.parametrize("module", [name for name in MODULES if examples(name)])
def test_examples_are_true(
    module: str, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """They run in the folder of the README, where the samples are."""
    monkeypatch.chdir(ROOT)
    runner = doctest.DocTestRunner(optionflags=doctest.NORMALIZE_WHITESPACE)
    for some in examples(module):
        runner.run(some)
    assert runner.failures == 0, capsys.readouterr().out


@pytest.mark.parametrize("verb", VERBS)
def test_every_verb_has_one(verb: str) -> None:
    assert ">>> " in (getattr(evenstage, verb).__doc__ or "")


def test_a_wrong_example_is_found() -> None:
    text = ">>> 1 + 1\n3\n"
    wrong = doctest.DocTestParser().get_doctest(text, {}, "wrong", None, None)
    told: list[str] = []
    runner = doctest.DocTestRunner()
    runner.run(wrong, out=told.append)
    assert runner.failures == 1
