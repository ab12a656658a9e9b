"""The orchard study is counterbalanced, and its texts and mess are what the study file says."""

from __future__ import annotations

import tomllib
from collections import Counter
from pathlib import Path

import pytest

from tests.simulator import SimulatedStudy, SimulatedTrial
from tests.simulator.__main__ import PROJECT
from tests.simulator.orchard import CONDITIONS, NOTES
from tests.simulator.orchard_texts import SENTENCES
from tests.simulator.passages import PASSAGES, lines_of


def targets(study: SimulatedStudy) -> list[SimulatedTrial]:
    """The trials that belong to the study itself."""
    return [trial for trial in study.trials if trial.plan.facts["role"] == "target"]


def condition(trial: SimulatedTrial) -> tuple[str, str]:
    """The cell of a trial."""
    return trial.plan.facts["cue"], trial.plan.facts["fit"]


def test_each_item_comes_equally_often_in_each_condition(orchard: SimulatedStudy) -> None:
    """Of 24 readers, 6 see an item in each of the four versions."""
    seen = Counter((trial.plan.item, condition(trial)) for trial in targets(orchard))
    assert set(seen.values()) == {6}
    assert len(seen) == 32 * 4


def test_each_reader_sees_each_item_once(orchard: SimulatedStudy) -> None:
    """No reader meets a sentence twice, and none is left out."""
    seen = Counter((trial.plan.participant, trial.plan.item) for trial in targets(orchard))
    assert set(seen.values()) == {1}
    assert len(seen) == 24 * 32


def test_each_reader_has_as_many_trials_in_each_condition(orchard: SimulatedStudy) -> None:
    """Every reader reads 8 sentences in each of the four cells."""
    seen = Counter((trial.plan.participant, condition(trial)) for trial in targets(orchard))
    assert set(seen.values()) == {8}


def test_groups_are_balanced_over_lists(orchard: SimulatedStudy) -> None:
    """Three volunteers and three visitors read each list."""
    group = {reader.plan.participant: reader.plan.facts["group"] for reader in orchard.readers}
    list_of = {trial.plan.participant: trial.plan.facts["list"] for trial in orchard.trials}
    assert set(Counter((group[who], list_of[who]) for who in group).values()) == {3}


def test_practice_comes_first(orchard: SimulatedStudy) -> None:
    """The first four trials of every reader, and no others, are practice."""
    numbers = {
        trial.plan.trial for trial in orchard.trials if trial.plan.facts["block"] == "practice"
    }
    others = {
        trial.plan.trial for trial in orchard.trials if trial.plan.facts["block"] != "practice"
    }
    assert numbers == {1, 2, 3, 4}
    assert min(others) == 5


def test_versions_differ_in_topic_and_cue_only() -> None:
    """The verb and what follows are the same words whether the topic fits or not."""
    for sentence in SENTENCES:
        for cue in ("early", "late"):
            fitting, odd = sentence.marked(cue, "fitting"), sentence.marked(cue, "odd")
            assert fitting != odd
            assert fitting[fitting.index("{auxiliary") :] == odd[odd.index("{auxiliary") :]


def test_sentences_are_all_different() -> None:
    """No verb and no topic is used twice."""
    assert len({sentence.verb for sentence in SENTENCES}) == 32
    topics = [topic for sentence in SENTENCES for topic in (sentence.fitting, sentence.odd)]
    assert len(set(topics)) == 64


def test_every_sentence_has_five_or_six_regions(orchard: SimulatedStudy) -> None:
    """The verb is followed by the spill-over region in every version."""
    for trial in targets(orchard):
        regions = orchard.spec.layouts[trial.plan.text].regions
        assert len(regions) in (5, 6)
        assert regions[regions.index("verb") + 1] == "spillover"


@pytest.mark.parametrize("name", ["orchard", "passages"])
def test_texts_fit_the_screen(name: str, request: pytest.FixtureRequest) -> None:
    """No line ends past 1600 px of 1920, and no text below 1000 px of 1080."""
    study: SimulatedStudy = request.getfixturevalue(name)
    for layout in study.spec.layouts.values():
        assert max(word.right_px for word in layout.words) <= 1600
        assert layout.line_centre_px(layout.lines) + layout.grid.line_height_px / 2 <= 1000


def test_passages_have_eight_to_ten_lines_of_60_to_80_characters() -> None:
    """The lines are full, the last ones too."""
    for passage in PASSAGES.values():
        lines = lines_of(passage).splitlines()
        assert 8 <= len(lines) <= 10
        assert all(60 <= len(line) <= 80 for line in lines)


def test_readers_undersweep_at_times(passages: SimulatedStudy) -> None:
    """Some returns to a new line fall short of its first word and are corrected backwards."""
    corrected = 0
    for trial in passages.trials:
        for fixation, after in zip(trial.fixations, trial.fixations[1:], strict=False):
            before = trial.fixations[max(0, fixation.fixation - 2)]
            swept = None not in (before.line, fixation.line) and before.line < fixation.line
            corrected += swept and after.regressive and after.line == fixation.line
    assert corrected > 10


def test_hesitant_reader_answers_fewer_questions_right(orchard: SimulatedStudy) -> None:
    """P19 has the lowest share of right answers, and still answers most."""
    right: dict[str, list[bool]] = {}
    for trial in orchard.trials:
        right.setdefault(trial.plan.participant, []).append(trial.answer_ok)
    shares = {who: sum(answers) / len(answers) for who, answers in right.items()}
    assert min(shares, key=shares.__getitem__) == "P19"
    assert 0.6 < shares["P19"] < 0.8


def test_sample_holds_every_kind_of_mess(orchard: SimulatedStudy) -> None:
    """Blinks, glances off the screen, fixations before and after the text, one wild trial."""
    found = Counter(f.mess for trial in orchard.trials for f in trial.fixations)
    assert set(found) == {"", "off_screen", "before_text", "after_text", "scattered"}
    assert sum(f.blink for trial in orchard.trials for f in trial.fixations) > 100
    disturbed = [(t.plan.participant, t.plan.trial) for t in orchard.trials if t.disturbed]
    assert disturbed == [("P15", 30)]


def test_only_one_trial_was_not_recorded(orchard: SimulatedStudy) -> None:
    """The trial list has one trial more than the logs."""
    missing = [(t.plan.participant, t.plan.trial) for t in orchard.trials if not t.recorded]
    assert missing == [("P11", 23)]


def test_notes_speak_of_trials_of_the_study(orchard: SimulatedStudy) -> None:
    """The experimenter's notes name target trials, not practice or fillers."""
    roles = {orchard.trial(who, number).plan.facts["role"] for who, number, _ in NOTES}
    assert roles == {"target"}


@pytest.mark.parametrize("name", ["orchard", "passages"])
def test_study_file_is_toml_and_lays_texts_out_as_simulated(
    name: str, request: pytest.FixtureRequest
) -> None:
    """The grid in the study file is the grid on which the readers read."""
    study: SimulatedStudy = request.getfixturevalue(name)
    path: Path = PROJECT / "sample_logs" / name / "study.toml"
    said = tomllib.loads(path.read_text(encoding="utf-8"))["regions"]
    grid = next(iter(study.spec.layouts.values())).grid
    for key in ("left_px", "top_px", "character_width_px", "line_height_px"):
        assert said["layout"][key] == getattr(grid, key)
    assert (path.parent / said["file"]).is_file()


def test_all_conditions_are_defined(orchard: SimulatedStudy) -> None:
    """The region file has one row for every item and version that anybody read."""
    text = (PROJECT / "region_definitions" / "orchard.csv").read_text(encoding="utf-8")
    rows = [tuple(line.split(",", 3)[:3]) for line in text.splitlines()[1:]]
    items = sorted({trial.plan.item for trial in targets(orchard)})
    assert rows == [(item, cue, fit) for item in items for cue, fit in CONDITIONS]
