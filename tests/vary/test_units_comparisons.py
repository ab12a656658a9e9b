"""Comparisons that a variants file names, and those that are chosen where it names none."""

from __future__ import annotations

from pathlib import Path
from types import SimpleNamespace
from typing import Any

import pytest
from click.testing import CliRunner

from etl.cli import main
from etl.errors import DataError
from etl.session.variant_comparisons import leading_ones, named_comparisons
from etl.study.variant_comparisons import NamedComparison
from etl.variants.facts import Comparison
from tests.readiness.making import design_of
from tests.variants.making import crossed, summary_of
from tests.vary.otherwise import few_readers

FACTORS = {"cue": ["early", "late"], "frame": ["plain", "odd", "rare"], "task": ["reading"]}


#: How far below the first line of a comparison each key of it stands.
BELOW = {"region": 20, "factor": 30, "level": 40}


def line_of(table: str, number: int, key: str) -> int:
    """The line of a key of a comparison, the first of which stands in line 7."""
    assert table == "comparisons"
    return 7 + number + BELOW[key]


def named(
    *wanted: tuple[str, str, str], regions: tuple[str, ...] = ("verb", "noun"), read: str = "verb"
) -> list[tuple[str, str, str, str]]:
    """What is found for region, factor and level, of a study some of whose regions were read."""
    own = tuple(
        NamedComparison("went_back", region, factor, level, line)
        for line, (region, factor, level) in enumerate(wanted, start=7)
    )
    chosen: Any = SimpleNamespace(shown="variants.toml", comparisons=own, line_of=line_of)
    return named_comparisons(chosen, design_of({}, FACTORS, regions), read.split())


def told(*wanted: tuple[str, str, str], **more: Any) -> str:
    """What is said of those that are wrong."""
    with pytest.raises(DataError) as found:
        named(*wanted, **more)
    return str(found.value)


def test_level_may_be_left_out_where_there_are_two() -> None:
    """Then it is the second; where there are more it must be named."""
    assert named(("verb", "cue", ""), ("verb", "cue", "late"), ("", "frame", "rare")) == [
        ("went_back", "verb", "cue", "late"),
        ("went_back", "verb", "cue", "late"),
        ("went_back", "", "frame", "rare"),
    ]
    assert named(("verb", "", "")) == [("went_back", "verb", "", "")]
    assert (
        "variants.toml:47: comparisons.level: frame has 3 levels: say which one is compared; "
        "expected one of odd, rare\n    fix: correct level"
    ) in told(("verb", "frame", ""))


def test_all_that_is_wrong_is_told_at_once() -> None:
    """Regions and levels of no such name, the reference level, a factor of one level."""
    text = told(
        ("vreb", "cue", "late"),
        ("verb", "frame", "plain"),
        ("verb", "task", ""),
        ("x", "cue", "lat"),
    )
    for line in (
        "variants.toml:27: comparisons.region: no text has a region of this name",
        'found "vreb", expected one of verb, noun',
        'did you mean "verb"?',
        "variants.toml:48: comparisons.level: frame has no level of this name that could be",
        'found "plain", expected one of odd, rare',
        "variants.toml:39: comparisons.factor: task has one level only, so there is nothing to",
        "variants.toml:30: comparisons.region: no text has a region of this name",
        "variants.toml:50: comparisons.level: cue has no level of this name that could be compared",
        'found "lat", expected one of late',
        'did you mean "late"?',
    ):
        assert line in text
    assert "5 problems" in text


def test_region_that_nobody_read_is_told() -> None:
    """The texts have it, but no trial does."""
    text = told(("noun", "cue", "late"))
    assert "variants.toml:27: comparisons.region: no trial has read a text with this region" in text
    assert 'found "noun"' in text
    assert named(("noun", "cue", "late"), read="noun verb")


def test_regions_that_are_counted_together_cannot_be_named() -> None:
    """From 21 on; outcomes of trials can."""
    many = tuple(f"word {n}" for n in range(21))
    text = told(("word 1", "cue", "late"), regions=many)
    assert "variants.toml:27: comparisons.region: with more than 20 regions all are count" in text
    assert 'found "word 1"' in text
    assert named(("", "cue", "late"), regions=many) == [("went_back", "", "cue", "late")]
    few = tuple(f"w{n}" for n in range(20))
    assert named(("w1", "cue", "late"), regions=few, read="w1")


def test_long_lists_of_names_are_cut() -> None:
    """Twelve are listed."""
    names = tuple(f"w{n:02d}" for n in range(13))
    assert f"expected one of {', '.join(names[:12])} …" in told(("x", "cue", ""), regions=names)
    assert f"expected one of {', '.join(names[:12])}\n" in told(
        ("x", "cue", ""), regions=names[:12]
    )


def test_named_comparisons_lead_in_their_order() -> None:
    """Found by outcome, region, factor and level; others do not lead, however much they turn."""
    tables = [(50, 50, 40, 60), (50, 50, 10, 90)]
    every = [
        Comparison(outcome, region, "frame", level, "plain")
        for outcome in ("went_back", "passed_over")
        for region in ("verb", "noun")
        for level in ("odd", "rare")
    ]
    summaries = [summary_of(tables, crossed([2]), own) for own in every]
    wanted = [("passed_over", "noun", "frame", "odd"), ("went_back", "verb", "frame", "rare")]
    assert leading_ones(wanted, summaries, 0) == (6, 1)
    # Without a name four are chosen, by the rule that users are told.
    assert leading_ones([], summaries, 0) == (0, 1, 2, 3)
    wide = summary_of([(50, 50, 49, 51), (5, 5, 4, 6)], crossed([2]))
    narrow = summary_of([(5, 5, 4, 6), (50, 50, 49, 51)], crossed([2]))
    assert leading_ones([], [narrow, wide], 0) == (1, 0)
    assert leading_ones([], [narrow, wide], 1) == (0, 1)


def test_command_tells_of_a_region_that_nobody_read(tmp_path: Path) -> None:
    """Before the work begins, with the line of the variants file; nothing is written."""
    study = few_readers("orchard", tmp_path, ["logs/P0[1-2]*"])
    texts = tmp_path / "region_definitions" / "orchard.csv"
    more = 'i99,early,fitting,"{unread: Nobody read} {verb: this.}"\n'
    texts.write_text(texts.read_text(encoding="utf-8") + more, encoding="utf-8", newline="\n")
    variants = study.with_name("variants.toml")
    variants.write_text(
        "[measures]\nno_opportunity = ['missing', 'zero']\n[[comparisons]]\n"
        'outcome = "first_pass_skip"\nregion = "unread"\nfactor = "fit"\n',
        encoding="utf-8",
        newline="\n",
    )
    result = CliRunner().invoke(main, ["vary", str(study), str(variants)], catch_exceptions=False)
    assert result.exit_code == 2
    # The line of the region, not that of its comparison.
    assert "variants.toml:5: comparisons.region: " in result.output
    assert "no trial has read a text with this region" in result.output
    assert not study.with_name("variants").exists()
