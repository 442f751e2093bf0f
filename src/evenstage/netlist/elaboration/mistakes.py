"""Mistakes of one run, collected so that they are told together."""

from __future__ import annotations

from contextlib import contextmanager
from typing import TYPE_CHECKING, Final

from evenstage.errors import ElaborationError, MistakesError

if TYPE_CHECKING:
    from collections.abc import Iterator, Sequence

    from evenstage.source import SourceText, Span

#: Mistakes of one kind beyond which nobody reads on.
MOST: Final = 1000


class Mistakes:
    """Errors met so far.

    Parameters
    ----------
    sources : sequence of SourceText
        The files, in whose order the errors are told; those of other files come last.
    """

    def __init__(self, sources: Sequence[SourceText] = ()) -> None:
        self._rank = {source.path: i for i, source in enumerate(sources)}
        self._errors: dict[tuple[object, ...], ElaborationError] = {}

    def __len__(self) -> int:
        return len(self._errors)

    def add(self, error: ElaborationError) -> None:
        """Take an error, or all those one carries; each counts once."""
        if isinstance(error, MistakesError):
            for one in error.errors:
                self.add(one)
            return
        span = error.span
        place = () if span is None else (span.source.path, span.start, span.end)
        self._errors.setdefault((error.code, error.message, place), error)

    def errors(self) -> list[ElaborationError]:
        """Return the errors in the order in which they are told."""
        return sorted(self._errors.values(), key=self._place)

    def any_within(self, span: Span | None) -> bool:
        """Tell whether an error is about some bytes of a span."""
        return span is not None and any(
            error.span is not None
            and error.span.source.path == span.source.path
            and span.start <= error.span.start
            and error.span.end <= span.end
            for error in self._errors.values()
        )

    @contextmanager
    def collecting(self) -> Iterator[None]:
        """Take the error that ends what is done inside, and go on behind it."""
        try:
            yield
        except ElaborationError as error:
            self.add(error)

    def check(self) -> None:
        """Tell what was found.

        Raises
        ------
        ElaborationError
            The only error, or a ``MistakesError`` that carries all.
        """
        errors = self.errors()
        if len(errors) == 1:
            raise errors[0]
        if errors:
            raise MistakesError(tuple(errors))

    def _place(self, error: ElaborationError) -> tuple[int, int]:
        if error.span is None:
            return len(self._rank) + 1, 0
        return self._rank.get(error.span.source.path, len(self._rank)), error.span.start
