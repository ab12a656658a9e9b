"""What is refused in a variants file: the whole message, with its line."""

from __future__ import annotations

from pathlib import Path

import pytest

from etl.errors import StudyError
from etl.study import Study, load_variants
from tests.study.variants_written import STUDY, said_of, study_of, variants_of
from tests.study.written import SOUND

MAY_VARY = (
    "a key below [screening], regions.tolerance_px, measures.outside, measures.no_opportunity, "
    "lines.method, or a setting of a line method"
)
FIXATIONS = "[screening.fixations]\n"


@pytest.fixture
def study(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Study:
    """The study whose decisions vary."""
    monkeypatch.chdir(tmp_path)
    return study_of()


@pytest.mark.parametrize(
    ("written", "expected"),
    [
        pytest.param(
            "regions.kind = ['words', 'boxes']",
            f"variants.toml:1: regions.kind: this key may not vary; expected {MAY_VARY}\n"
            "    fix: remove it; it is the same in all variants",
            id="a key that may not vary",
        ),
        pytest.param(
            "lines.corrections = ['a.csv']",
            f"variants.toml:1: lines.corrections: this key may not vary; expected {MAY_VARY}\n"
            "    fix: remove it; it is the same in all variants",
            id="corrections of lines",
        ),
        pytest.param(
            "[trials]\nfewest_fixations = [3]",
            f"variants.toml:2: trials.fewest_fixations: unknown key; expected {MAY_VARY}\n"
            "    fix: it belongs in [screening.trials]",
            id="a key in a table that is another one's namesake",
        ),
        pytest.param(
            '[trials]\nfactors = ["cue"]\nfewest_fixations = [3]\nnotes = ["a.csv"]\n\nfile = "t"',
            f"variants.toml:2: trials.factors: this key may not vary; expected {MAY_VARY}\n"
            "    fix: remove it; it is the same in all variants\n"
            f"variants.toml:3: trials.fewest_fixations: unknown key; expected {MAY_VARY}\n"
            "    fix: it belongs in [screening.trials]\n"
            f"variants.toml:4: trials.notes: unknown key; expected {MAY_VARY}\n"
            "    fix: it belongs in [screening.trials] or [screening.participants]\n"
            f"variants.toml:6: trials.file: unknown key; expected {MAY_VARY}\n"
            "    fix: remove it",
            id="a table of the study repeated: each key at its line",
        ),
        pytest.param(
            '[[variants]]\nname = "a"\n[variants.output]\nfolder = "b"\nformats = ["csv"]',
            f"variants.toml:4: output.folder: this key may not vary; expected {MAY_VARY}\n"
            "    fix: remove it; it is the same in all variants\n"
            f"variants.toml:5: output.formats: this key may not vary; expected {MAY_VARY}\n"
            "    fix: remove it; it is the same in all variants",
            id="a table of the study in a named variant",
        ),
        pytest.param(
            "[output]\n",
            f"variants.toml:1: output: this key may not vary; expected {MAY_VARY}\n"
            "    fix: remove it; it is the same in all variants",
            id="a table of the study without keys",
        ),
        pytest.param(
            "[screening.fixations]\nunder_m = [60]",
            "variants.toml:2: screening.fixations.under_m: unknown key\n"
            '    fix: did you mean "under_ms"?',
            id="a key with a slip",
        ),
        pytest.param(
            "[screning.fixations]\nunder_ms = [60]",
            'variants.toml:1: screning: unknown key\n    fix: did you mean "screening"?',
            id="a table with a slip",
        ),
        pytest.param(
            "over_ms = [700]",
            "variants.toml:1: over_ms: unknown key; expected regions, lines, screening, measures, "
            "title, variants or comparisons\n    fix: it belongs in [screening.fixations]",
            id="a key without its table",
        ),
        pytest.param(
            "colours = [1]",
            "variants.toml:1: colours: unknown key; expected regions, lines, screening, measures, "
            "title, variants or comparisons\n    fix: remove it",
            id="a key of nothing",
        ),
        pytest.param(
            "screening.trials = 3",
            'variants.toml:1: screening.trials: this is no table; found "3", expected a table\n'
            "    fix: write its keys under [screening.trials]",
            id="a value in place of a table",
        ),
        pytest.param(
            "title = 3\nregions.tolerance_px = [9]",
            'variants.toml:1: title: this is no text; found "3", expected text in quotes\n'
            '    fix: write title = "3"',
            id="a title that is no text",
        ),
        pytest.param(
            'title = "nothing"',
            f"variants.toml: the file names nothing that varies; expected {MAY_VARY}\n"
            "    fix: write for example under_ms = [60, 80, 100] under [screening.fixations]",
            id="nothing that varies",
        ),
        pytest.param(
            "variants = []",
            f"variants.toml: the file names nothing that varies; expected {MAY_VARY}\n"
            "    fix: write for example under_ms = [60, 80, 100] under [screening.fixations]",
            id="no variants in the list of variants",
        ),
        pytest.param(
            'regions.tolerance_px = [9]\n[[variants]]\nname = "a"',
            "variants.toml:2: variants: the file has both lists of alternatives and named "
            "variants; expected one of the two\n"
            "    fix: keep the lists, or put every value into a variant",
            id="both ways in one file",
        ),
    ],
)
def test_keys_that_do_not_belong(study: Study, written: str, expected: str) -> None:
    """Only decisions may vary; help is given with names."""
    assert said_of(written, study) == expected


@pytest.mark.parametrize(
    ("written", "expected"),
    [
        pytest.param(
            "under_ms = 100",
            "under_ms: this is no list of alternatives; "
            'found "100", expected a list in square brackets\n'
            "    fix: write under_ms = [80, 100]",
            id="one value",
        ),
        pytest.param(
            "under_ms = 80.0",
            "under_ms: this is no list of alternatives; "
            'found "80.0", expected a list in square brackets\n'
            "    fix: write under_ms = [80, …]",
            id="the study's own value alone",
        ),
        pytest.param(
            'first = "off"',
            'first: this is no list of alternatives; found "off", expected a list in square '
            "brackets\n    fix: write first = [false, …]",
            id="the word off alone",
        ),
        pytest.param(
            "merge = { under_ms = 90, within_px = 14 }",
            "merge: this is no list of alternatives; "
            'found "{ under_ms = 90, within_px = 14 }", expected a list in square brackets\n'
            "    fix: write merge = [{ under_ms = 80, within_px = 14 }, "
            "{ under_ms = 90, within_px = 14 }]",
            id="one table",
        ),
        pytest.param(
            "under_ms = []",
            "under_ms: this list is empty; expected the alternatives, with commas between them\n"
            "    fix: write for example under_ms = [80, …], or remove the key",
            id="an empty list",
        ),
        pytest.param(
            "under_ms = [80.0]",
            'under_ms: this is the study\'s own value: nothing to vary; found "80", expected '
            "another value beside it\n    fix: add a value, or remove the key",
            id="nothing to vary",
        ),
        pytest.param(
            "under_ms = [60, 70, 60]",
            'under_ms: this alternative is named twice; found "60"\n    fix: keep one of the two',
            id="a value twice",
        ),
        pytest.param(
            "under_ms = [60, 60.0]",
            "under_ms: this alternative is the same as 60, which is named already; "
            'found "60.0"\n    fix: keep one of the two',
            id="a value in two ways",
        ),
        pytest.param(
            "merge = [{ under_ms = 9, within_px = 1 }, { within_px = 1.0, under_ms = 9 }]",
            "merge: this alternative is the same as { under_ms = 9, within_px = 1 }, which is "
            'named already; found "{ within_px = 1.0, under_ms = 9 }"\n'
            "    fix: keep one of the two",
            id="a table in another order",
        ),
        pytest.param(
            'under_ms = ["off", 60]',
            'under_ms: the text "off" switches no rule off; expected false where the rule is off\n'
            "    fix: write false",
            id="the word off",
        ),
        pytest.param(
            'under_ms = ["60"]',
            'under_ms: this is text; found "60", expected a number\n    fix: write 60',
            id="a number in quotes",
        ),
        pytest.param(
            "first = [0]",
            'first: out of bounds; found "0", expected a number of 1 or more\n'
            "    fix: write for example 1",
            id="out of bounds",
        ),
        pytest.param(
            "under_ms = [900]",
            "under_ms: 900 does not go with screening.fixations.over_ms of the study: no duration "
            'lies between under_ms and over_ms; found "800", expected a number above 900\n'
            "    fix: correct one of the two limits",
            id="a limit beyond the study's other limit",
        ),
        pytest.param(
            'blink = ["drop"]',
            "blink: nothing says which fixations a blink touches; expected logs.columns.blink\n"
            '    fix: add blink = "…" to [logs.columns] with the header of the column, or remove '
            "this rule",
            id="a rule without what it needs",
        ),
        pytest.param(
            'blink = ["dorp"]',
            'blink: this is not one of the choices; found "dorp", expected "drop" (no other in '
            'this version)\n    fix: did you mean "drop"?',
            id="no choice",
        ),
        pytest.param(
            'merge = [{ under_ms = "60", within_px = 3 }]',
            'merge.under_ms: this is text; found "60", expected a number\n'
            "    fix: write under_ms = 60",
            id="a number in quotes within a table",
        ),
        pytest.param(
            "merge = [{ under_ms = 80, within_pix = 3 }]",
            'merge.within_pix: unknown key\n    fix: did you mean "within_px"?',
            id="a slip within a table",
        ),
    ],
)
def test_alternatives_of_a_rule(study: Study, written: str, expected: str) -> None:
    """Each is tried alone, in the words of the study file."""
    assert said_of(FIXATIONS + written, study) == (
        f"variants.toml:2: screening.fixations.{expected}"
    )


@pytest.mark.parametrize(
    ("written", "expected"),
    [
        pytest.param(
            "screening.trials.duration_ms = [500, 30000]",
            "screening.trials.duration_ms: this is one value, not a list of alternatives; found "
            '"[500, 30000]", expected a value that is itself a list in square brackets of its own'
            "\n    fix: write duration_ms = [false, [500, 30000]]",
            id="a range without brackets of its own",
        ),
        pytest.param(
            'screening.trials.no_first_pass_on = ["verb", "noun"]',
            "screening.trials.no_first_pass_on: this is one value, not a list of alternatives; "
            'found "["verb", "noun"]", expected a value that is itself a list in square brackets '
            'of its own\n    fix: write no_first_pass_on = [["verb", "noun"], …]',
            id="the study's own names without brackets of their own",
        ),
        pytest.param(
            "screening.trials.duration_ms = [false, [30000, 500]]",
            "screening.trials.duration_ms: no duration lies between the two limits; found "
            '"[30000, 500]", expected two numbers, the lower first\n    fix: write [500, 30000]',
            id="a range the wrong way round",
        ),
        pytest.param(
            'measures.outside = ["off"]',
            'measures.outside: this is not one of the choices; found "off", expected "ignore" or '
            '"interrupt"\n    fix: take one of these',
            id="no choice of a key that is never off",
        ),
        pytest.param(
            "screening.fixations.merge.within_deg = [1]",
            "screening.fixations.merge.within_deg: how near the other fixation must be is said "
            'more than once; found "within_px, within_deg", expected one of within_px, within_deg '
            "and within_characters\n    fix: keep one of them\n"
            "variants.toml:1: screening.fixations.merge.within_deg: a distance in degrees needs "
            "the size and the distance of the screen; expected [screen]\n"
            "    fix: add [screen] with width_px, height_px, width_cm and distance_cm, or give "
            "within_px in place of within_deg",
            id="a second distance",
        ),
    ],
)
def test_alternatives_of_other_keys(study: Study, written: str, expected: str) -> None:
    """Values that are lists, choices and keys of a table are refused in their own ways."""
    assert said_of(written, study) == f"variants.toml:1: {expected}"


def test_value_may_contradict_another_key_of_the_study(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The message names the other key, since that stands in another file."""
    monkeypatch.chdir(tmp_path)
    text = f"{STUDY}line_confidence_under = 0.9\n"
    assert said_of('lines.method = ["consensus", "warp"]', study_of(text)) == (
        'variants.toml:1: lines.method: "warp" does not go with '
        'screening.trials.line_confidence_under of the study: lines.method = "warp" does not tell '
        'how sure the lines are; expected method = "consensus"\n'
        '    fix: write method = "consensus" in [lines], or remove this rule'
    )


def test_keys_of_merge_need_a_study_that_merges(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Where nothing is merged, merge varies as a whole."""
    monkeypatch.chdir(tmp_path)
    assert said_of("[screening.fixations.merge]\nunder_ms = [60, 80]", study_of(SOUND)) == (
        "variants.toml:2: screening.fixations.merge.under_ms: the study merges no fixations, so "
        "this key has no value in it; expected alternatives of merge as a whole\n"
        "    fix: write for example merge = [false, { under_ms = 80, within_px = 14 }] under "
        "[screening.fixations]"
    )


def test_each_alternative_is_told_at_its_own_line(study: Study) -> None:
    """Lists may run over lines; all that is wrong is told in one run, in the order of the file."""
    told = said_of(
        """\
[screening.fixations]
under_ms = [
  60,
  "a",   # no number
  -1,
]
[screening.trials]
duration_ms = [
  [500,
   "b"],
]
[measures]
outside = [
  "interupt",
]
""",
        study,
    )
    assert [line.split(": ")[:2] for line in told.split("\n") if line[0] != " "] == [
        ["variants.toml:4", "screening.fixations.under_ms"],
        ["variants.toml:5", "screening.fixations.under_ms"],
        ["variants.toml:10", "screening.trials.duration_ms, entry 2"],
        ["variants.toml:14", "measures.outside"],
    ]


def test_contradiction_of_a_combination_is_told_once(study: Study) -> None:
    """Values that are sound alone and not together are named, with how many variants have both."""
    written = (
        FIXATIONS + "under_ms = [80, 400]\nover_ms = [800, 300]\n[regions]\ntolerance_px = [0, 20]"
    )
    assert said_of(written, study) == (
        "variants.toml:3: screening.fixations.over_ms: no duration lies between under_ms and "
        "over_ms, in 2 of 8 variants: those with under_ms = 400 and over_ms = 300\n"
        "    fix: leave one of them out, or name variants one by one with [[variants]]"
    )


def test_contradicting_pairs_are_told_together(study: Study) -> None:
    """Of pairs that contradict one another in one way the first few are named."""
    written = FIXATIONS + "under_ms = [400, 500, 600]\nover_ms = [200, 300]\n"
    assert said_of(written, study) == (
        "variants.toml:3: screening.fixations.over_ms: no duration lies between under_ms and "
        "over_ms, in 6 of 12 variants: those with under_ms = 400 and over_ms = 200, or with "
        "under_ms = 400 and over_ms = 300, or with under_ms = 500 and over_ms = 200, or with "
        "under_ms = 500 and over_ms = 300, or with under_ms = 600 and over_ms = 200, or with "
        "others\n"
        "    fix: leave one of them out, or name variants one by one with [[variants]]"
    )


def test_only_those_concerned_are_named(study: Study) -> None:
    """A rule may read many keys; only the alternatives that make the contradiction are named."""
    written = (
        "[lines]\nmethod = ['consensus', 'slice']\n"
        "chain.x_px = [192, 150]\nslice.x_px = [192, 150]\nchain.y_px = [32, 40]\n"
    )
    assert said_of(written, study) == (
        'variants.toml:5: lines.chain: this means nothing with method = "slice", in 6 of 16 '
        'variants: those with method = "slice" and chain.y_px = 40, or with method = "slice" and '
        "chain.x_px = 150\n"
        "    fix: leave one of them out, or name variants one by one with [[variants]]"
    )


def test_more_variants_than_can_be_computed(study: Study) -> None:
    """Their number is told before anything is tried, own values included."""
    hundred = ", ".join(str(number) for number in range(101, 201))
    written = f"{FIXATIONS}under_ms = [{hundred}]\nover_ms = [{hundred}, 80, 'no number']\n"
    assert said_of(written, study) == (
        "variants.toml:3: these are 10,403 variants, more than can be computed; expected at most "
        "10,000\n    fix: vary fewer keys, or with fewer values"
    )


def test_more_named_variants_than_can_be_computed(study: Study) -> None:
    """The study counts as one of them."""
    written = "".join(
        f'[[variants]]\nname = "{number}"\nregions.tolerance_px = {number}\n'
        for number in range(1, 10_001)
    )
    assert said_of(written, study) == (
        "variants.toml:1: these are 10,001 variants, more than can be computed; expected at most "
        "10,000\n    fix: name fewer variants"
    )


NAMED = '[[variants]]\nname = "a"\n'


@pytest.mark.parametrize(
    ("written", "expected"),
    [
        pytest.param(
            "[[variants]]\nregions.tolerance_px = 20",
            "variants.toml:1: variants.name, entry 1: this variant has no name\n"
            '    fix: add name = "…"',
            id="no name",
        ),
        pytest.param(
            "[[variants]]\nname = 3\nregions.tolerance_px = 20",
            'variants.toml:2: variants.name, entry 1: this is no text; found "3", expected text in '
            'quotes\n    fix: write name = "3"',
            id="a name that is no text",
        ),
        pytest.param(
            '[[variants]]\nname = " "\nregions.tolerance_px = 20',
            "variants.toml:2: variants.name, entry 1: this is empty; expected some text\n"
            "    fix: name the variant",
            id="an empty name",
        ),
        pytest.param(
            '[[variants]]\nname = "the study"\nregions.tolerance_px = 20',
            "variants.toml:2: variants.name, entry 1: the study as it stands has this name; found "
            '"the study", expected another name\n    fix: rename it',
            id="the name of the study",
        ),
        pytest.param(
            f"{NAMED}regions.tolerance_px = 20\n{NAMED}regions.tolerance_px = 30",
            'variants.toml:5: variants.name, entry 2: two variants have this name; found "a", '
            "expected a name for each variant\n    fix: rename one of the two",
            id="a name twice",
        ),
        pytest.param(
            f'{NAMED}regions.tolerance_px = 20\n[[variants]]\nname = "b"\n'
            "regions.tolerance_px = 20.0\nscreening.fixations.under_ms = 80",
            'variants.toml:4: variants, entry 2: this variant has the same settings as "a"; '
            "expected settings of its own\n    fix: keep one of the two",
            id="the same settings twice",
        ),
        pytest.param(
            NAMED,
            "variants.toml:1: variants, entry 1: this variant sets nothing: it is the study "
            "itself; expected at least one value that the study does not have\n"
            "    fix: set what it does otherwise, or remove it",
            id="no settings",
        ),
        pytest.param(
            f"{NAMED}screening.fixations.under_ms = 80.0\nscreening.trials.notes = false",
            "variants.toml:1: variants, entry 1: this variant sets only what the study has "
            "already: it is the study itself; expected at least one value that the study does not "
            "have\n    fix: set what it does otherwise, or remove it",
            id="the study's own settings",
        ),
        pytest.param(
            f"{NAMED}screening.fixations.under_ms = [60, 100]",
            "variants.toml:3: screening.fixations.under_ms: this is a list; found "
            '"[60, 100]", expected a number\n    fix: write for example under_ms = 80',
            id="a list in a named variant",
        ),
        pytest.param(
            f'{NAMED}screening.fixations.under_ms = "Off"',
            'variants.toml:3: screening.fixations.under_ms: the text "Off" switches no rule off; '
            "expected false where the rule is off\n    fix: write false",
            id="the word off in a named variant",
        ),
        pytest.param(
            f"{NAMED}screening.fixations.under_ms = 900",
            "variants.toml:1: variants, entry 1: this variant does not go with "
            "screening.fixations.over_ms of the study: no duration lies between under_ms and "
            'over_ms; found "800", expected a number above 900\n'
            "    fix: correct one of the two limits",
            id="a contradiction with the study",
        ),
        pytest.param(
            f"{NAMED}screening.fixations.under_ms = 900\nscreening.fixations.over_ms = 850",
            "variants.toml:4: screening.fixations.over_ms: no duration lies between under_ms and "
            'over_ms; found "850", expected a number above 900\n'
            "    fix: correct one of the two limits",
            id="a contradiction within a variant",
        ),
        pytest.param(
            f"{NAMED}screening.fixations.merge = {{ under_ms = 60 }}",
            "variants.toml:3: screening.fixations.merge: nothing says how near the other fixation "
            "must be; expected one of within_px, within_deg and within_characters\n"
            "    fix: add for example within_px = 14",
            id="merge is set as a whole",
        ),
        pytest.param(
            f"{NAMED}regions.tolerance = 20",
            "variants.toml:3: regions.tolerance: unknown key\n"
            '    fix: did you mean "tolerance_px"?',
            id="a slip",
        ),
        pytest.param(
            f"{NAMED}nme = 20",
            "variants.toml:3: nme: unknown key; expected regions, lines, screening or measures\n"
            "    fix: remove it",
            id="an unknown key",
        ),
        pytest.param(
            '[variants]\nname = "a"',
            "variants.toml:1: variants: these are no variants; expected a table for each variant\n"
            "    fix: write [[variants]] on a line of its own before each variant",
            id="single brackets",
        ),
    ],
)
def test_named_variants(study: Study, written: str, expected: str) -> None:
    """Each needs a name and settings of its own, and must be a sound study."""
    assert said_of(written, study) == expected


VARIED = "regions.tolerance_px = [0, 20]\n[[comparisons]]\n"
OUTCOME = 'outcome = "skipped"\nregion = "verb"\n'


@pytest.mark.parametrize(
    ("written", "expected"),
    [
        pytest.param(
            'region = "verb"\nfactor = "cue"',
            "2: comparisons.outcome, entry 1: this key is missing; expected the 0/1 outcome that "
            'is compared\n    fix: add for example outcome = "any_regression"',
            id="no outcome",
        ),
        pytest.param(
            'outcome = "skiped"\nregion = "verb"\nfactor = "cue"',
            '3: comparisons.outcome, entry 1: there is no such outcome; found "skiped", expected '
            'the name of a 0/1 outcome\n    fix: did you mean "skipped"?',
            id="an outcome with a slip",
        ),
        pytest.param(
            'outcome = "zzz"\nfactor = "cue"',
            '3: comparisons.outcome, entry 1: there is no such outcome; found "zzz", expected the '
            "name of a 0/1 outcome\n"
            "    fix: take a name from the list that `trialwright measures` prints",
            id="an outcome like no other",
        ),
        pytest.param(
            'outcome = "first_pass_duration"\nregion = "verb"\nfactor = "cue"',
            "3: comparisons.outcome, entry 1: the study computes no 0/1 outcome of this name; "
            'found "first_pass_duration", expected a 0/1 outcome among the measures.outcomes of '
            "the study\n    fix: name another, or add it to measures.outcomes if it is one of "
            "zeros and ones",
            id="an outcome that is no 0 or 1",
        ),
        pytest.param(
            'outcome = ["skipped"]\nregion = "verb"\nfactor = "cue"',
            '3: comparisons.outcome, entry 1: this is no text; found "["skipped"]", expected text '
            'in quotes\n    fix: write outcome = "…"',
            id="an outcome that is no text",
        ),
        pytest.param(
            'outcome = "skipped"\nfactor = "cue"',
            "2: comparisons.region, entry 1: this key is missing; expected the region in which "
            'skipped is compared\n    fix: add region = "…" with the name of a region',
            id="no region",
        ),
        pytest.param(
            'outcome = "any_regression"\nregion = "verb"\nfactor = "cue"',
            "4: comparisons.region, entry 1: any_regression is an outcome of whole trials; found "
            '"verb", expected no region\n    fix: remove region',
            id="a region of whole trials",
        ),
        pytest.param(
            'outcome = "skipped"\nregion = ""\nfactor = "cue"',
            "4: comparisons.region, entry 1: this is empty; expected some text\n"
            "    fix: write a name, or remove the key",
            id="an empty region",
        ),
        pytest.param(
            OUTCOME,
            '2: comparisons.factor, entry 1: this key is missing; expected "cue", "fit" or '
            '"group"\n    fix: add for example factor = "cue"',
            id="no factor",
        ),
        pytest.param(
            OUTCOME + 'factor = "grup"',
            '5: comparisons.factor, entry 1: this is no factor of the study; found "grup", '
            'expected "cue", "fit" or "group"\n    fix: did you mean "group"?',
            id="no factor of the study",
        ),
        pytest.param(
            OUTCOME + 'factor = "fit"',
            "2: comparisons.level, entry 1: this key is missing, and the factor has more than two "
            'levels; expected "odd" or "neither"\n    fix: add for example level = "odd"',
            id="no level of three",
        ),
        pytest.param(
            OUTCOME + 'factor = "fit"\nlevel = "fitting"',
            "6: comparisons.level, entry 1: this is the reference level, with which the others "
            'are compared; found "fitting", expected "odd" or "neither"\n'
            "    fix: take one of the others",
            id="the reference level",
        ),
        pytest.param(
            OUTCOME + 'factor = "cue"\nlevel = "early"',
            "6: comparisons.level, entry 1: this is the reference level, with which the others "
            'are compared; found "early", expected "late"\n    fix: write level = "late"',
            id="the reference level of two",
        ),
        pytest.param(
            OUTCOME + 'factor = "fit"\nlevel = "ood"',
            '6: comparisons.level, entry 1: this is no level of the factor; found "ood", expected '
            '"odd" or "neither"\n    fix: did you mean "odd"?',
            id="no level",
        ),
        pytest.param(
            OUTCOME + 'factor = "cue"\nlevl = "late"',
            '6: comparisons.levl, entry 1: unknown key\n    fix: did you mean "level"?',
            id="a key with a slip",
        ),
        pytest.param(
            OUTCOME + 'factor = "cue"\ncolour = "late"',
            "6: comparisons.colour, entry 1: unknown key; expected outcome, region, factor or "
            "level\n    fix: remove it",
            id="an unknown key",
        ),
        pytest.param(
            f'{OUTCOME}factor = "cue"\n[[comparisons]]\n{OUTCOME}factor = "cue"\nlevel = "late"',
            "6: comparisons, entry 2: this comparison is named in line 2 already\n"
            "    fix: keep one of the two",
            id="the same comparison twice",
        ),
    ],
)
def test_comparisons(study: Study, written: str, expected: str) -> None:
    """A comparison names what the study has."""
    assert said_of(VARIED + written, study) == f"variants.toml:{expected}"


def test_comparisons_stand_in_double_brackets(study: Study) -> None:
    """One table is no list of comparisons."""
    written = VARIED.replace("[[comparisons]]", "[comparisons]") + OUTCOME
    assert said_of(written, study) == (
        "variants.toml:2: comparisons: these are no comparisons; expected a table for each "
        "comparison\n    fix: write [[comparisons]] on a line of its own before each comparison"
    )


def test_comparison_in_a_study_without_factors(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """There is nothing to compare; both keys are refused."""
    monkeypatch.chdir(tmp_path)
    assert said_of(f'{VARIED}{OUTCOME}factor = "cue"\nlevel = "late"', study_of(SOUND)) == (
        "variants.toml:5: comparisons.factor, entry 1: the study has no factors; the rate itself "
        "is looked at; expected no factor and no level\n"
        "    fix: remove factor, or name the factors in [trials] of the study\n"
        "variants.toml:6: comparisons.level, entry 1: the study has no factors; the rate itself "
        "is looked at; expected no factor and no level\n"
        "    fix: remove level, or name the factors in [trials] of the study"
    )


def test_factor_of_one_level(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A factor that has its reference level only compares nothing."""
    monkeypatch.chdir(tmp_path)
    text = STUDY.replace('cue = ["early", "late"]', 'cue = ["early"]')
    assert said_of(f'{VARIED}{OUTCOME}factor = "cue"', study_of(text)) == (
        "variants.toml:5: comparisons.factor, entry 1: the study states one level of this factor, "
        'so nothing can be compared; found "cue", expected a factor of two levels or more\n'
        "    fix: name another factor"
    )


@pytest.mark.parametrize(
    ("written", "expected"),
    [
        pytest.param(
            b"[screening.fixations]\nunder_ms = [off, 80]\n",
            "variants.toml:2: column 13: this is no value; expected TOML\n"
            "    fix: off is no word of TOML: write false where a rule is off",
            id="the bare word off",
        ),
        pytest.param(
            b"[screening.fixations]\r\nunder_ms = [60, 80\r\n",
            "variants.toml:2: end of file: a list has no closing bracket; expected TOML\n"
            "    fix: close the list with ], commas between",
            id="a list without its end",
        ),
        pytest.param(
            b"[screening.fixations]\nunder_ms\n",
            "variants.toml:2: column 9: a key has no value; expected TOML\n"
            "    fix: write key = value, one on a line",
            id="a key without a value",
        ),
        pytest.param(
            b"= 3\n",
            "variants.toml:1: column 1: this is no line of a variants file; expected TOML\n"
            "    fix: write key = value, or [table]",
            id="no line",
        ),
        pytest.param(
            b"title = '\xff'\n",
            'variants.toml:1: this is no UTF-8 text; found "byte FF", expected UTF-8 text\n'
            "    fix: save the file as UTF-8 in your editor",
            id="no text",
        ),
    ],
)
def test_damaged_file(study: Study, written: bytes, expected: str) -> None:
    """What TOML does not take is told as of a study file, in words about this file."""
    assert said_of(written, study) == expected


def test_folder_is_no_variants_file(study: Study, tmp_path: Path) -> None:
    """A folder is refused as such."""
    with pytest.raises(StudyError) as caught:
        load_variants(tmp_path, study, region_outcomes=(), trial_outcomes=(), known_outcomes=())
    assert str(caught.value) == (
        f"{tmp_path}: this is a folder; expected a variants file\n"
        "    fix: name the variants file in it, for example variants.toml\n"
        "1 problem; nothing was written"
    )


def test_study_file_is_no_variants_file(study: Study) -> None:
    """The two files in the wrong order: one finding, and nothing of the keys in them."""
    assert said_of(STUDY, study) == (
        f"variants.toml:{STUDY.split('[logs]')[0].count(chr(10)) + 1}: logs: this is a study file; "
        "expected a variants file, which says nothing of logs\n"
        "    fix: name the study file first, then the variants file"
    )


@pytest.mark.parametrize(
    ("written", "line", "key"),
    [
        ('title = "v"\n[[variants]]\nname = "a"\nmeasures.outside = "ignore"', 2, "variants"),
        ('[measures]\noutside = ["ignore"]\n[[comparisons]]\noutcome = "x"', 3, "comparisons"),
        (
            (
                '[screening.trials]\nno_first_pass_on = ["x"]\n[screening.fixations]\n'
                "over_ms = 800\nunder_ms = [false, 80]"
            ),
            5,
            "screening.fixations.under_ms",
        ),
    ],
)
def test_variants_file_is_no_study_file(
    written: str, line: int, key: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Told as soon as it is loaded, in place of all keys that a study lacks."""
    monkeypatch.chdir(tmp_path)
    with pytest.raises(StudyError) as caught:
        study_of(written)
    assert str(caught.value) == (
        f"study.toml:{line}: {key}: this is a variants file; expected a study file\n"
        "    fix: name the study file first, then the variants file\n"
        "1 problem; nothing was written"
    )


def test_study_file_that_lacks_its_logs_is_taken_for_one(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A list of texts is the value of a rule; what is missing is told."""
    monkeypatch.chdir(tmp_path)
    with pytest.raises(StudyError) as caught:
        study_of('[screening.trials]\nno_first_pass_on = ["verb", "noun"]\n')
    assert "logs: this table is missing" in str(caught.value)
    assert "variants" not in str(caught.value)


def test_all_is_told_at_once(study: Study) -> None:
    """Slips in keys, values and comparisons are told in one run, by line."""
    told = said_of(
        'colour = 1\n[screening.fixations]\nunder_ms = [60, "x"]\nfirst = 1\n'
        '[[comparisons]]\noutcome = "skiped"\n',
        study,
    )
    lines = [line.split(":")[1] for line in told.split("\n") if line[0] != " "]
    assert lines == ["1", "3", "4", "5", "6"]


def test_nothing_is_refused_twice(study: Study) -> None:
    """The file without its slips is sound."""
    assert len(variants_of(f"{FIXATIONS}under_ms = [60, 80]\nfirst = [1]\n", study).studies) == 4
