"""Find the slowest path of a transistor netlist and the widths that make it fast.

The verbs in their order: `read`, `elaborate`, `recognise`, `analyse`, `resize`, `rewrite`,
`compare`.
"""

from evenstage.brief import read_brief
from evenstage.circuit.recognise import recognise
from evenstage.errors import EvenstageError
from evenstage.netlist.edits import rewrite
from evenstage.netlist.elaborate import elaborate
from evenstage.netlist.read import read
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
