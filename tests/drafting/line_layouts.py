"""Layouts for the lines of a log of events, each with the study file that a lab would write."""

from __future__ import annotations

from collections.abc import Callable

from tests.simulator.dialects.events import FROM_LINES, EventDialect, Wording, place
from tests.simulator.dialects.recorded import Fixated, ReadTrial

#: How many trials of each reader are practice, where a layout words them otherwise.
PRACTICE = 2
_NUMBER = "[-+0-9.]+"


def xy(f: Fixated, between: str) -> str:
    """A position with something between its numbers."""
    return f"{place(f.x_px)}{between}{place(f.y_px)}"


def no_fact(_: str, __: object) -> str:
    """Nothing: facts are told by the lines of trials, and a blank line is left aside."""
    return ""


def note(name: str, value: object) -> str:
    """A fact that is left aside."""
    return f"note {name} {value}"


def patterns(**own: str) -> str:
    """The table of patterns, ``NUM`` standing for a number."""
    lines = [f"{key} = '{own[key].replace('NUM', _NUMBER)}'" for key in own]
    return "\n".join(["", "[logs.patterns]", *lines, ""])


def layout(
    begins: Callable[[ReadTrial], str],
    fixation: Callable[[Fixated, str], str],
    blink: Callable[[int, int, str], str],
    ends: Callable[[ReadTrial], str],
    read_by: str,
    *,
    reader: Callable[[str], str] = lambda who: f"reader {who}",
    fact: Callable[[str, object], str] = note,
) -> Wording:
    """A layout with lines for everything."""
    return Wording(reader, begins, fact, fixation, blink, ends, read_by)


TIMES_FIRST = layout(
    lambda t: f"{t.text_on_ms - 900} start trial {t.trial} item {t.item} cond {t.cue}",
    lambda f, _: f"{f.end_ms} fixation {f.onset_ms} {f.end_ms} {xy(f, ' ')}",
    lambda onset, end, _: f"{end + 5} blink {onset} {end}",
    lambda t: f"{t.text_off_ms + 900} end trial",
    patterns(
        trial_start=r"^\d+ start trial (?P<trial>\d+) item (?P<item>\S+) cond \w+$",
        trial_end=r"^\d+ end trial$",
        fixation=r"^\d+ fixation (?P<onset>\d+) (?P<end>\d+) (?P<x>NUM) (?P<y>NUM)$",
        blink=r"^\d+ blink (?P<onset>\d+) (?P<end>\d+)$",
        lasting=r"^reader (?P<participant>\S+)$",
    ),
)

BRACKETS = layout(
    lambda t: f"[{t.text_on_ms - 900}] on: trial {t.trial}, item {t.item}, {t.cue}",
    lambda f, _: f"[{f.end_ms}] fix {f.duration_ms} ms at ({xy(f, ', ')})",
    lambda onset, end, _: f"[{end}] blink {end - onset} ms",
    lambda t: f"[{t.text_off_ms + 900}] off",
    patterns(
        trial_start=r"^\[\d+\] on: trial (?P<trial>\d+), item (?P<item>[^,]+), \w+$",
        trial_end=r"^\[\d+\] off$",
        fixation=r"^\[(?P<end>\d+)\] fix (?P<duration>\d+) ms at \((?P<x>NUM), (?P<y>NUM)\)$",
        blink=r"^\[\d+\] blink \d+ ms$",
        lasting=r"^# participant: (?P<participant>\S+)$",
    ).replace("\n[logs.patterns]", "comment = []\n\n[logs.patterns]"),
    reader=lambda who: f"# participant: {who}",
)

KEYS = layout(
    lambda t: f"ev=start t={t.text_on_ms - 900} trial={t.trial} item={t.item} cond={t.cue}",
    lambda f, _: f"ev=fix t={f.end_ms} from={f.onset_ms} to={f.end_ms} x={xy(f, ' y=')}",
    lambda onset, end, _: f"ev=blink t={end} from={onset} to={end}",
    lambda t: f"ev=stop t={t.text_off_ms + 900} trial={t.trial}",
    patterns(
        trial_start=r"^ev=start t=\d+ trial=(?P<trial>\d+) item=(?P<item>\S+) cond=\w+$",
        trial_end=r"^ev=stop t=\d+ trial=\d+$",
        fixation=r"^ev=fix t=\d+ from=(?P<onset>\d+) to=(?P<end>\d+) x=(?P<x>NUM) y=(?P<y>NUM)$",
        blink=r"^ev=blink t=\d+ from=(?P<onset>\d+) to=(?P<end>\d+)$",
        lasting=r"^reader=(?P<participant>\S+)$",
    ),
    reader=lambda who: f"reader={who}",
)

COMMAS = layout(
    lambda t: f"trial,{t.trial},{t.item},{t.cue}",
    lambda f, _: f"fix,{f.onset_ms},{f.duration_ms},{xy(f, ',')}",
    lambda onset, end, _: f"blink,{onset},{end}",
    lambda t: f"end,{t.trial}",
    patterns(
        trial_start=r"^trial,(?P<trial>\d+),(?P<item>[^,]+),\w+$",
        trial_end=r"^end,\d+$",
        fixation=r"^fix,(?P<onset>\d+),(?P<duration>\d+),(?P<x>NUM),(?P<y>NUM)$",
        blink=r"^blink,(?P<onset>\d+),(?P<end>\d+)$",
        lasting=r"^who,(?P<participant>\S+)$",
    ),
    reader=lambda who: f"who,{who}",
    fact=lambda name, value: f"note,{name},{value}",
)

TABS = layout(
    lambda t: f"{t.text_on_ms - 900}\tTRIAL\t{t.trial}\t{t.item}",
    lambda f, _: f"{f.onset_ms}\tFIX\t{f.duration_ms}\t{xy(f, chr(9))}",
    lambda onset, end, _: f"{onset}\tBLINK\t{end - onset}",
    lambda t: f"{t.text_off_ms + 900}\tOVER",
    patterns(
        trial_start=r"^\d+\tTRIAL\t(?P<trial>\d+)\t(?P<item>\S+)$",
        trial_end=r"^\d+\tOVER$",
        fixation=r"^(?P<onset>\d+)\tFIX\t(?P<duration>\d+)\t(?P<x>NUM)\t(?P<y>NUM)$",
        blink=r"^(?P<onset>\d+)\tBLINK\t(?P<duration>\d+)$",
        lasting=r"^READER\t(?P<participant>\S+)$",
    ),
    reader=lambda who: f"READER\t{who}",
)

WORDS = layout(
    lambda t: f"trial {t.trial} with text {t.item} begins",
    lambda f, _: f"from {f.onset_ms} the gaze rested for {f.duration_ms} ms at {xy(f, ' and ')}",
    lambda onset, end, _: f"lids closed at {onset} and open again at {end}",
    lambda t: f"trial {t.trial} is over",
    patterns(
        trial_start=r"^trial (?P<trial>\d+) with text (?P<item>\S+) begins$",
        trial_end=r"^trial \d+ is over$",
        fixation=r"^from (?P<onset>\d+) the gaze rested for (?P<duration>\d+) ms "
        r"at (?P<x>NUM) and (?P<y>NUM)$",
        blink=r"^lids closed at (?P<onset>\d+) and open again at (?P<end>\d+)$",
        lasting=r"^now (?P<participant>\S+) reads$",
    ),
    reader=lambda who: f"now {who} reads",
)

RANGES = layout(
    lambda t: f"[{t.text_on_ms - 900}] TEXT ON nr={t.trial} item={t.item} cond={t.cue}",
    lambda f, _: (
        f"[{f.end_ms}] fix {f.onset_ms}..{f.end_ms} pos {xy(f, '/')} pup 3.{f.number % 10}"
    ),
    lambda onset, end, _: f"[{end + 3}] lid shut {onset}..{end}",
    lambda t: f"[{t.text_off_ms + 900}] TEXT OFF",
    patterns(
        trial_start=r"^\[\d+\] TEXT ON nr=(?P<trial>\d+) item=(?P<item>\S+) cond=\w+$",
        trial_end=r"^\[\d+\] TEXT OFF$",
        fixation=r"^\[\d+\] fix (?P<onset>\d+)\.\.(?P<end>\d+) pos (?P<x>NUM)/(?P<y>NUM) "
        "pup NUM$",
        blink=r"^\[\d+\] lid shut (?P<onset>\d+)\.\.(?P<end>\d+)$",
        lasting=r"^\*\* Person=(?P<participant>\S+)$",
    ),
    reader=lambda who: f"** Person={who}",
)

HYPHENS = layout(
    lambda t: f"trial {t.trial} - {t.item}",
    lambda f, _: f"fix {f.onset_ms}-{f.end_ms} ({xy(f, ';')})",
    lambda onset, end, _: f"blink {onset}-{end}",
    lambda _: "done",
    patterns(
        trial_start=r"^trial (?P<trial>\d+) - (?P<item>\S+)$",
        trial_end="^done$",
        fixation=r"^fix (?P<onset>\d+)-(?P<end>\d+) \((?P<x>NUM);(?P<y>NUM)\)$",
        blink=r"^blink (?P<onset>\d+)-(?P<end>\d+)$",
        lasting=r"^reader (?P<participant>\S+)$",
    ),
)

END_STAMPS = layout(
    lambda t: f"t={t.text_on_ms - 900} trial {t.trial} ({t.item}, {t.cue}) begins",
    lambda f, _: f"t={f.end_ms} gaze rested dur={f.duration_ms} pos={xy(f, ';')}",
    lambda _, end, __: f"t={end} blinked",
    lambda t: f"t={t.text_off_ms + 900} trial {t.trial} over",
    patterns(
        trial_start=r"^t=\d+ trial (?P<trial>\d+) \((?P<item>[^,]+), \w+\) begins$",
        trial_end=r"^t=\d+ trial \d+ over$",
        fixation=r"^t=(?P<end>\d+) gaze rested dur=(?P<duration>\d+) pos=(?P<x>NUM);(?P<y>NUM)$",
        blink=r"^t=\d+ blinked$",
        lasting=r"^reader (?P<participant>\S+)$",
    ),
)

MESSAGES = layout(
    lambda t: f"message: trial {t.trial} starts with {t.item}",
    lambda f, _: f"fix {f.onset_ms} {f.duration_ms} {xy(f, ' ')}",
    lambda onset, end, _: f"blink {onset} {end}",
    lambda _: "message: trial ends",
    patterns(
        trial_start=r"^message: trial (?P<trial>\d+) starts with (?P<item>\S+)$",
        trial_end="^message: trial ends$",
        fixation=r"^fix (?P<onset>\d+) (?P<duration>\d+) (?P<x>NUM) (?P<y>NUM)$",
        blink=r"^blink (?P<onset>\d+) (?P<end>\d+)$",
        lasting=r"^message: reader is (?P<participant>\S+)$",
    ).replace(
        "blink = ",
        "facts = [\n"
        + "".join(
            f"  '^message: {name} is (?P<{name}>\\S+)$',\n"
            for name in ("cue", "fit", "text_on", "text_off", "answer_ok")
        )
        + "]\nblink = ",
    ),
    reader=lambda who: f"message: reader is {who}",
    fact=lambda name, value: f"message: {name} is {value}",
)


def _otherwise(t: ReadTrial) -> str:
    """The line with which a trial starts, worded otherwise for practice."""
    if t.trial <= PRACTICE:
        return f"{t.text_on_ms - 900} practice {t.trial}: {t.item}"
    return f"{t.text_on_ms - 900} start of trial {t.trial}, text {t.item}, block main"


def _as_tests(t: ReadTrial) -> str:
    """The line with which a trial starts, practice under names with a letter."""
    kind = "practice" if t.trial <= PRACTICE else "test"
    return f"{t.text_on_ms - 900} start {kind} trial {t.trial} text {t.item}"


PRACTICE_OTHERWISE = layout(
    _otherwise,
    lambda f, _: f"{f.onset_ms} fixated for {f.duration_ms} at {xy(f, ' ')}",
    lambda onset, end, _: f"{onset} blink until {end}",
    lambda t: f"{t.text_off_ms + 900} finished",
    patterns(
        trial_end=r"^\d+ finished$",
        fixation=r"^(?P<onset>\d+) fixated for (?P<duration>\d+) at (?P<x>NUM) (?P<y>NUM)$",
        blink=r"^(?P<onset>\d+) blink until (?P<end>\d+)$",
        lasting=r"^reader (?P<participant>\S+)$",
    )
    + r"""trial_start = [
  '^\d+ practice (?P<trial>\d+): (?P<item>\S+)$',
  '^\d+ start of trial (?P<trial>\d+), text (?P<item>[^,]+), block main$',
]
""",
)

PRACTICE_SAID = layout(
    _as_tests,
    lambda f, _: f"{f.onset_ms} fixated for {f.duration_ms} at {xy(f, ' ')}",
    lambda onset, end, _: f"{onset} blink until {end}",
    lambda t: f"{t.text_off_ms + 900} finished",
    patterns(
        trial_start=r"^\d+ start \w+ trial (?P<trial>\d+) text (?P<item>\S+)$",
        trial_end=r"^\d+ finished$",
        fixation=r"^(?P<onset>\d+) fixated for (?P<duration>\d+) at (?P<x>NUM) (?P<y>NUM)$",
        blink=r"^(?P<onset>\d+) blink until (?P<end>\d+)$",
        lasting=r"^reader (?P<participant>\S+)$",
    ),
)

ANSWERS = layout(
    lambda t: (
        f"trial {t.trial} begins, text {t.item}, cue={t.cue}, fit={t.fit}, "
        f"text_on={t.text_on_ms}, text_off={t.text_off_ms}"
    ),
    lambda f, _: f"fix {f.onset_ms} {f.end_ms} {xy(f, ' ')}",
    lambda onset, end, _: f"blink {onset} {end}",
    lambda t: f"trial {t.trial} ends, answer_ok={t.answer_ok}",
    patterns(
        trial_start=r"^trial (?P<trial>\d+) begins, text (?P<item>[^,]+), cue=(?P<cue>\w+), "
        r"fit=(?P<fit>\w+), text_on=(?P<text_on>\d+), text_off=(?P<text_off>\d+)$",
        trial_end=r"^trial \d+ ends, answer_ok=(?P<answer_ok>\d)$",
        fixation=r"^fix (?P<onset>\d+) (?P<end>\d+) (?P<x>NUM) (?P<y>NUM)$",
        blink=r"^blink (?P<onset>\d+) (?P<end>\d+)$",
        lasting=r"^reader (?P<participant>\S+)$",
    ),
    fact=no_fact,
)

EYES = layout(
    lambda t: f"trial {t.trial} item {t.item}",
    lambda f, eye: f"{eye} fix {f.onset_ms} {f.duration_ms} {xy(f, ' ')}",
    lambda onset, end, eye: f"{eye} blink {onset} {end}",
    lambda _: "stop",
    patterns(
        trial_start=r"^trial (?P<trial>\d+) item (?P<item>\S+)$",
        trial_end="^stop$",
        fixation=r"^(?P<eye>[LR]) fix (?P<onset>\d+) (?P<duration>\d+) (?P<x>NUM) (?P<y>NUM)$",
        blink=r"^(?P<eye>[LR]) blink (?P<onset>\d+) (?P<end>\d+)$",
        lasting=r"^reader (?P<participant>\S+)$",
    )
    + '\n[logs.eye]\ncolumn = "better_eye"\n',
)

GLUED = layout(
    lambda t: f"{t.trial}: {t.item}",
    lambda f, _: f"fix {f.onset_ms}ms {f.duration_ms}ms x{place(f.x_px)} y{place(f.y_px)}",
    lambda onset, end, _: f"blink {onset}ms {end}ms",
    lambda _: "end",
    patterns(
        trial_start=r"^(?P<trial>\d+): (?P<item>\S+)$",
        trial_end="^end$",
        fixation=r"^fix (?P<onset>\d+)ms (?P<duration>\d+)ms x(?P<x>NUM) y(?P<y>NUM)$",
        blink=r"^blink (?P<onset>\d+)ms (?P<end>\d+)ms$",
        lasting=r"^reader (?P<participant>\S+)$",
    ),
)

LAYOUTS: dict[str, EventDialect] = {
    "times first": EventDialect(TIMES_FIRST),
    "brackets, ends": EventDialect(BRACKETS),
    "keys and values": EventDialect(KEYS),
    "comma lists": EventDialect(COMMAS),
    "tabs": EventDialect(TABS),
    "words between": EventDialect(WORDS),
    "ranges with points": EventDialect(RANGES),
    "ranges with hyphens": EventDialect(HYPHENS),
    "end stamps, blinks without times": EventDialect(END_STAMPS),
    "facts in messages": EventDialect(MESSAGES, facts=True, study=FROM_LINES),
    "practice in other words": EventDialect(PRACTICE_OTHERWISE),
    "practice in one word": EventDialect(PRACTICE_SAID),
    "answers where trials end": EventDialect(ANSWERS, facts=True, study=FROM_LINES),
    "both eyes": EventDialect(EYES, both_eyes=True),
    "one log of all": EventDialect(TIMES_FIRST, one_log=True),
    "practice in other words, one log": EventDialect(PRACTICE_OTHERWISE, one_log=True),
    "units and letters glued to numbers": EventDialect(GLUED),
}
