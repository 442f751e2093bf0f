"""``python -m evenstage``."""

from evenstage.cli import run

run()
