"""The tables of screening: what they hold, and which rules are on."""

from collections.abc import Callable
from dataclasses import dataclass

import pydantic
import pytest

from etl.study import Study
from etl.study.models import StudyFile
from etl.study.screening import Screening
from etl.study.shape import known_keys
from tests.study.written import ALL_OFF, EXAMPLE, SOUND, changed

#: Every rule, in the order in which the design applies them.
IN_ORDER = (
    "outside_text_time",
    "off_screen",
    "first",
    "last",
    "blink",
    "undersweep",
    "merge",
    "under_ms",
    "over_ms",
    "notes",
    "fewest_fixations",
    "line_confidence_under",
    "outside_share_over",
    "duration_ms",
    "blink_in_first_pass_of",
    "no_first_pass_on",
    "answer_wrong",
    "participant_notes",
    "correct_share_under",
    "lost_trials_share_over",
    "fewest_trials_per_cell",
    "outlier_sd",
)
ALL_ON = changed("answer_wrong = false", "answer_wrong = true", EXAMPLE)


@dataclass(frozen=True)
class Key:
    """A key of screening as a study writes it, what it becomes, and what else the study needs."""

    table: str
    written: str
    value: object
    named: str = ""

    @property
    def name(self) -> str:
        """The key alone."""
        return self.written.split(" = ")[0]


#: Each rule alone with a limit, in the order of application.
KEYS = [
    Key("fixations", "outside_text_time = true", True),
    Key("fixations", "off_screen = true", True),
    Key("fixations", "first = 2", 2),
    Key("fixations", "last = 1", 1),
    Key("fixations", 'blink = "drop"', "drop"),
    Key("fixations", 'undersweep = "drop"', "drop"),
    Key("fixations", "merge = { under_ms = 80, within_px = 14.5 }", {"within_px": 14.5}),
    Key("fixations", "under_ms = 80", 80.0),
    Key("fixations", "over_ms = 799.5", 799.5),
    Key("trials", 'notes = "notes.csv"', "notes.csv"),
    Key("trials", "fewest_fixations = 3", 3),
    Key("trials", "line_confidence_under = 1", 1.0),
    Key("trials", "outside_share_over = 0", 0.0),
    Key("trials", "duration_ms = [0, 30000.5]", (0.0, 30000.5)),
    Key("trials", 'blink_in_first_pass_of = ["verb", "object"]', ("verb", "object")),
    Key("trials", 'no_first_pass_on = ["verb"]', ("verb",)),
    Key("trials", "answer_wrong = true", True),
    Key("participants", 'notes = "notes.csv"', "notes.csv", named="participant_notes"),
    Key("participants", "correct_share_under = 1", 1.0),
    Key("participants", "lost_trials_share_over = 0.3", 0.3),
    Key("participants", "fewest_trials_per_cell = 4", 4),
    Key("values", "outlier_sd = 2.5", 2.5),
]


def screening_of(study: StudyFile) -> Screening:
    """The study's screening, which must be there."""
    assert study.screening is not None
    return study.screening


def alone(key: Key) -> str:
    """The design's example with one rule of screening in place of all."""
    start, end = EXAMPLE.index("[screening.fixations]"), EXAMPLE.index("[measures]")
    return f"{EXAMPLE[:start]}[screening.{key.table}]\n{key.written}\n{EXAMPLE[end:]}"


def test_keys_are_those_of_the_design() -> None:
    """Tables and keys of screening, in the order of application, and no others."""
    known = [path[1:] for path, _ in known_keys() if path[0] == "screening"]
    distances = ("under_ms", "within_px", "within_deg", "within_characters")
    expected: list[tuple[str, ...]] = [()]
    for place, key in enumerate(KEYS):
        if place == 0 or key.table != KEYS[place - 1].table:
            expected.append((key.table,))
        expected.append((key.table, key.name))
        if key.name == "merge":
            expected += [("fixations", "merge", inner) for inner in distances]
    assert known == expected


@pytest.mark.parametrize("key", KEYS, ids=lambda key: f"{key.table}.{key.name}")
def test_key_is_read(load: Callable[..., Study], key: Key) -> None:
    """A rule's limit is an attribute of the same name; a whole number serves as a number."""
    table = getattr(screening_of(load(alone(key))), key.table)
    read = getattr(table, key.name)
    if isinstance(key.value, dict):
        read = {name: getattr(read, name) for name in key.value}
    assert (read, type(read)) == (key.value, type(key.value))


@pytest.mark.parametrize("key", KEYS, ids=lambda key: f"{key.table}.{key.name}")
def test_named_rule_is_on_alone(load: Callable[..., Study], key: Key) -> None:
    """A rule with a limit is on, also with a limit of 0, and all others are off."""
    assert screening_of(load(alone(key))).rules() == (key.named or key.name,)


@pytest.mark.parametrize("key", KEYS, ids=lambda key: f"{key.table}.{key.name}")
def test_other_tables_are_absent(load: Callable[..., Study], key: Key) -> None:
    """A table that the study does not have is None."""
    screening = screening_of(load(alone(key)))
    present = [name for name in Screening.model_fields if getattr(screening, name) is not None]
    assert present == [key.table]


def test_rules_are_named_in_order_of_application(load: Callable[..., Study]) -> None:
    """With everything on, the rules are listed as they are applied."""
    assert screening_of(load(ALL_ON)).rules() == IN_ORDER


def test_order_in_the_file_does_not_matter(load: Callable[..., Study]) -> None:
    """However the file is arranged, rules have the order of the design."""
    tables = (
        "[screening.values]\noutlier_sd = 3\n[screening.participants]\nnotes = 'n.csv'\n"
        "[screening.trials]\nfewest_fixations = 3\nnotes = 'n.csv'\n"
        "[screening.fixations]\nover_ms = 800\nfirst = 1\n"
    )
    assert screening_of(load(SOUND + tables)).rules() == (
        "first",
        "over_ms",
        "notes",
        "fewest_fixations",
        "participant_notes",
        "outlier_sd",
    )


def test_false_switches_every_rule_off(load: Callable[..., Study]) -> None:
    """Any rule may be named and set to false; it then needs nothing else and counts as off."""
    assert screening_of(load(ALL_OFF)).rules() == ()


def test_rule_set_to_false_is_recorded_like_an_absent_one(load: Callable[..., Study]) -> None:
    """The study as understood does not tell a rule that is false from one that is absent."""
    empty = "[screening.fixations]\n[screening.trials]\n[screening.participants]\n"
    assert (
        load(ALL_OFF).understood()["screening"]
        == load(f"{SOUND}{empty}[screening.values]\n").understood()["screening"]
    )


@pytest.mark.parametrize(
    "tables",
    [
        pytest.param("[screening]\n", id="no table"),
        pytest.param("[screening.fixations]\n[screening.values]\n", id="empty tables"),
    ],
)
def test_empty_screening_has_no_rules(load: Callable[..., Study], tables: str) -> None:
    """Screening without a rule leaves nothing out."""
    assert screening_of(load(SOUND + tables)).rules() == ()


def test_absent_screening_is_none(load: Callable[..., Study]) -> None:
    """A study that screens nothing has no screening."""
    assert load(SOUND).screening is None


def test_merge_reads_like_the_file(load: Callable[..., Study]) -> None:
    """The distance that is given has its unit in its name; the others are absent."""
    fixations = screening_of(load(EXAMPLE)).fixations
    assert fixations is not None
    assert fixations.merge is not None
    assert fixations.merge.model_dump() == {
        "under_ms": 80.0,
        "within_px": 14.0,
        "within_deg": None,
        "within_characters": None,
    }


def test_screening_cannot_be_changed(load: Callable[..., Study]) -> None:
    """A limit stays what the file says."""
    fixations = screening_of(load(EXAMPLE)).fixations
    assert fixations is not None
    with pytest.raises(pydantic.ValidationError, match="frozen"):
        fixations.under_ms = 60  # type: ignore[misc]


@pytest.mark.parametrize("table", ["trials", "participants"])
@pytest.mark.parametrize(
    ("name", "recorded"),
    [
        pytest.param("notes/day1.csv", "notes/day1.csv", id="relative"),
        pytest.param("/somewhere/else/notes.csv", "…/notes.csv", id="elsewhere"),
    ],
)
def test_record_of_notes_says_nothing_about_the_machine(
    load: Callable[..., Study], table: str, name: str, recorded: str
) -> None:
    """The study as understood names no folder of this machine for the notes."""
    study = load(f'{SOUND}[screening.{table}]\nnotes = "{name}"\n')
    assert study.understood()["screening"][table]["notes"] == recorded
