"""Which regions the tables on variants have rows of."""

from __future__ import annotations

from pathlib import Path
from string import ascii_lowercase

import etl
from tests.vary.labelled import labelled_study
from tests.vary.otherwise import few_readers

VARIANTS = "[screening.fixations]\nunder_ms = [80, false]\n"


def test_one_region_keeps_its_name(tmp_path: Path) -> None:
    """Nothing is counted together where there is nothing to be counted with."""
    trials = [("R1", 1, "early", "a200 a60"), ("R1", 2, "late", "a200")]
    study, variants = labelled_study(tmp_path, trials, VARIANTS)
    study.with_name("regions.csv").write_text("label,region,order\na,start,1\n", encoding="utf-8")
    varied = etl.vary(etl.load_study(study), variants)
    assert {*varied.table("rates").region.dropna()} == {"start"}
    changes = varied.table("changes")
    assert {*changes.region} == {"start"}
    # Also measures that change nowhere.
    assert {*varied.table("rates").dropna(subset="region").measure} <= {*changes.measure}
    assert changes.cells_changed.min() == 0 < changes.cells_changed.max()


def test_many_regions_are_counted_together(tmp_path: Path) -> None:
    """From 21 on; cells and trials are told apart, since a trial has several that change."""
    trials = [("R1", 1, "early", "a200 d60 b200"), ("R2", 1, "late", "c200 b60 e200 a60 f200")]
    study, variants = labelled_study(tmp_path, trials, VARIANTS)
    labels = "".join(
        f"{label},{label * 2},{n}\n" for n, label in enumerate(ascii_lowercase[:21], 1)
    )
    study.with_name("regions.csv").write_text(f"label,region,order\n{labels}", encoding="utf-8")
    varied = etl.vary(etl.load_study(study), variants)
    assert {*varied.table("rates").region.dropna()} == {"(all regions)"}
    rates = varied.table("rates")
    assert {*rates[rates.region.notna() & rates.cue.isna()].rows} == {42}
    changed = varied.table("changed_cells")
    told = varied.table("changes_by_variant")
    for row in told.to_dict("records"):
        own = changed[(changed.measure == row["measure"]) & (row["variant"] == 2)]
        assert row["region"] == "(all regions)"
        assert row["cells_changed"] == len(own)
        assert row["trials_changed"] == len({*zip(own.participant, own.trial, strict=True)})
    assert (told.cells_changed > told.trials_changed).any()


def test_regions_that_nobody_read_have_no_rows(tmp_path: Path) -> None:
    """Some text has them, but none that was read."""
    study = few_readers("orchard", tmp_path, ["logs/P0[1-2]*"])
    texts = tmp_path / "region_definitions" / "orchard.csv"
    more = 'i99,early,fitting,"{unread: Nobody read} {verb: this.}"\n'
    texts.write_text(texts.read_text(encoding="utf-8") + more, encoding="utf-8", newline="\n")
    variants = study.with_name("variants.toml")
    variants.write_text(
        "[measures]\nno_opportunity = ['missing', 'zero']\n", encoding="utf-8", newline="\n"
    )
    varied = etl.vary(etl.load_study(study), variants)
    for name in ("rates", "comparisons", "changes", "changes_by_variant"):
        regions = {*varied.table(name).region.dropna()}
        assert "verb" in regions
        assert "unread" not in regions
