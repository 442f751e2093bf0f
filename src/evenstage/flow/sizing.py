"""New widths found, written, read back and compared."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Literal

from evenstage.errors import EvenstageError, SettingsError
from evenstage.flow.files import refuse_existing
from evenstage.flow.loading import Block, Question, in_corners
from evenstage.logic.same import StructureCheck, compare_structure
from evenstage.netlist.elaboration.elaborate import elaborate
from evenstage.netlist.reading.read import read
from evenstage.netlist.rewriting.edits import rewrite
from evenstage.netlist.rewriting.output import lost_includes, output_files, write_files
from evenstage.netlist.rewriting.record import CornerRecord, Record, digest, record_edit
from evenstage.progress import tell
from evenstage.sizing.resize import resize as find_widths
from evenstage.sizing.results import SizedCorners, Sizing
from evenstage.sizing.trade_off import trade_off
from evenstage.sizing.wishes import Original, Wishes
from evenstage.timing.corners import Corners, merged
from evenstage.timing.vectors import false_path_notices

if TYPE_CHECKING:
    from collections.abc import Sequence
    from pathlib import Path

    from evenstage.brief import Brief
    from evenstage.errors import Notice
    from evenstage.timing.results import Analysis


def resize(
    path: Path,
    question: Question,
    wishes: Wishes | None = None,
    output: Path | None = None,
    *,
    force: bool = False,
    curve: bool = False,
    spend: Literal["width", "energy"] | None = None,
) -> Sizing:
    """Find new widths and, where an output is named, write the netlist with them.

    In several corners one set of widths is found for all of them.

    With ``curve`` the least spend for a dozen delays is found too. ``spend`` says what is kept
    small; default: what the brief says.

    Raises
    ------
    EvenstageError
        For every mistake in the inputs and every wish that cannot be met.
    OutputError
        Where the output exists (without ``force``) or cannot be written.
    """
    refuse_existing(output, force=force)
    blocks = in_corners(path, question)
    analyses = [one.analysis for one in blocks]
    block, analysis = blocks[0], merged(analyses) if question.corners else analyses[0]
    wishes = _with_aims(wishes or Wishes(), block.brief)
    wishes = replace(wishes, spend=spend or wishes.spend)
    record = block.record
    asked = _asked(question, wishes)
    original = _originals(record, analyses, wishes.spend)
    if record is not None and record.key == digest(block.netlist, asked):
        sizing = _already_done(analysis, record, wishes)
    else:
        sizing = find_widths(analysis, block.brief, wishes, original)
    told = false_path_notices(sizing.before)
    sizing = replace(sizing, notices=(*sizing.notices, *told), asked_delay=wishes.delay)
    if curve:
        curved = trade_off(analysis, block.brief, wishes, original)
        sizing = replace(sizing, trade_off=curved)
    if output is None:
        return sizing
    texts = _texts(block, sizing, record, asked)
    write_files(output_files(block.netlist, texts, output), force=force)
    tell(f"checking '{output}', which is written")
    lost = lost_includes(block.netlist, output)
    structure = _read_back(block, output, lost) if texts else None
    return replace(sizing, notices=(*sizing.notices, *lost), structure=structure)


def _read_back(block: Block, output: Path, lost: Sequence[Notice]) -> StructureCheck:
    """Read a written netlist and compare it with the one it was made of.

    Raises
    ------
    RuntimeError
        Where it cannot be read, or differs in more than widths: a fault of ours.
    """
    assert block.analysis.timing is not None
    before = block.analysis.timing.circuit.devices
    if lost:
        reason = "it includes files that are not found from its place"
        return StructureCheck(same=None, reason=reason, transistors=0)
    try:
        written = read(output, block.brief.case, block.brief.first_line)
        after = elaborate(written, before.top or None, block.process, block.brief)
        check = compare_structure(before, after)
        reason = check.reason
    except EvenstageError as error:
        reason = str(error)
    if reason:
        raise RuntimeError(f"do not use '{output}': it is not the netlist it was made of: {reason}")
    return check


def _with_aims(wishes: Wishes, brief: Brief) -> Wishes:
    """Take the aims of the brief where the command line has none.

    Raises
    ------
    SettingsError
        Where the brief aims at a delay and at a width.
    """
    apart = wishes.apart or brief.pulls == "apart"
    wishes = replace(wishes, spend=brief.aim_spend, apart=apart)
    if wishes.delay is None and wishes.width is None:
        if brief.aim_delay is not None and brief.aim_width is not None:
            raise SettingsError(
                "the brief aims at a delay and at a width; keep one of aim.delay and aim.width",
                code="two-aims",
            )
        return replace(wishes, delay=brief.aim_delay, width=brief.aim_width)
    return wishes


def _asked(question: Question, wishes: Wishes) -> str:
    """Return all that decides an answer besides the netlist, as text."""
    paths = (question.process, question.brief, *question.corners)
    files = [path.read_bytes().hex() if path else "" for path in paths]
    return repr((wishes, question.top, question.start, question.end, files))


def _originals(
    record: Record | None, analyses: Sequence[Analysis], spend: str
) -> tuple[Original, ...]:
    """Return the limits an earlier run recorded, for each corner by its name.

    Of a corner it did not know only what all share is recorded; what the first corner keeps is what
    a run in one corner kept.
    """
    if record is None:
        return tuple(Original() for _ in analyses)
    found = []
    for number, one in enumerate(analyses):
        kept = record.corners.get(one.yardstick.process) or (None if number else record)
        found.append(
            Original(
                ceilings=kept.ceilings if kept else {},
                transition=kept.transition if kept else None,
                smallest=record.smallest,
                spend=record.total_width if spend == "width" else record.switched_cap,
            )
        )
    return tuple(found)


def _texts(block: Block, sizing: Sizing, record: Record | None, asked: str) -> dict[Path, bytes]:
    """Return the files that change, the record at the head of the first among them."""
    if not sizing.edits:
        return {}
    key = digest(block.netlist, asked, rewrite(block.netlist, sizing.edits))
    head = record_edit(block.netlist, _record(sizing, record, key))
    return rewrite(block.netlist, (head, *sizing.edits))


def _record(sizing: Sizing, earlier: Record | None, key: str) -> Record:
    """Return what later runs are told; what was first drawn stays what it was."""
    corners = sizing.corners.before.analyses if sizing.corners else (sizing.before,)
    first, kept = earlier or corners[0], sizing.kept[0]
    return Record(
        key=key,
        delay_before=earlier.delay_before if earlier else sizing.slowest_before.delay,
        delay_after=sizing.after.paths[0].delay,
        least_delay=sizing.least_delay,
        total_width=first.total_width,
        switched_cap=first.switched_cap,
        transition=kept.transition or corners[0].worst_transition,
        bound=sizing.bound,
        bound_on=sizing.bound_on,
        gap=sizing.gap,
        rounding_loss=sizing.rounding_loss,
        ceilings=kept.ceilings,
        smallest=kept.smallest,
        corners=_recorded_corners(sizing, corners, earlier),
    )


def _recorded_corners(
    sizing: Sizing, analyses: Sequence[Analysis], earlier: Record | None
) -> dict[str, CornerRecord]:
    """Return what must be kept in each corner, those of earlier runs too; none for one alone."""
    known = dict(earlier.corners) if earlier else {}
    if len(analyses) == 1 and not known:
        return {}
    mine = {
        one.yardstick.process: CornerRecord(
            transition=kept.transition or one.worst_transition, ceilings=kept.ceilings
        )
        for one, kept in zip(analyses, sizing.kept, strict=True)
    }
    return known | mine


def _already_done(found: Analysis | Corners, record: Record, wishes: Wishes) -> Sizing:
    """Return the sizing of a netlist that an earlier run wrote with the same wishes."""
    several = found if isinstance(found, Corners) else None
    analysis = found.worst if isinstance(found, Corners) else found
    return Sizing(
        before=analysis,
        after=analysis,
        goal=wishes.words,
        bound=record.bound,
        bound_on=record.bound_on,
        gap=record.gap,
        rounding_loss=record.rounding_loss,
        least_delay=record.least_delay,
        total_width_before=analysis.total_width,
        total_width_after=analysis.total_width,
        free_cards=0,
        fixed_cards=0,
        changes=(),
        holds=(),
        already_done=True,
        notices=(),
        corners=SizedCorners(before=several, after=several) if several else None,
    )
