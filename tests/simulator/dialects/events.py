"""The small orchard study as logs of events: a line for all that happens, in invented wordings."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import partial
from pathlib import Path

from tests.simulator.dialects.recorded import Fixated, ReadTrial, RecordedStudy
from tests.simulator.dialects.study_files import StudyFile
from tests.simulator.dialects.tables import put_documents, zipped
from tests.simulator.writing import put

#: One line of a log and the time at which it is written; lines of one time keep their order.
Timed = tuple[int, str]


@dataclass(frozen=True, slots=True)
class Wording:
    """How lines are worded, and the patterns that read them.

    Attributes
    ----------
    reader, begins, fact, fixation, blink, ends : callable
        The line that tells of each thing.
    patterns : str
        The table ``[logs.patterns]`` and those that go with it, as TOML.
    opening : tuple of str
        Lines at the top of a log.
    """

    reader: Callable[[str], str]
    begins: Callable[[ReadTrial], str]
    fact: Callable[[str, object], str]
    fixation: Callable[[Fixated, str], str]
    blink: Callable[[int, int, str], str]
    ends: Callable[[ReadTrial], str]
    patterns: str
    opening: tuple[str, ...] = ()


def place(px: float | None, decimal: str = ".") -> str:
    """A position, or the mark of a missing one."""
    return "." if px is None else f"{px:.1f}".replace(".", decimal)


SENTENCES = Wording(
    reader=lambda who: f"reader: {who}",
    begins=lambda t: f"trial {t.trial} begins, text {t.item}",
    fact=lambda name, value: f"{name} = {value}",
    fixation=lambda f, _: f"fixated {f.onset_ms} {f.end_ms} at {place(f.x_px)} {place(f.y_px)}",
    blink=lambda onset, end, _: f"blinked {onset} {end}",
    ends=lambda _: "trial ends",
    patterns=r"""
[logs.patterns]
trial_start = '^trial (?P<trial>\d+) begins, text (?P<item>\S+)$'
trial_end = '^trial ends$'
fixation = '^fixated (?P<onset>\d+) (?P<end>\d+) at (?P<x>[-0-9.]+) (?P<y>[-0-9.]+)$'
blink = '^blinked (?P<onset>\d+) (?P<end>\d+)$'
lasting = '^reader: (?P<participant>\S+)$'
facts = [
  '^cue = (?P<cue>\w+)$',
  '^fit = (?P<fit>\w+)$',
  '^text_on = (?P<text_on>\d+)$',
  '^text_off = (?P<text_off>\d+)$',
  '^answer_ok = (?P<answer_ok>[01])$',
]
ignore = ['^calibrated', '^$']
""",
    opening=("calibrated, worst point 0.4 deg",),
)

FIELDS = Wording(
    reader=lambda who: f"who|{who}",
    begins=lambda t: f"{t.text_on_ms - 900}|go|{t.trial}|{t.item}",
    fact=lambda name, value: f"note|{name}|{value}",
    fixation=lambda f, eye: (
        f"{f.onset_ms}|fix|{f.duration_ms}|{place(f.x_px)}|{place(f.y_px)}|{eye}"
    ),
    blink=lambda onset, end, eye: f"{onset}|lid|{end - onset}|{eye}",
    ends=lambda t: f"{t.text_off_ms + 900}|stop|{t.trial}",
    patterns=r"""
[logs.patterns]
trial_start = '^\d+\|go\|(?P<trial>\d+)\|(?P<item>[^|]+)$'
trial_end = '^\d+\|stop\|\d+$'
fixation = '^(?P<onset>\d+)\|fix\|(?P<duration>\d+)\|(?P<x>[^|]+)\|(?P<y>[^|]+)\|(?P<eye>[LR])$'
blink = '^(?P<onset>\d+)\|lid\|(?P<duration>\d+)\|(?P<eye>[LR])$'
lasting = '^who\|(?P<participant>[^|]+)$'
ignore = '^note\|'

[logs.columns]
onset = { column = "onset", unit = "ms" }
duration = { column = "duration", unit = "ms" }

[logs.eye]
column = "better_eye"
""",
)

#: The position in a line of records.
_PLACES = r'"place": \[(?P<x>[-0-9.]+), (?P<y>[-0-9.]+)\]'
RECORDS = Wording(
    reader=lambda who: f'{{"reader": "{who}"}}',
    begins=lambda t: f'{{"trial": {t.trial}, "text": "{t.item}"}}',
    fact=lambda name, value: f'{{"{name}": "{value}"}}',
    fixation=lambda f, _: (
        f'{{"s": {f.onset_ms / 1000:.3f}, "for": {f.duration_ms / 1000:.3f}, '
        f'"place": [{place(f.x_px)}, {place(f.y_px)}], "lids": {int(f.blink)}}}'
    ),
    blink=lambda onset, end, _: f'{{"blink": [{onset}, {end}]}}',
    ends=lambda _: '{"trial": null}',
    patterns=r"""
[logs.patterns]
trial_start = '{"trial": (?P<trial>\d+), "text": "(?P<item>[^"]+)"}'
trial_end = '{"trial": null}'
fixation = '{"s": (?P<s>[0-9.]+), "for": (?P<lasting>[0-9.]+), PLACES, "lids": (?P<lids>[01])}'
lasting = '{"reader": "(?P<participant>[^"]+)"}'
other = "ignore"

[logs.columns]
onset = { column = "s", unit = "s" }
duration = { column = "lasting", unit = "s" }
blink = "lids"
""".replace("PLACES", _PLACES),
)

AREAS = Wording(
    reader=lambda who: f"reader: {who}",
    begins=lambda t: f"trial {t.trial}, {t.item}",
    fact=lambda name, value: f"{name} = {value}",
    fixation=lambda f, _: f"fixation {f.number} from {f.onset_ms} to {f.end_ms} on {f.label}",
    blink=lambda *_: "blink",
    ends=lambda _: "over",
    patterns=r"""
[logs.patterns]
trial_start = '^trial (?P<trial>\d+), (?P<item>\S+)$'
trial_end = '^over$'
fixation = '^fixation (?P<fixation>\d+) from (?P<onset>\d+) to (?P<end>\d+) on (?P<label>.+)$'
blink = '^blink$'
lasting = '^reader: (?P<participant>\S+)$'
ignore = ' = '
""",
)


@dataclass(frozen=True, slots=True)
class EventDialect:
    """How logs of events are written.

    ``facts`` puts the facts about trials into the lines, and leaves the trial list away; ``eyes``
    writes the other eye's events too; ``layout`` is a log a reader, or one for all.
    """

    wording: Wording
    facts: bool = False
    both_eyes: bool = False
    one_log: bool = False
    unit: str = "ms"
    encoding: str = "utf-8"
    newline: str = "\n"
    compressed: bool = False
    study: Callable[[str], StudyFile] = StudyFile


FROM_LINES = partial(StudyFile, trials="")

EVENT_DIALECTS: dict[str, EventDialect] = {
    "events in sentences": EventDialect(SENTENCES, facts=True, study=FROM_LINES),
    "events in sentences, a trial list": EventDialect(SENTENCES),
    "events in sentences, one log": EventDialect(
        SENTENCES, facts=True, one_log=True, study=FROM_LINES
    ),
    "events in sentences, utf-16": EventDialect(
        SENTENCES, facts=True, encoding="utf-16", newline="\r\n", study=FROM_LINES
    ),
    "events in fields, both eyes": EventDialect(FIELDS, both_eyes=True),
    "events in fields, gzipped": EventDialect(FIELDS, compressed=True),
    "events in records": EventDialect(RECORDS, unit="s"),
    "events in areas": EventDialect(AREAS, study=partial(StudyFile, labels=True)),
}


def write_events(study: RecordedStudy, folder: Path, dialect: EventDialect) -> Path:
    """Write a study whose logs are lines of events.

    Parameters
    ----------
    study : RecordedStudy
        What was recorded.
    folder : Path
        Made where it is missing.
    dialect : EventDialect
        How.

    Returns
    -------
    Path
        The study file.
    """
    logs: dict[str, list[str]] = {}
    for reader in study.readers:
        name = "all" if dialect.one_log else reader.participant
        lines = logs.setdefault(name, list(dialect.wording.opening))
        lines.append(dialect.wording.reader(reader.participant))
        for trial in study.of(reader.participant):
            lines += lines_of(trial, reader.eye, dialect)
    ending = ".txt.gz" if dialect.compressed else ".txt"
    for name, lines in logs.items():
        content = (dialect.newline.join(lines) + dialect.newline).encode(dialect.encoding)
        put(folder / f"logs/{name}{ending}", zipped(content) if dialect.compressed else content)
    put_documents(study, folder, unit=dialect.unit)
    if dialect.facts:
        (folder / "trial_list.csv").unlink()
    head = f'[logs]\nfiles = ["logs/*{ending}"]\nkind = "events"\n'
    path = folder / "study.toml"
    put(path, dialect.study(head + dialect.wording.patterns).text().encode("utf-8"))
    return path


def lines_of(trial: ReadTrial, eye: str, dialect: EventDialect) -> list[str]:
    """The lines of one trial, in the order in which they were written."""
    wording = dialect.wording
    lines = [wording.begins(trial)]
    if dialect.facts:
        lines += [wording.fact("cue", trial.cue), wording.fact("fit", trial.fit)]
    # Events are written when they are over; a stable sort keeps what is over at one time in order.
    lines += [line for _, line in sorted(_timed(trial, eye, dialect), key=lambda timed: timed[0])]
    if dialect.facts:
        lines.append(wording.fact("answer_ok", trial.answer_ok))
    return [*lines, wording.ends(trial)]


def _timed(trial: ReadTrial, eye: str, dialect: EventDialect) -> Iterator[Timed]:
    """What happens in a trial, with the time at which each line is written."""
    wording, other = dialect.wording, "L" if eye == "R" else "R"
    if dialect.facts:
        yield trial.text_on_ms, wording.fact("text_on", trial.text_on_ms)
        yield trial.text_off_ms, wording.fact("text_off", trial.text_off_ms)
    for f in trial.fixations:
        yield f.end_ms, wording.fixation(f, eye)
        if dialect.both_eyes:
            late = f.by_other_eye()
            yield late.end_ms, wording.fixation(late, other)
            # The other eye blinks where nobody would, and that counts for nothing.
            yield late.end_ms + 1, wording.blink(late.onset_ms, late.end_ms, other)
    for onset, end in trial.blinks:
        yield end, wording.blink(onset, end, eye)
