"""The study file of logs that are tables, written from how they are understood."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence

from etl.drafting.meanings import Meaning, Understanding, counted, listed, shortened
from etl.drafting.readers import factors_among
from etl.drafting.table_heads import TableHead
from etl.drafting.toml_text import StudyText, Value, key_text
from etl.files.separators import spelled

#: The columns of a log in the order in which a study file names them.
_ORDER = (
    *("participant", "session", "trial", "item", "fixation", "onset", "duration", "end"),
    *("x", "y", "label", "eye", "blink"),
)
#: What a study file takes for missing where it says nothing.
_MISSING = ("", ".", "NA")


def write_form(
    out: StudyText, heads: Sequence[TableHead], decimals: Sequence[str], found: Understanding
) -> None:
    """Encoding, separator, decimal sign, marks for missing values and remarks.

    Parameters
    ----------
    out : StudyText
        The study file.
    heads : sequence of TableHead
        The logs.
    decimals : sequence of str
        The decimal sign of each; empty where no number has decimals.
    found : Understanding
        How the logs are understood.
    """
    of_all = counted(len(heads), "log")
    encodings = Counter(_encoding(head) for head in heads)
    separators = Counter(head.cells.delimiter for head in heads)
    signs = Counter(sign for sign in decimals if sign)
    left_open = []
    if len(encodings) == 1 and next(iter(encodings)):
        out.guess("encoding", next(iter(encodings)), f"all letters of {of_all} can be read so")
    elif len(encodings) > 1:
        parts = (f"{n:,} {name or 'plain letters only'}" for name, n in encodings.most_common())
        left_open.append(f"encoding ({listed(parts)})")
    if len(separators) == 1:
        separator = next(iter(separators))
        told = f"{spelled(separator)} split the rows of {of_all} into as many fields as the header"
        out.guess("delimiter", separator, told)
    else:
        parts = (f"{n:,} {spelled(sign)}" for sign, n in separators.most_common())
        left_open.append(f"delimiter ({listed(parts)})")
    if len(signs) == 1:
        sign = next(iter(signs))
        name = "a point" if sign == "." else "a comma"
        if separators.keys() != {sign}:
            out.guess("decimal", sign, f"numbers are written with {name}")
    elif signs:
        parts = (f'{n:,} "{sign}"' for sign, n in signs.most_common())
        left_open.append(f"decimal ({listed(parts)})")
    if left_open:
        out.remark(
            f"The logs differ, so these keys are left out and found out log by log: "
            f"{'; '.join(left_open)}."
        )
    extra = [mark for mark in found.missing if mark not in _MISSING]
    if extra:
        told = f"besides the usual marks, columns of numbers hold {shortened(extra)}"
        out.guess("missing", [*_MISSING, *extra], told)
    remarks = [sign for head in heads for sign in head.remarks if sign != "#"]
    if remarks:
        signs_found = list(dict.fromkeys(remarks))
        told = f"lines that begin with {shortened(signs_found)} are not split like the others"
        out.guess("comment", ["#", *signs_found], told)


def _encoding(head: TableHead) -> str:
    """The encoding of a log; empty where plain letters alone leave it open."""
    found = head.cells.text.encoding.removesuffix("-sig")
    plain = found == "utf-8" and head.cells.text.data.isascii() and not head.head.whole
    return "" if plain else found


def write_columns(out: StudyText, found: Understanding) -> None:
    """What each column means, which rows count, and which eye.

    Parameters
    ----------
    out : StudyText
        The study file.
    found : Understanding
        How the logs are understood.
    """
    out.begin("logs.columns", "Our name for a thing = the header of its column in the logs.")
    for name in _ORDER:
        meaning, question = found.meanings.get(name), found.questions.get(name)
        if question is not None:
            out.ask(name, question)
        elif meaning is not None:
            write_column(out, name, meaning)
    if found.perhaps_blink:
        out.example("blink", found.perhaps_blink, "it holds 0 and 1; if 1 marks a blink, use this")
    if found.where is not None:
        header, value = found.where
        out.begin("logs.where")
        out.guess(header, [value], found.remarks.pop(0))
    write_eyes(out, found.eyes, found.eye_values)
    write_samples(out, found)
    for remark in found.remarks:
        out.remark(f"Look: {remark}.")
    if found.remarks:
        out.gap()


def write_samples(out: StudyText, found: Understanding) -> None:
    """How fixations are found, where the logs hold samples.

    Parameters
    ----------
    out : StudyText
        The study file.
    found : Understanding
        How the logs are understood.
    """
    if not found.samples:
        return
    out.begin("logs.samples")
    out.guess("method", "engbert_kliegl", found.samples)
    out.example("threshold_factor", 6.0, "the usual value: a saccade is so much faster than noise")
    out.example("shortest_saccade_ms", 12.0, "the usual value")
    out.example("shortest_fixation_ms", 50.0, "the usual value; what is shorter is no fixation")


def write_column(out: StudyText, name: str, meaning: Meaning) -> None:
    """One column, with its unit where it has one.

    Parameters
    ----------
    out : StudyText
        The study file.
    name : str
        Its canonical name.
    meaning : Meaning
        The column.
    """
    value: Value = meaning.header
    if meaning.unit:
        value = {"column": meaning.header, "unit": meaning.unit}
    if meaning.question:
        out.ask_within(name, value, meaning.question, meaning.evidence)
    else:
        out.guess(name, value, meaning.evidence)


def write_eyes(
    out: StudyText,
    eyes: Mapping[str, Mapping[str, Meaning]],
    eye_values: Mapping[str, int],
    what: str = "row",
) -> None:
    """Which eye counts, where both were recorded.

    Parameters
    ----------
    out : StudyText
        The study file.
    eyes : mapping of str to mapping of str to Meaning
        The columns of each eye, where a row holds both.
    eye_values : mapping of str to int
        How many rows there are of each eye, where each row is of one.
    what : str, optional
        What was counted.
    """
    if not eye_values and not eyes:
        return
    out.begin("logs.eye")
    if eyes:
        names = listed((f'"{eye}"' for eye in eyes), "or")
        out.ask("use", f"which eye counts, {names}? Each row holds both")
    else:
        told = listed((f'"{eye}" ({counted(n, what)})' for eye, n in eye_values.items()), "or")
        out.ask("use", f"which eye counts, {told} of what was looked at?")
    out.example("column", "better_eye", "or: a column of the reader table says it")
    out.example("readers", {"P02": next(iter(eyes or eye_values))}, "or: single readers differ")
    for eye, columns in eyes.items():
        out.begin(f"logs.eye.columns.{key_text(eye)}")
        for name in _ORDER:
            if name in columns:
                write_column(out, name, columns[name])


def write_facts(
    out: StudyText, found: Understanding, *, item_is_known: bool, readers: str = ""
) -> None:
    """Examples of where facts about readers, texts and trials come from.

    Parameters
    ----------
    out : StudyText
        The study file.
    found : Understanding
        How the logs are understood.
    item_is_known : bool
        Whether the logs say which text was read.
    readers : str, optional
        The file of facts about readers, where one is there.
    """
    out.section("Facts about readers, texts and trials: remove the # where you have them")
    out.example_table("participants")
    told = "a row a reader: a column participant, and facts"
    out.example("table", readers or "participants.csv", told)
    out.example_table("items")
    out.example("table", "items.csv", "a row a text: a column item, and facts")
    if not item_is_known:
        told = (
            "No column of the logs says which text was read. Unless all trials have the same text, "
            "a trial list must say it: a table with the columns participant, trial and item."
        )
        out.example_table("trials", told)
    else:
        out.example_table("trials")
    out.example("table", "trial_list.csv", "a row a trial: participant, trial, item, and facts")
    factors = factors_among(found.facts)
    if factors:
        told = "; ".join(f"{name} ({shortened(found.facts[name])})" for name in factors)
        out.remark(
            f"These columns of the logs are the same in all rows of a trial and have few values, "
            f"as the factors of a design have: {told}."
        )
    out.example("factors", factors or ["cue", "fit"], "the factors of your design")
    others = [name for name in found.facts if name not in factors]
    if others:
        out.example("covariates", others, "carried along; the same in all rows of a trial")
    out.example("repeated", "last", "where a trial was recorded twice: error, first or last")


def write_rest(out: StudyText) -> None:
    """Screening, outcomes and output.

    Parameters
    ----------
    out : StudyText
        The study file.
    """
    out.section("What is left out, in this order: remove the # of each rule you want")
    out.example_table("screening.fixations")
    out.example("under_ms", 80, "shorter fixations")
    out.example("over_ms", 800, "longer ones")
    out.example_table("screening.trials")
    out.example("fewest_fixations", 3, "trials with fewer fixations")
    out.example_table("screening.participants")
    out.example("lost_trials_share_over", 0.3, "readers who lost a larger share of their trials")
    out.section("What comes out")
    out.begin("measures")
    told = "All outcomes; `trialwright measures` says what they are."
    out.say("outcomes", ["binary", "count", "duration"], told)
    out.begin("output")
    out.say("folder", "out", "Beside this file.")
    out.say("formats", ["parquet", "csv"])
