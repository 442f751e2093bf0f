"""A pause for the search for cyclic garbage, which costs time where millions of objects live."""

from __future__ import annotations

import gc
from contextlib import contextmanager
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from collections.abc import Iterator


@contextmanager
def without_collection() -> Iterator[None]:
    """Do what is inside without looking for cyclic garbage."""
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()
