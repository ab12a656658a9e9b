"""Damage to what stands beside the logs: the trial list, the table of readers, the texts."""

from __future__ import annotations

from collections.abc import Callable
from random import Random

from tests.fuzz.damage import Owes, whole
from tests.fuzz.logs import Files, LogKind, content_of

TRIALS, TEXTS = "trial_list.csv", "regions.csv"
#: Changes the lines of a table; False where it does not apply.
Change = Callable[[list[str], Random], bool]


def to_table(name: str, file: str, *, owes: Owes = "told") -> Callable[[Change], Change]:
    """Register damage to the lines of a table."""

    def register(change: Change) -> Change:
        @whole(name, owes=owes)
        def spoil(kind: LogKind, files: Files, rng: Random) -> Files | None:
            if file not in files or (file == TEXTS and kind.columns.get("label")):
                return None
            lines = content_of(files, file).decode("utf-8").removesuffix("\n").split("\n")
            if not change(lines, rng):
                return None
            return {**files, file: ("\n".join(lines) + "\n").encode("utf-8")}

        assert spoil
        return change

    return register


def _row(lines: list[str], rng: Random) -> int:
    """Some row below the header."""
    return rng.randrange(1, len(lines))


def _set(lines: list[str], row: int, column: str, text: str) -> None:
    """Change a cell of a table whose cells need no quotes."""
    cells = lines[row].split(",")
    cells[lines[0].split(",").index(column)] = text
    lines[row] = ",".join(cells)


@to_table("a trial missing in the trial list", TRIALS)
def trial_missing(lines: list[str], rng: Random) -> bool:
    """The log has a trial of which nothing is known."""
    del lines[_row(lines, rng)]
    return True


@to_table("a trial twice in the trial list", TRIALS)
def trial_twice(lines: list[str], rng: Random) -> bool:
    """Two rows about one trial."""
    row = _row(lines, rng)
    lines.insert(row, lines[row])
    return True


@to_table("two rows of the trial list contradict each other", TRIALS)
def contradicting(lines: list[str], rng: Random) -> bool:
    """Two rows about one trial, and one says something else."""
    row = _row(lines, rng)
    lines.append(lines[row])
    _set(lines, -1, "answer_ok", "0" if ",1," in lines[row] else "1")
    return lines[-1] != lines[row]


@to_table("the trial list cut", TRIALS)
def trials_cut(lines: list[str], rng: Random) -> bool:
    """A copy that was broken off within a row."""
    row = _row(lines, rng)
    lines[row:] = [lines[row][: len(lines[row]) // 2]]
    return True


@to_table("the trial list without rows", TRIALS)
def no_trials(lines: list[str], _: Random) -> bool:
    """Only its header."""
    del lines[1:]
    return True


@to_table("another text in the trial list", TRIALS)
def other_text(lines: list[str], rng: Random) -> bool:
    """The log says which text was read."""
    _set(lines, _row(lines, rng), "item", "pré-i99-Äpfel")
    return True


@to_table("a word for a time in the trial list", TRIALS)
def word_for_time(lines: list[str], rng: Random) -> bool:
    """When the text came up is no number."""
    _set(
        lines, _row(lines, rng), rng.choice(["text_on", "text_off"]), rng.choice(["soon", "1e999"])
    )
    return True


@to_table("neither right nor wrong in the trial list", TRIALS)
def neither(lines: list[str], rng: Random) -> bool:
    """An answer that is no answer."""
    _set(lines, _row(lines, rng), "answer_ok", rng.choice(["perhaps", "7", "ok?"]))
    return True


@to_table("an unknown level in the trial list", TRIALS)
def unknown_level(lines: list[str], rng: Random) -> bool:
    """No text was written for it."""
    _set(lines, _row(lines, rng), rng.choice(["cue", "fit"]), rng.choice(["Early", "odd ity", ""]))
    return True


@to_table("the trial list in another order", TRIALS, owes="nothing")
def other_order(lines: list[str], rng: Random) -> bool:
    """The order of its rows means nothing."""
    before = lines[:]
    rows = lines[1:]
    rng.shuffle(rows)
    lines[1:] = rows
    return lines != before


@to_table("a text missing", TEXTS, owes="nothing")
def text_missing(lines: list[str], rng: Random) -> bool:
    """Texts from some row on; perhaps nobody read them."""
    del lines[rng.randrange(1, len(lines)) :]
    return True


@to_table("a text twice", TEXTS)
def text_twice(lines: list[str], rng: Random) -> bool:
    """Two texts with the same keys."""
    lines.append(lines[_row(lines, rng)])
    return True


@to_table("a brace never closed in the texts", TEXTS)
def open_brace(lines: list[str], rng: Random) -> bool:
    """The marks of regions are broken."""
    row = _row(lines, rng)
    at = [place for place, sign in enumerate(lines[row]) if sign == "}"]
    place = rng.choice(at)
    lines[row] = lines[row][:place] + lines[row][place + 1 :]
    return True


@whole("the texts are missing")
def no_texts(_: LogKind, files: Files, __: Random) -> Files:
    """The file of regions is gone."""
    return {name: own for name, own in files.items() if name not in (TEXTS, "labels.csv")}


@whole("the trial list is missing")
def no_list(_: LogKind, files: Files, __: Random) -> Files | None:
    """The file is gone."""
    return {name: own for name, own in files.items() if name != TRIALS}


@whole("a picture in place of the trial list")
def picture(_: LogKind, files: Files, rng: Random) -> Files | None:
    """A screenshot of the trial list."""
    return {**files, TRIALS: b"\x89PNG\r\n\x1a\n" + rng.randbytes(300)} if TRIALS in files else None


@to_table("a reader twice in the table", "participants.csv")
def reader_twice(lines: list[str], rng: Random) -> bool:
    """Of two ages."""
    row = _row(lines, rng)
    lines.append(lines[row])
    _set(lines, -1, "age", "99")
    return True


@to_table("a reader missing in the table", "participants.csv")
def reader_missing(lines: list[str], rng: Random) -> bool:
    """Nothing is known of somebody who read."""
    del lines[_row(lines, rng)]
    return True
