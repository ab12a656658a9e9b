"""What the blocks of a log tell of it together: as if it had been held whole."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Final

from etl.errors import Findings
from etl.files import FileAccount, Tally
from etl.files.delimited import tell_alike
from etl.files.numeric_cells import DecimalSigns
from etl.files.pieces import WholeNeededError
from etl.files.repeats import tell_strange_marks
from etl.files.rows import Uneven, tell_uneven
from etl.parsers.asked_rows import MOST_OTHERS, tell_none, tell_none_left
from etl.parsers.canonical import LogNote
from etl.parsers.event_blinks import tell_blink
from etl.parsers.eyes import doubtful
from etl.parsers.header_units import own_reading
from etl.parsers.identifiers import tell_misnamed
from etl.parsers.log_rows import RowReading
from etl.parsers.parts import Step
from etl.parsers.table_blocks import BlockAnswer, BlockLog, Reading, head_findings

#: The fates of lines, in the order in which a log that is held whole counts them.
_FATES: Final = (
    *("banner above the header", "blank lines", "remarks", "header", "repeated headers", "rows"),
    *("further lines of rows", "row of units", "fixations", "rows not asked for"),
    "rows of the other eye",
)
_REPAIRS: Final = (
    "quote marks that were not doubled",
    "quote marks in cells without quotes",
    "byte-order marks within the file",
)


def to_read_again(
    log: BlockLog, reading: RowReading, answers: Sequence[BlockAnswer]
) -> tuple[BlockLog, list[Reading]]:
    """Which blocks were not read as the log as a whole shows that they must be.

    Parameters
    ----------
    log : BlockLog
        The log.
    reading : RowReading
        How the study's logs are read.
    answers : sequence of BlockAnswer
        What all its blocks tell, in order.

    Returns
    -------
    BlockLog and list of Reading
        How the log is to be read then, and the blocks that must be read again.
    """
    if any(answer.cells.crooked for answer in answers):
        again = [Reading(a.reading.place, a.reading.below) for a in answers]
        return log.loosely(), again
    decimal = reading.logs.decimal or _signs(log, reading, answers).decide("", Findings()) or ""
    below, again = True, []
    for answer in answers:
        how, signs = answer.reading, answer.part.signs
        own = how.decimal
        if signs is not None and decimal and (signs.commas or signs.points):
            used = own or signs.decide("", Findings()) or "."
            own = how.decimal if used == decimal else decimal
        if below != how.below or own != how.decimal:
            again.append(Reading(how.place, below, own))
        below = answer.ends_below
    return log, again


def joined(
    log: BlockLog, reading: RowReading, answers: Sequence[BlockAnswer], findings: Findings
) -> LogNote | None:
    """What is found in a log, and what is told about it.

    Parameters
    ----------
    log : BlockLog
        The log.
    reading : RowReading
        How the study's logs are read.
    answers : sequence of BlockAnswer
        What all its blocks tell, in order.
    findings : Findings
        Where it is recorded what is wrong with the log, in the order of its lines.

    Returns
    -------
    LogNote or None
        None where an error was recorded.

    Raises
    ------
    WholeNeededError
        If something is the matter that is told from the whole log.
    """
    own = Findings()
    decimal = (
        _decimal(log, reading, answers, own) if _lines_are_sound(log, reading, answers, own) else ""
    )
    if reading.logs.eye is not None:
        # Of two eyes, what is wrong is told by the header of each row's own eye.
        if own.failed:
            raise WholeNeededError
        _hold_eyes(log, reading, answers)
    own.items.sort(key=lambda finding: finding.line or 0)
    findings.extend(own)
    return None if own.failed else _note(log, reading, answers, decimal)


def _lines_are_sound(
    log: BlockLog, reading: RowReading, answers: Sequence[BlockAnswer], own: Findings
) -> bool:
    """Whether lines are rows as the header has them; says what is wrong, step by step."""
    shown, header = log.manner.shown, log.manner.header
    within = [line for answer in answers for line in answer.cells.marks_within]
    if within:
        tell_strange_marks(within, shown, own)
        return False
    uneven = _uneven(answers, len(header.names))
    if uneven is not None:
        if not tell_uneven(header, uneven, shown, own):
            raise WholeNeededError
        return False
    _add(answers, Step.HEADERS, own)
    if own.failed:
        return False
    strange = [line for answer in answers for line in answer.cells.strange_marks]
    if strange:
        tell_strange_marks(strange, shown, own)
        return False
    alike = _tally(answer.cells.alike for answer in answers)
    if alike.count:
        tell_alike(alike.count, alike.first_line, header, shown, own)
    own.extend(head_findings(log, reading))
    _add(answers, Step.UNITS, own)
    rows = sum(answer.rows for answer in answers)
    if not rows:
        own.error(
            "the log has a header but no fixation",
            path=shown,
            line=header.line,
            fix="remove the file from the folder, or copy it again",
        )
    return rows > 0


def _decimal(
    log: BlockLog, reading: RowReading, answers: Sequence[BlockAnswer], own: Findings
) -> str:
    """The decimal sign; says what is wrong with rows, step by step."""
    shown = log.manner.shown
    reading = own_reading(reading, log.manner.header.names)
    if not _asked(reading, answers, shown, own):
        return ""
    _add(answers, Step.IDS, own)
    _names(log, reading, answers, own)
    decimal = reading.logs.decimal or _signs(log, reading, answers).decide(shown, own)
    if decimal is None:
        return ""
    _add(answers, Step.NUMBERS, own)
    if any(answer.part.stopped == Step.NUMBERS for answer in answers):
        return decimal
    _add(answers, Step.FIXATIONS, own)
    words: dict[str, int] = {}
    for answer in answers:
        for text, line in answer.part.blink_words.items():
            words.setdefault(text, line)
    for text, line in words.items():
        tell_blink(text, line, reading.headers()["blink"], shown, own)
    return decimal


def _add(answers: Iterable[BlockAnswer], step: Step, findings: Findings) -> None:
    """Record what was found in all blocks at one step."""
    for answer in answers:
        findings.extend(answer.part.found.get(step, Findings()))


def _tally(parts: Iterable[Tally]) -> Tally:
    """Tallies of all blocks as one."""
    whole = Tally()
    for part in parts:
        whole.add(part.count, part.first_line)
    return whole


def _uneven(answers: Sequence[BlockAnswer], width: int) -> Uneven | None:
    """The rows of all blocks that are not as wide as the header."""
    if not any(answer.cells.refused for answer in answers):
        return None
    if any(answer.cells.bent for answer in answers):
        raise WholeNeededError
    whole: Uneven | None = None
    for answer in answers:
        own = answer.cells.uneven
        if own is None:
            # Blocks without any such row have rows all the same.
            own = Uneven.of([], answer.cells.count)
        whole = own if whole is None else whole.joined(own, width)
    return whole if whole is not None and whole.number else None


def _asked(reading: RowReading, answers: Sequence[BlockAnswer], shown: str, own: Findings) -> bool:
    """Whether the log has rows that ``[logs.where]`` asks for; says so where it has none."""
    where = reading.where()
    before = own.count("error")
    for place, (header, values) in enumerate(where):
        told = [a.part.asked[str(place)] for a in answers if str(place) in a.part.asked]
        if not any(some for some, _ in told):
            there = dict.fromkeys(text for _, texts in told for text in texts)
            tell_none(shown, header, list(there), values, own)
    if own.count("error") > before:
        return False
    left = sum(a.rows - a.note.counts.get("rows not asked for", 0) for a in answers)
    if where and not left:
        tell_none_left(shown, where, own)
    return own.count("error") == before


def _names(
    log: BlockLog, reading: RowReading, answers: Sequence[BlockAnswer], own: Findings
) -> None:
    """Record identifiers that contradict the file's name."""
    every: dict[str, dict[str, int]] = {}
    for answer in answers:
        for name, texts in answer.part.misnamed.items():
            for text, line in texts.items():
                every.setdefault(name, {}).setdefault(text, line)
    for name, lines in every.items():
        where = f'column "{reading.headers()[name]}"'
        for text in sorted(lines):
            tell_misnamed(
                name, (text, log.named[name]), lines[text], (log.manner.shown, where), own
            )


def _signs(log: BlockLog, reading: RowReading, answers: Sequence[BlockAnswer]) -> DecimalSigns:
    """The decimal signs of all blocks."""
    headers = list(own_reading(reading, log.manner.header.names).headers().values())
    whole = DecimalSigns({}, {})
    for answer in answers:
        if answer.part.signs is not None:
            order = dict.fromkeys([*headers, *answer.part.signs.commas, *answer.part.signs.points])
            whole = whole.joined(answer.part.signs, [*order, *whole.commas, *whole.points])
    return whole


def _hold_eyes(log: BlockLog, reading: RowReading, answers: Sequence[BlockAnswer]) -> None:
    """Hold the eyes of all blocks against each other."""
    reading = own_reading(reading, log.manner.header.names)
    rows: dict[str, dict[str, tuple[int, int]]] = {}
    has: dict[str, bool] = {}
    for answer in answers:
        for reader, some in answer.part.chosen.items():
            has[reader] = has.get(reader, False) or some
        for reader, eyes in answer.part.eyes.items():
            counted = rows.setdefault(reader, {})
            for eye, found in eyes.items():
                count, line = counted.get(eye, (0, found.line))
                counted[eye] = (count + found.count, line)
    header = reading.headers().get("eye", "")
    known = reading.eyes.known(reading.logs, header)
    if not all(has.values()):
        raise WholeNeededError
    for of_reader in rows.values():
        if any(doubtful(of_reader, sum(count for count, _ in of_reader.values()), known)):
            raise WholeNeededError


def _note(
    log: BlockLog, reading: RowReading, answers: Sequence[BlockAnswer], decimal: str
) -> LogNote:
    """What is told about a log that was read."""
    made, header = log.survey, log.manner.header
    note = LogNote(
        made.shown,
        made.sha256,
        made.encoding,
        header.separator,
        decimal,
        header.names,
        account=_account(log, answers),
        ends_open=made.ends_open,
    )
    for what, tallies in (
        ("comment lines below the header", (a.cells.remarks for a in answers)),
        ("comment lines like rows", (a.cells.alike for a in answers)),
    ):
        count = _tally(tallies).count
        if count:
            note.counts[what] = count
    fullest = max(answers, key=lambda answer: len(answer.note.counts))
    for what in fullest.note.counts:
        note.counts[what] = sum(answer.note.counts.get(what, 0) for answer in answers)
    for name, (_, values) in zip(reading.logs.where, reading.where(), strict=True):
        there = dict.fromkeys(t for a in answers for t in a.note.asked.get(name, ()))
        hidden = _hidden_values(reading, name, values)
        asked = [text for text in hidden if text in there]
        others = [text for text in there if text not in hidden]
        note.asked[name] = (*asked, *others[:MOST_OTHERS])
    return note


def _hidden_values(reading: RowReading, name: str, values: Sequence[str]) -> list[str]:
    """The values asked for, by the pseudonyms that readers go by."""
    described = reading.headers().get("participant")
    header = dict(zip(reading.logs.where, (h for h, _ in reading.where()), strict=True))[name]
    if reading.pseudonyms is None or header != described:
        return list(values)
    return [reading.pseudonyms.of_reader(value) for value in values]


def _account(log: BlockLog, answers: Sequence[BlockAnswer]) -> FileAccount:
    """What became of every line of a log."""
    every = [log.head, *(answer.note.account for answer in answers)]
    whole = FileAccount(sum(account.total for account in every))
    stray = _tally(answer.cells.stray for answer in answers)
    for fate in dict.fromkeys((*_FATES, *(fate for a in every for fate in a.lines))):
        tally = _tally(account.lines[fate] for account in every if fate in account.lines)
        whole.line(fate, tally.count, tally.first_line)
    for repair in dict.fromkeys((*_REPAIRS, *(r for a in every for r in a.repairs))):
        tally = _tally(account.repairs[repair] for account in every if repair in account.repairs)
        if repair == _REPAIRS[1] and any(answer.cells.quotes for answer in answers):
            tally.add(stray.count, stray.first_line)
        whole.repaired(repair, tally.count, tally.first_line)
    return whole
