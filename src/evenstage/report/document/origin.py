"""Where a result comes from, as a part of its document."""

from __future__ import annotations

from typing import Final

from evenstage.report.document.fitting import PROCESS
from evenstage.report.document.shape import TEXT, Field, Shape, many, optional
from evenstage.report.origin import FileDigest, Origin

_FILE: Final = Shape(
    FileDigest,
    Field("name", "name", TEXT),
    Field("sha256", "sha256", TEXT),
)

ORIGIN: Final = Shape(
    Origin,
    Field("version", "version", TEXT),
    Field("arguments", "arguments", many(TEXT)),
    Field("files", "files", many(_FILE.kind)),
    Field("process", "process", optional(PROCESS.kind)),
)
