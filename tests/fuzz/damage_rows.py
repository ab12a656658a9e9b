"""Damage to the rows of a log: lost, doubled, shuffled, and lines that do not belong there."""

from __future__ import annotations

from random import Random

from tests.fuzz.damage import UNKNOWN_LABEL, to_log
from tests.fuzz.logs import Log


def _inner(log: Log, rng: Random) -> int:
    """Some row that has another one above it and one below."""
    return rng.choice(log.rows()[1:-1])


@to_log("a row twice")
def row_twice(log: Log, rng: Random) -> bool:
    """A row stands there twice."""
    row = _inner(log, rng)
    log.lines.insert(row, log.lines[row])
    return True


@to_log("a block of rows twice")
def block_twice(log: Log, rng: Random) -> bool:
    """Some rows of a trial stand there twice."""
    block = [rows for rows in log.trial_blocks() if len(rows) > 4]
    rows = rng.choice(block)
    start = rng.randrange(len(rows) - 3)
    own = rows[start : start + 3]
    log.lines[own[-1] + 1 : own[-1] + 1] = [log.lines[row] for row in own]
    return True


@to_log("a trial twice")
def trial_twice(log: Log, rng: Random) -> bool:
    """The rows of a trial stand there twice, with all that stands between them."""
    rows = rng.choice(log.trial_blocks())
    log.lines[rows[-1] + 1 : rows[-1] + 1] = log.lines[rows[0] : rows[-1] + 1]
    return True


@to_log("the whole log twice")
def log_twice(log: Log, _: Random) -> bool:
    """A log was put together with its own copy, one header aside."""
    log.lines += log.lines[log.kind.header :]
    return True


@to_log("the whole log twice, headers and all")
def log_and_header_twice(log: Log, _: Random) -> bool:
    """A log was put together with its own copy."""
    log.lines += log.lines
    return True


@to_log("rows shuffled within a trial")
def shuffled_within(log: Log, rng: Random) -> bool:
    """The rows of a trial stand in another order."""
    rows = rng.choice([rows for rows in log.trial_blocks() if len(rows) > 3])
    mixed = rows[:]
    while mixed == rows:
        rng.shuffle(mixed)
    lines = [log.lines[row] for row in mixed]
    for row, line in zip(rows, lines, strict=True):
        log.lines[row] = line
    return True


@to_log("rows shuffled")
def shuffled(log: Log, rng: Random) -> bool:
    """All rows stand in another order."""
    rows = log.rows()
    mixed = rows[:]
    rng.shuffle(mixed)
    lines = [log.lines[row] for row in mixed]
    for row, line in zip(rows, lines, strict=True):
        log.lines[row] = line
    return True


@to_log("rows backwards")
def backwards(log: Log, _: Random) -> bool:
    """The newest row stands on top."""
    rows = log.rows()
    lines = [log.lines[row] for row in reversed(rows)]
    for row, line in zip(rows, lines, strict=True):
        log.lines[row] = line
    return True


@to_log("two rows change places")
def neighbours_swapped(log: Log, rng: Random) -> bool:
    """Two rows of a trial, one below the other."""
    rows = rng.choice([rows for rows in log.trial_blocks() if len(rows) > 3])
    at = rng.randrange(len(rows) - 1)
    one, other = rows[at], rows[at + 1]
    log.lines[one], log.lines[other] = log.lines[other], log.lines[one]
    return True


@to_log("a row in another trial")
def row_in_other_trial(log: Log, rng: Random) -> bool:
    """A row has slipped among those of another trial."""
    blocks = log.trial_blocks()
    if len(blocks) < 2:
        return False
    one, other = rng.sample(range(len(blocks)), 2)
    line = log.lines[rng.choice(blocks[one][1:-1])]
    log.lines.remove(line)
    if blocks[other][0] > blocks[one][0]:
        log.lines.insert(blocks[other][1] - 1, line)
    else:
        log.lines.insert(blocks[other][1], line)
    return True


@to_log("a field is missing")
def field_missing(log: Log, rng: Random) -> bool:
    """A row has one cell less."""
    row = rng.choice(log.rows())
    cells = log.cells(row)
    del cells[rng.randrange(len(cells))]
    log.put(row, cells)
    return True


@to_log("a separator too many")
def separator_too_many(log: Log, rng: Random) -> bool:
    """A row has one empty cell more."""
    if log.kind.aligned:
        return False
    row = rng.choice(log.rows())
    cells = log.cells(row)
    # A blank at the end of a line is no separator.
    cells.insert(rng.randrange(len(cells) + (log.kind.separator != " ")), "")
    log.put(row, cells)
    return True


@to_log("a separator is missing")
def separator_missing(log: Log, rng: Random) -> bool:
    """Two cells became one."""
    row = rng.choice(log.rows())
    cells = log.cells(row)
    at = rng.randrange(len(cells) - 1)
    cells[at : at + 2] = [cells[at] + cells[at + 1]]
    log.put(row, cells)
    return True


@to_log("two rows in a line")
def joined(log: Log, rng: Random) -> bool:
    """A line end is lost."""
    row = _inner(log, rng)
    log.lines[row : row + 2] = ["".join(log.lines[row : row + 2])]
    return True


@to_log("a row in two lines")
def broken(log: Log, rng: Random) -> bool:
    """A line end got in."""
    row = rng.choice(log.rows())
    line = log.lines[row]
    at = rng.randrange(1, len(line))
    log.lines[row : row + 1] = [line[:at], line[at:]]
    return True


@to_log("a carriage return in a row")
def carriage_return(log: Log, rng: Random) -> bool:
    """Some systems take it for a line end."""
    row = rng.choice(log.rows())
    line = log.lines[row]
    # Inside the quotes of the last column, which nobody needs, it may stay.
    end = line.rfind(log.kind.separator) if log.kind.quoted else len(line)
    at = rng.randrange(1, end)
    log.lines[row] = f"{line[:at]}\r{line[at:]}"
    return True


@to_log("blank lines")
def blank_lines(log: Log, rng: Random) -> bool:
    """Empty lines among the rows."""
    for _ in range(3):
        log.lines.insert(_inner(log, rng), "")
    return True


@to_log("lines of blanks")
def lines_of_blanks(log: Log, rng: Random) -> bool:
    """Lines among the rows that look empty."""
    log.lines.insert(_inner(log, rng), rng.choice(["  ", " \t ", "\u00a0", "\u3000"]))
    return True


@to_log("a line of separators")
def line_of_separators(log: Log, rng: Random) -> bool:
    """A row of a spreadsheet that was emptied."""
    row = _inner(log, rng)
    log.lines.insert(row, log.kind.separator * (len(log.cells(row)) - 1))
    return True


@to_log("empty columns at the right", owes="nothing")
def empty_columns(log: Log, _: Random) -> bool:
    """A spreadsheet was wider once."""
    log.lines = [line + log.kind.separator * 2 for line in log.lines]
    return True


@to_log("a remark among the rows")
def remark(log: Log, rng: Random) -> bool:
    """Somebody wrote a note into the log."""
    log.lines.insert(_inner(log, rng), "# the reader sneezed")
    return True


@to_log("a row behind a sign of remarks", told_by="begins? with #|remarks")
def row_as_remark(log: Log, rng: Random) -> bool:
    """Somebody has taken a row out: on purpose, perhaps, but it looks like any other."""
    row = _inner(log, rng)
    log.lines[row] = f"# {log.lines[row]}"
    return True


@to_log("a note without a sign")
def note(log: Log, rng: Random) -> bool:
    """Somebody wrote a note into the log, and nothing says that it is one."""
    log.lines.insert(_inner(log, rng), "the reader sneezed")
    return True


@to_log("signs of an unsettled merge")
def merge_signs(log: Log, rng: Random) -> bool:
    """Two versions of the log in one file."""
    row = _inner(log, rng)
    line = log.lines[row]
    log.lines[row : row + 1] = ["<<<<<<< ours", line, "=======", line, ">>>>>>> theirs"]
    return True


@to_log("a closing line")
def closing_line(log: Log, _: Random) -> bool:
    """The recorder says that it is done."""
    log.lines.append("recording closed, 3 trials")
    return True


@to_log("a line of means")
def line_of_means(log: Log, _: Random) -> bool:
    """A spreadsheet has a last row of means."""
    cells = log.cells(log.rows()[-1])
    log.lines.append(log.joined(["mean", *["" for _ in cells[1:-1]], "0.5"]))
    return True


@to_log("a control character", told_by=UNKNOWN_LABEL)
def control_character(log: Log, rng: Random) -> bool:
    """A sign that no text has, in a cell that is needed."""
    row = rng.choice(log.rows())
    line = log.lines[row]
    end = line.rfind(log.kind.separator) if log.has("word") else len(line)
    at = rng.randrange(1, end)
    sign = chr(rng.choice([1, 2, 7, 8, 0x0E, 0x1B]))
    log.lines[row] = f"{line[:at]}{sign}{line[at:]}"
    return True


@to_log("a form feed", owes="nothing")
def form_feed(log: Log, rng: Random) -> bool:
    """A page break from a printout."""
    row = _inner(log, rng)
    log.lines[row] = rng.choice(["\f", "\v"]) + log.lines[row]
    return True


@to_log("a line separator of Unicode")
def unicode_line_end(log: Log, rng: Random) -> bool:
    """Some programs take it for a line end, most do not."""
    row = _inner(log, rng)
    log.lines[row : row + 2] = [
        log.lines[row] + rng.choice(["\u2028", "\u2029", "\x85"]) + log.lines[row + 1]
    ]
    return True


@to_log("blanks at the end of a row", owes="nothing")
def blanks_at_end(log: Log, rng: Random) -> bool:
    """Nothing that anybody sees."""
    row = rng.choice(log.rows())
    log.lines[row] += rng.choice([" ", "   ", "\u00a0"])
    return True


@to_log("blanks in place of separators")
def blanks_for_separators(log: Log, rng: Random) -> bool:
    """One row was typed by hand."""
    if log.kind.aligned:
        return False
    row = rng.choice(log.rows())
    log.lines[row] = "    ".join(log.cells(row))
    return True


@to_log("other separators in one row")
def other_separators(log: Log, rng: Random) -> bool:
    """One row is from another export."""
    row = rng.choice(log.rows())
    log.lines[row] = ("\t" if log.kind.separator == ";" else ";").join(log.cells(row))
    return True


@to_log("an indented row")
def indented(log: Log, rng: Random) -> bool:
    """A separator before the first cell."""
    if log.kind.aligned:
        return False
    row = rng.choice(log.rows())
    log.lines[row] = log.kind.separator + log.lines[row]
    return True
