"""Studies in which readers differ in everything that the work on groups may stumble over."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from tests.end_to_end.building import copied_sample, write
from tests.lines.passages_study import Passages, read_through
from tests.simulator import write_bulk_study

EVERY_RULE = """
[screening.fixations]
outside_text_time = true
off_screen = true
first = 1
last = 1
blink = "drop"
merge = { under_ms = 120, within_px = 40 }
under_ms = 80
over_ms = 500
[screening.trials]
notes = "notes.csv"
fewest_fixations = 4
outside_share_over = 0.10
duration_ms = [500, 3000]
blink_in_first_pass_of = ["verb"]
no_first_pass_on = ["verb"]
answer_wrong = true
[screening.participants]
correct_share_under = 0.75
lost_trials_share_over = 0.70
fewest_trials_per_cell = 2
[screening.values]
outlier_sd = 2
"""


def screened(root: Path) -> Path:
    """A sample study under every rule, so that readers, trials, fixations and values go."""
    return copied_sample("orchard", root, rules=EVERY_RULE)


def changed(study_file: Path, logs: dict[str, Callable[[list[str]], list[str]]]) -> Path:
    """The study with the lines of some logs changed."""
    for name, change in logs.items():
        log = study_file.parent / "logs" / f"{name}.tsv"
        lines = change(log.read_text(encoding="utf-8").splitlines())
        log.write_text("\n".join([*lines, ""]), encoding="utf-8", newline="\n")
    return study_file


def damaged(root: Path) -> Path:
    """Logs with rows out of order, rows that come twice, and a trial that comes again."""

    def swapped(lines: list[str]) -> list[str]:
        return [*lines[:40], lines[42], lines[41], lines[40], *lines[43:]]

    def doubled(lines: list[str]) -> list[str]:
        return [*lines[:50], lines[49], *lines[50:]]

    def again(lines: list[str]) -> list[str]:
        return [*lines[:100], *lines[60:75], *lines[100:]]

    logs = {"P03": swapped, "P06": again, "P11": swapped, "P15": doubled}
    return changed(copied_sample("orchard", root, rules=None), logs)


def recorded_again(root: Path) -> Path:
    """Some readers did a trial a second time at the end of the session."""

    def repeated(lines: list[str]) -> list[str]:
        names = lines[0].split("\t")
        trial, onset = names.index("trial"), names.index("start_ms")
        rows = [line.split("\t") for line in lines]
        late_ms = 5000 + int(rows[-1][onset])
        second = [row.copy() for row in rows[1:] if row[trial] == "9"]
        begin_ms = int(second[0][onset])
        for row in second:
            row[onset] = str(int(row[onset]) - begin_ms + late_ms)
        return [*lines, *("\t".join(row) for row in second)]

    keys = 'keys = ["participant", "trial"]'
    file = copied_sample("orchard", root, {keys: f'{keys}\nrepeated = "last"'}, rules=None)
    return changed(file, {"P03": repeated, "P06": repeated, "P12": repeated})


def by_lines(root: Path) -> Path:
    """Longer texts, whose lines a method tells; undersweeps go."""
    rules = (
        '[lines]\nmethod = "slice"\n[screening.fixations]\nundersweep = "drop"\n'
        "merge = { under_ms = 120, within_px = 40 }\n"
    )
    return copied_sample("passages", root, rules=rules)


def _by_hand(root: Path, rows: str) -> Path:
    """Five readers of passages that drift, with some lines set by hand."""
    trials = {
        (f"R{reader}", str(trial)): read_through(10 * reader + trial, shift=0.03 * trial)
        for reader in range(1, 6)
        for trial in range(1, 3)
    }
    more = {"lines.csv": "participant,trial,fixation,line\n" + rows}
    extra = '[lines]\ncorrections = "lines.csv"\n[screening.trials]\nline_confidence_under = 0.9\n'
    return (Passages(trials, more=more) + extra).written(root)


def by_hand(root: Path) -> Path:
    """Lines set by hand for two readers."""
    return _by_hand(root, "R1,1,3,2\nR1,1,4,0\nR3,2,10,1\n")


def wrongly_by_hand(root: Path) -> Path:
    """Lines set by hand that are not there, and a fixation that is not there."""
    return _by_hand(root, "R1,1,3,2\nR2,1,400,1\nR3,2,10,99\nR5,1,2,1\n")


def labelled(root: Path) -> Path:
    """Logs that say which area was fixated, and name areas that nobody knows, in any order."""
    looks = {"R1": "abz ya cx", "R2": "xyz", "R3": "abcba", "R4": "yyxa?", "R5": "b"}
    files = {
        "study.toml": (
            '[logs]\nfiles = ["*.tsv"]\n[logs.columns]\nparticipant = "who"\ntrial = "trial"\n'
            'fixation = "n"\nduration = "dur"\nlabel = "area"\n'
            '[regions]\nfile = "regions.csv"\nkind = "labels"\n'
        ),
        "regions.csv": "label,region,order\na,start,1\nb,middle,2\nc,end,3\n",
    }
    for who, areas in looks.items():
        rows = ["who\ttrial\tn\tdur\tarea"]
        for trial, own in enumerate(areas.split(), start=1):
            rows += [f"{who}\t{trial}\t{n}\t{200 + n}\t{area}" for n, area in enumerate(own, 1)]
        files[f"{who}.tsv"] = "\n".join([*rows, ""])
    return write(root, files)


def in_one_log(root: Path) -> Path:
    """All readers in one log; numbers of fixations run on, and the clock starts with each reader.

    A fixation of the third reader is not over when the next trial begins.
    """
    made = write_bulk_study(root, readers=6, trials=4, fixations=5, regions=3)
    header, rows = "", []
    for log in sorted((root / "logs").glob("*.tsv")):
        header, *own = log.read_text(encoding="utf-8").splitlines()
        rows += [row.split("\t") for row in own]
        log.unlink()
    place = header.split("\t").index("fix")
    for number, row in enumerate(rows, start=1):
        row[place] = str(number)
    rows[2 * 20 + 9][header.split("\t").index("dur_ms")] = "9000"
    whole = "\n".join([header, *("\t".join(row) for row in rows), ""])
    (root / "logs" / "all.tsv").write_text(whole, encoding="utf-8", newline="\n")
    return made.study_file


STUDIES = {
    make.__name__: make
    for make in (
        *(screened, damaged, recorded_again, by_lines),
        *(by_hand, wrongly_by_hand, labelled, in_one_log),
    )
}
