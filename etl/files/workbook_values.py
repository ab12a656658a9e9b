"""What stands in a cell of a workbook, as the lab sees it."""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import date, datetime, time, timedelta

from etl.files.workbook_numbers import general, number_as_shown

#: The first day that spreadsheet programs count; before it they show no date.
_FIRST_YEAR = 1900
#: Control signs, and the underscore itself, as they are written in a workbook's text
#: (ECMA-376-1:2016, section 22.4.2.4, type ST_Xstring).
_ESCAPED = re.compile(r"_x(0009|000A|000D|005F)_", re.IGNORECASE)
#: What stands for itself in a date format: quoted, escaped, in brackets (but for elapsed time).
_ASIDE = re.compile(r'"[^"]*"|\\.|_.|\*.|\[(?!(?:h+|m+|s+)\])[^\]]*\]', re.IGNORECASE)


@dataclass(frozen=True, slots=True)
class ShownCell:
    """A cell as a sheet shows it.

    Attributes
    ----------
    text : str
        What it shows: text as it is, a number by its number format, a date as year-month-day
        (ISO 8601), a time as hours:minutes:seconds, a truth as TRUE or FALSE.
    held : str
        What it holds, where it shows less: a number with more digits, a time besides a date.
    strange : str
        The number format, where it is not understood.
    wrong : str
        What it shows, where that is an error value or no date.
    """

    text: str
    held: str = ""
    strange: str = ""
    wrong: str = ""


def cell_as_shown(value: object, number_format: str, *, is_error: bool = False) -> ShownCell:
    """Write a cell as a sheet shows it.

    Parameters
    ----------
    value : str, int, float, bool, date, datetime, time, timedelta or None
        The value of the cell; of a formula, its stored result.
    number_format : str
        The format code of the cell.
    is_error : bool
        Whether the value is an error value such as ``#N/A``.

    Returns
    -------
    ShownCell

    Raises
    ------
    TypeError
        If the value is of no kind that a cell can hold.

    References
    ----------
    ISO 8601-1:2019, sections 5.2.2 (calendar date), 5.3.1 (time of day) and 5.4.2 (date and time),
    extended formats.

    Examples
    --------
    >>> cell_as_shown(1.5, "0.00").text, cell_as_shown(True, "General").text
    ('1.50', 'TRUE')
    >>> cell_as_shown(datetime(2026, 5, 1, 9, 30), "d/m/yy h:mm").text
    '2026-05-01T09:30:00'
    >>> cell_as_shown("#N/A", "General", is_error=True).wrong
    '#N/A'
    """
    if value is None:
        return ShownCell("")
    if is_error:
        return ShownCell("", wrong=str(value))
    if isinstance(value, str):
        return ShownCell(_ESCAPED.sub(lambda code: chr(int(code[1], 16)), value))
    if isinstance(value, bool):
        return ShownCell("TRUE" if value else "FALSE")
    if isinstance(value, (int, float)):
        return _number(value, number_format)
    if isinstance(value, (date, time, timedelta)):
        return _moment(value, number_format)
    raise TypeError(f"a cell holds a {type(value).__name__}")


def _number(value: float, number_format: str) -> ShownCell:
    """A number by its format."""
    try:
        number = float(value)
    except OverflowError:
        number = float("inf")
    if number - number != 0:
        return ShownCell("", wrong="a number too large to be held")
    shown = number_as_shown(number, number_format)
    return ShownCell(
        shown.text,
        held="" if shown.exact else general(number),
        strange="" if shown.understood else number_format,
    )


def _moment(value: date | time | timedelta, number_format: str) -> ShownCell:
    """A date, a time of day, both, or a time that has passed."""
    if isinstance(value, timedelta):
        return _duration(value)
    with_date, with_time = _parts_shown(number_format)
    if isinstance(value, time):
        # A number below 1 is a time on no day: as a date it shows as day 0 of January 1900.
        clock = _clock(value)
        return ShownCell("", wrong=f"{clock} on no day") if with_date else ShownCell(clock)
    moment = value if isinstance(value, datetime) else datetime.combine(value, time())
    clock = _clock(moment.time())
    day = f"{moment.year:04d}-{moment.month:02d}-{moment.day:02d}"
    if not (with_date or with_time):  # a date that is stored as text, in a cell without a format
        with_date, with_time = True, moment.time() != time()
    if with_date and moment.year < _FIRST_YEAR:
        return ShownCell("", wrong=f"{day}, a day before 1900")
    whole = f"{day}T{clock}"
    if with_date and with_time:
        return ShownCell(whole)
    if with_date:
        return ShownCell(day, held=whole if moment.time() != time() else "")
    return ShownCell(clock, held=whole)


def _duration(passed: timedelta) -> ShownCell:
    """A time that has passed as hours:minutes:seconds; a day has 24 hours."""
    if passed < timedelta():
        return ShownCell("", wrong="a time below zero")
    seconds = passed.days * 86_400 + passed.seconds
    text = f"{seconds // 3600:02d}:{seconds // 60 % 60:02d}:{seconds % 60:02d}"
    return ShownCell(text + (f".{passed.microseconds // 1000:03d}" if passed.microseconds else ""))


def _clock(moment: time) -> str:
    """A time of day; thousandths of a second only where there are any."""
    return moment.isoformat("milliseconds" if moment.microsecond else "seconds")


def _parts_shown(number_format: str) -> tuple[bool, bool]:
    """Whether a format shows a date, and whether it shows a time.

    An m is a minute beside hours or seconds, otherwise a month.
    """
    letters = set(_ASIDE.sub("", number_format.split(";", maxsplit=1)[0]).casefold())
    with_time = bool(letters & set("hs"))
    return bool(letters & set("dy")) or ("m" in letters and not with_time), with_time
