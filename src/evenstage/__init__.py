"""Find the slowest path of a transistor netlist and the widths that make it fast.

The verbs in their order: `read`, `elaborate`, `recognise`, `analyse`, `resize`, `rewrite`,
`compare`.
"""

from importlib import import_module
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from evenstage.brief import read_brief
    from evenstage.circuit.recognise import recognise
    from evenstage.errors import EvenstageError
    from evenstage.netlist.elaboration.elaborate import elaborate
    from evenstage.netlist.reading.read import read
    from evenstage.netlist.rewriting.edits import rewrite
    from evenstage.process.read import read_process
    from evenstage.sizing.resize import resize
    from evenstage.sizing.wishes import Wishes
    from evenstage.timing.analyse import analyse
    from evenstage.timing.compare import compare

__version__ = "0.1.0"

__all__ = [
    "EvenstageError",
    "Wishes",
    "analyse",
    "compare",
    "elaborate",
    "read",
    "read_brief",
    "read_process",
    "recognise",
    "resize",
    "rewrite",
]

_HOMES = {
    "EvenstageError": "errors",
    "Wishes": "sizing.wishes",
    "analyse": "timing.analyse",
    "compare": "timing.compare",
    "elaborate": "netlist.elaboration.elaborate",
    "read": "netlist.reading.read",
    "read_brief": "brief",
    "read_process": "process.read",
    "recognise": "circuit.recognise",
    "resize": "sizing.resize",
    "rewrite": "netlist.rewriting.edits",
}

if not TYPE_CHECKING:

    def __getattr__(name: str) -> object:
        """Import a name when it is first asked for: the command line must start at once."""
        if name not in _HOMES:
            raise AttributeError(f"module 'evenstage' has no attribute '{name}'")
        value = getattr(import_module(f"evenstage.{_HOMES[name]}"), name)
        globals()[name] = value
        return value


def __dir__() -> list[str]:
    return [*__all__, "__version__"]
