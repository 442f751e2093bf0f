"""The published JSON Schema of everything the program writes as JSON."""

from __future__ import annotations

from importlib.resources import files

#: Beside this module, where tools of other languages find it too.
SCHEMA_FILE = "document.schema.json"


def schema_text() -> str:
    """Return the JSON Schema (draft 2020-12) that every JSON document of the program meets.

    Returns
    -------
    str
        JSON text with a final newline; ``oneOf`` at its head tells the kinds apart.

    Examples
    --------
    >>> import json
    >>> sorted(json.loads(schema_text())["$defs"]["deck"]["properties"])[:3]
    ['arcs', 'cells', 'format']
    """
    return (files("evenstage.report") / SCHEMA_FILE).read_text("utf-8")
