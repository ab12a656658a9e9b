"""Notes that only some variants look at, each with the file that it names."""

from __future__ import annotations

from pathlib import Path

import etl
from tests.vary.labelled import BY_HAND, labelled_study

VARIANTS = """\
[screening.trials]
notes = [false, "some.csv", "more.csv"]
[screening.fixations]
under_ms = [80, false]
"""


def test_each_variant_looks_at_its_own_notes(tmp_path: Path) -> None:
    """None in the study; one trial by the one file, two by the other, of which one is short."""
    study, variants = labelled_study(tmp_path, BY_HAND, VARIANTS)
    for name, rows in (("some", "R1,1"), ("more", "R1,2 R2,4")):
        text = "participant,trial,reason\n" + "".join(f"{row},sneezed\n" for row in rows.split())
        study.with_name(f"{name}.csv").write_text(text, encoding="utf-8", newline="\n")
    varied = etl.vary(etl.load_study(study), variants)
    told = varied.table("variants")
    accounts = varied.table("variant_accounts")
    found = {(own["notes"], own["under_ms"]): own["trials_kept"] for own in told.to_dict("records")}
    assert found == {
        (notes, under): 8 - lost
        for notes, lost in (("false", 0), ('"some.csv"', 1), ('"more.csv"', 2))
        for under in ("80", "false")
    }
    lost = dict(zip(told.variant, told.notes, strict=True))
    for row in accounts.to_dict("records"):
        # Fixations of R1's first trial; of R1's second, without the short one where that is gone.
        trials = {"false": 0, '"some.csv"': 1, '"more.csv"': 2}[lost[row["variant"]]]
        fixations = {0: 0, 1: 3, 2: 6 - row["under_ms"] // 2}[trials]
        assert row["notes"] == (trials if row["unit"] == "trials" else fixations)
    # Without the rule on short fixations a trial of each reader changes: R1's second, R2's third.
    assert told.trials_changed.tolist() == [
        len(trials)
        for notes, under in zip(told.notes, told.under_ms, strict=True)
        for trials in [
            {
                *{"false": (), '"some.csv"': ("R1 1",), '"more.csv"': ("R1 2", "R2 4")}[notes],
                *(("R1 2", "R2 3") if under == "false" else ()),
            }
        ]
    ]
    by_variant = varied.table("changes_by_variant").groupby("variant").cells_changed.sum()
    assert told.cells_changed.tolist() == by_variant.tolist()
    cells = varied.table("changed_cells")
    gone = cells[cells.variants_left_out > 0]
    assert {*zip(gone.participant, gone.trial, strict=True)} == {("R1", 1), ("R1", 2), ("R2", 4)}
    # Of six variants two leave out each of these trials.
    assert {*gone.variants_left_out} == {2}
    # Traces are drawn with the notes of their own variant.
    told_of = {}
    for path in (varied.folder / "traces").iterdir():
        text = path.read_text(encoding="utf-8")
        named = next((name for name in ("some.csv", "more.csv") if f'"{name}"' in text), "")
        assert f"This trial is left out by notes = {named} (found sneezed)" in text or not named
        told_of[named] = "sneezed" in text
    assert told_of == {"": False, "some.csv": True, "more.csv": True}
