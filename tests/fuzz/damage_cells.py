"""Damage to single cells: no numbers, quote marks, and what spreadsheets make of cells."""

from __future__ import annotations

import re
from random import Random

from tests.fuzz.damage import UNKNOWN_LABEL, to_cells, to_log
from tests.fuzz.logs import Log

#: What every fixation must have as a number.
TIMES = ("onset", "duration", "end")
NUMBERS = (*TIMES, "x", "y")
WORDS = ("participant", "item")


def _number(cell: str) -> bool:
    """Whether a cell holds a number."""
    return re.fullmatch(r"-?[0-9]+([.,][0-9]+)?", cell) is not None


@to_cells("letters in a number", *NUMBERS)
def letters(cell: str, rng: Random) -> str | None:
    """A finger slipped."""
    at = rng.randrange(len(cell))
    return f"{cell[:at]}{rng.choice('abkxz')}{cell[at:]}" if _number(cell) else None


@to_cells("O for 0", *NUMBERS)
def o_for_0(cell: str, _: Random) -> str | None:
    """A letter that looks like a digit."""
    return cell.replace("0", "O", 1) if "0" in cell else None


@to_cells("l for 1", *NUMBERS)
def l_for_1(cell: str, _: Random) -> str | None:
    """Another letter that looks like a digit."""
    return cell.replace("1", "l", 1) if "1" in cell else None


@to_cells("the other decimal sign", "x", "y")
def other_decimal(cell: str, _: Random) -> str | None:
    """One cell was written under other settings."""
    return cell.translate(str.maketrans(".,", ",.")) if re.search("[.,]", cell) else None


@to_log("thousands sign")
def thousands(log: Log, rng: Random) -> bool:
    """A number as people write it; in the first row of a trial it may be a number by itself."""
    facts = [fact for fact in ("onset", "end") if log.has(fact)]
    if not facts:
        return False
    row = rng.choice([row for rows in log.trial_blocks() for row in rows[1:]])
    fact = rng.choice(facts)
    cell, sign = log.cell(row, fact), rng.choice([",", ".", " ", "'", "_"])
    log.set(row, fact, f"{cell[:-3]}{sign}{cell[-3:]}")
    return cell.isdecimal()


@to_cells("a negative duration", "duration")
def negative(cell: str, _: Random) -> str | None:
    """No fixation lasts less than nothing."""
    return f"-{cell}"


@to_cells("no duration at all", "duration")
def zero(_: str, __: Random) -> str:
    """No fixation lasts nothing."""
    return "0"


@to_cells("a number beyond all bounds", *NUMBERS)
def huge(_: str, rng: Random) -> str:
    """No clock and no screen is as large."""
    return rng.choice(["1e300", "9" * 20, "1e999", "-1e300", "18446744073709551615"])


@to_cells("a word that computers take for a number", *NUMBERS)
def not_a_number(_: str, rng: Random) -> str:
    """Not a number, or without an end."""
    return rng.choice(["NaN", "nan", "inf", "-Infinity", "1.#QNAN", "#NUM!", "0x1F", "1_000"])


@to_cells("a number with an exponent", "onset", "end", owes="nothing", at_line=False)
def exponent(cell: str, _: Random) -> str | None:
    """Another way to write the same number."""
    return f"{cell[0]}.{cell[1:]}e{len(cell) - 1}" if cell.isdecimal() else None


@to_cells("a minus sign of typographers", "x", "y", "duration")
def typographic_minus(cell: str, _: Random) -> str | None:
    """Not the sign that computers take for a minus."""
    return f"\u2212{cell.removeprefix('-')}" if _number(cell) else None


@to_cells("blanks inside a number", *NUMBERS)
def blanks_inside(cell: str, rng: Random) -> str | None:
    """A narrow, a wide or a blank that does not break, between digits."""
    if not _number(cell) or len(cell) < 2:
        return None
    return f"{cell[0]}{rng.choice([' ', chr(0xA0), chr(0x202F), chr(0x3000)])}{cell[1:]}"


@to_cells("blanks around a number", *NUMBERS, owes="nothing", at_line=False)
def blanks_around(cell: str, rng: Random) -> str | None:
    """They mean nothing."""
    return f"{rng.choice([' ', '  ', chr(0xA0)])}{cell} " if _number(cell) else None


@to_cells("a sign of no width in a number", *NUMBERS)
def no_width(cell: str, rng: Random) -> str | None:
    """Nobody sees it."""
    return f"{cell}{rng.choice([chr(0x200B), chr(0xFEFF), chr(0x200E)])}" if _number(cell) else None


@to_cells("wide digits", *NUMBERS)
def wide_digits(cell: str, rng: Random) -> str | None:
    """Digits of East Asian fonts, or of another script."""
    if not _number(cell):
        return None
    first = rng.choice([0xFF10, 0x0660])
    return "".join(chr(first + int(c)) if c.isdecimal() else c for c in cell)


@to_cells("a number with its unit", *NUMBERS)
def with_unit(cell: str, rng: Random) -> str | None:
    """The unit stands in the cell."""
    return f"{cell}{rng.choice([' ms', 'px', '%', ' °'])}" if _number(cell) else None


@to_cells("a number as text of a spreadsheet", *NUMBERS)
def apostrophe(cell: str, _: Random) -> str | None:
    """An apostrophe before the number, by which spreadsheets know that it is text."""
    return f"'{cell}" if _number(cell) else None


@to_cells("a number taken for a date", *NUMBERS)
def date(_: str, rng: Random) -> str:
    """What spreadsheets make of numbers."""
    return rng.choice(["2-Mar", "05.12.2024", "1900-01-14 05:12:00", "12:30", "Jan 23"])


@to_cells("a formula", *NUMBERS)
def formula(_: str, rng: Random) -> str:
    """A formula, or what its failure shows."""
    return rng.choice(["=D4+E4", "=SUM(E2:E9)", "#REF!", "#DIV/0!", "#VALUE!", "@A1", "+A1"])


@to_cells("no value", *TIMES, "participant", "trial", "item")
def no_value(_: str, rng: Random) -> str:
    """An empty cell where there must be something."""
    return rng.choice(["", "", ".", "NA"])


@to_cells("an unknown mark of no value", *NUMBERS)
def unknown_mark(_: str, rng: Random) -> str:
    """Each program has its own."""
    return rng.choice(["-", "--", "n/a", "NULL", "None", "missing", "?", "*", "<NA>"])


@to_cells("a number in place of no value", "x", "y")
def number_for_missing(_: str, rng: Random) -> str:
    """Some programs write a number that cannot be for a position that is lost."""
    return rng.choice(["-32768", "-9999", "100000000.0", "1e8", "-1000000"])


@to_cells("neither yes nor no", "blink")
def neither(_: str, rng: Random) -> str:
    """A word where a blink is told by a number."""
    return rng.choice(["perhaps", "x", "1/2", "B", "0;1"])


@to_cells("yes and no in words", "blink", owes="nothing", at_line=False)
def in_words(cell: str, rng: Random) -> str | None:
    """The same in another writing."""
    return {"0": rng.choice(["false", "FALSE", "no"]), "1": rng.choice(["true", "Yes"])}.get(cell)


@to_cells("a path in a cell", *WORDS)
def path(cell: str, _: Random) -> str:
    r"""Backslashes, of which \t and \n must stay what they are."""
    return rf"C:\new\table\{cell}"


@to_cells("a reader in capitals or small letters", "participant")
def other_case(cell: str, _: Random) -> str:
    """Typed by hand in one row."""
    return cell.swapcase()


@to_cells("a reader who is not there", "participant")
def other_reader(_: str, rng: Random) -> str:
    """A slip in one row."""
    return rng.choice(["P00", "P99", "P1", "P001", "0", "P01b", "Р01"])


@to_cells("a trial that is not there", "trial")
def other_trial(_: str, rng: Random) -> str:
    """A slip in one row."""
    return rng.choice(["0", "99", "-1", "1.5", "one", "1a"])


@to_cells("a text that is not there", "item")
def other_item(cell: str, rng: Random) -> str:
    """A slip in one row."""
    return rng.choice([f"{cell}x", cell.upper(), cell[1:], "0", "pre-i01-Apfel"])


@to_cells("letters taken apart", "item", owes="nothing", at_line=False)
def taken_apart(cell: str, _: Random) -> str | None:
    """An accent as a letter of its own (Unicode NFD): the same letter by the standard."""
    apart = cell.replace("é", "e\u0301").replace("Ä", "A\u0308")
    return apart if apart != cell else None


@to_cells("an unknown area", "label", at_line=False, told_by=UNKNOWN_LABEL)
def unknown_area(cell: str, rng: Random) -> str | None:
    """A slip in the name of an area: a label that is not listed is outside, by the contract."""
    if cell == "elsewhere":
        return None
    return rng.choice([cell.upper(), cell[:-1], f"{cell}s", rf"C:\areas\{cell}"])


def _raw(log: Log, rng: Random, text: str, *, at: int | None = None) -> bool:
    """Put something into a row as it stands, beside one of its cells."""
    row = rng.choice(log.rows()[:-1])
    line = log.lines[row]
    place = rng.randrange(len(line)) if at is None else at
    log.lines[row] = line[:place] + text + line[place:]
    return True


@to_log("a quote mark too many", told_by=UNKNOWN_LABEL)
def quote_too_many(log: Log, rng: Random) -> bool:
    """A quote mark inside some cell."""
    return _raw(log, rng, '"')


@to_log("a quote mark never closed")
def quote_not_closed(log: Log, rng: Random) -> bool:
    """A quote mark before the first cell of a row."""
    return _raw(log, rng, '"', at=0)


@to_log("a quote mark is missing")
def quote_missing(log: Log, rng: Random) -> bool:
    """A cell whose quote is opened and not closed, or the other way round."""
    row = rng.choice(log.rows()[:-1])
    # The last column holds words that nobody needs: a mark that it lost in front changes nothing.
    line = log.lines[row]
    needed = line[: line.rfind(f'{log.kind.separator}"')] if log.has("word") else line
    places = [place for place, sign in enumerate(needed) if sign == '"']
    if not places:
        return False
    place = rng.choice(places)
    log.lines[row] = line[:place] + line[place + 1 :]
    return True


@to_log("a quote mark not doubled")
def quote_not_doubled(log: Log, rng: Random) -> bool:
    """A cell that holds a single quote mark, as some exports write it."""
    places = [row for row in log.rows() if '""""' in log.lines[row]]
    if not places:
        return False
    row = rng.choice(places)
    log.lines[row] = log.lines[row].replace('""""', '"""', 1)
    return True


@to_log("quotes of typographers", told_by=UNKNOWN_LABEL)
def typographic_quotes(log: Log, rng: Random) -> bool:
    """A cell in quote marks that computers do not take for such."""
    row = rng.choice(log.rows())
    cells = log.cells(row)
    at = rng.randrange(len(cells))
    cells[at] = f"\u201c{cells[at]}\u201d"
    log.put(row, cells)
    return log.kind.columns.get("word") != at


@to_log("all cells in quotes", owes="nothing", at_line=False)
def all_quoted(log: Log, _: Random) -> bool:
    """The same by the standard for such tables."""
    if log.kind.quoted or log.kind.header != 1:
        return False
    log.lines = [
        log.kind.separator.join(f'"{cell}"' for cell in log.cells(number))
        for number in range(len(log.lines))
    ]
    return True
