"""Several mistakes in one run, and one mistake many times over."""

from tests.bad_input.small_study import SmallStudy, log


def test_all_files_are_reported_in_order(study: SmallStudy) -> None:
    """One run lists what is wrong with the regions, then with each log, by line."""
    study.change("regions.csv", "pear,verb,2,100", "pear,verb,2,90")
    study.change("logs/P01.tsv", "1000000\t200\t50", "1000000\t200\tfifty")
    study.change("logs/P01.tsv", "1000250\t200", "1000250\ttwo")
    study.change("logs/P02.tsv", "P02\t1\tpear\t1000000", "\t1\tpear\t1000000")
    study.change("logs/P02.tsv", "1000250\t200", "1000250\t0")
    assert study.refusal() == (
        'regions.csv:3: column "left": two regions of a text overlap; found "verb", expected no '
        'area in common with "who" in line 2 (item pear)\n'
        "    fix: correct the places, or say in the study file which region wins: overlap = "
        '"first" or "nearest" in [regions]\n'
        'logs/P01.tsv:2: column "x": this is no number; found "fifty", expected a number in px\n'
        "    fix: correct the cell, or add the word to [logs] missing if it stands for no value\n"
        'logs/P01.tsv:3: column "dur_ms": this is no number; found "two", expected a number in '
        "ms\n"
        "    fix: correct the cell, or add the word to [logs] missing if it stands for no value\n"
        'logs/P02.tsv:2: column "reader": the participant is missing; found "", expected the '
        "participant this fixation belongs to\n"
        "    fix: fill in the cell, remove the row, or leave such rows out by [logs.where]\n"
        'logs/P02.tsv:3: column "dur_ms": the duration is not above 0; found "0", expected a '
        "duration above 0\n"
        "    fix: correct the cell, remove the row, or leave such rows out by [logs.where]\n"
        "5 problems; nothing was written\n"
    )


def test_tables_and_regions_are_reported_together(study: SmallStudy) -> None:
    """A wrong table does not hide what is wrong with the regions."""
    study.add_tables()
    study.add("trial_list.csv", "P01,2,early\n")
    study.change("regions.csv", "pear,verb,2,100", "pear,verb,2,90")
    said = study.refusal()
    assert "trial_list.csv:6: two rows have the same participant and trial" in said
    assert "regions.csv:3:" in said
    assert said.endswith("\n2 problems; nothing was written\n")


def test_one_mistake_in_every_row_is_cut_short(study: SmallStudy) -> None:
    """A column of words where numbers belong is told by five lines and a count."""
    study.write("logs/P01.tsv", log("P01", fixations=1000).replace("\t200\t", "\tlong\t"))
    said = study.refusal().splitlines()
    assert [line.split(":")[1] for line in said if line.startswith("logs/")] == list("23456")
    assert said[-2:] == [
        "    … and 1,995 more like this in logs/P01.tsv",
        "2000 problems; nothing was written",
    ]


def test_overlaps_everywhere_are_cut_short(study: SmallStudy) -> None:
    """Two eyes read as one overlap in every row; that is told once, not a thousand times."""
    study.write("logs/P01.tsv", log("P01", fixations=1000).replace("\t200\t", "\t300\t"))
    said = study.refusal().splitlines()
    assert len([line for line in said if line.startswith("logs/")]) == 5
    assert said[-1] == "1998 problems; nothing was written"


def test_trials_recorded_twice_are_cut_short(study: SmallStudy) -> None:
    """A whole session that was recorded twice is told by five trials and a count."""
    once = log("P01", trials=range(1, 21))
    study.write("logs/P01.tsv", once + once.split("\n", 1)[1])
    said = study.refusal().splitlines()
    assert len([line for line in said if line.startswith("logs/")]) == 5
    assert said[-1] == "20 problems; nothing was written"


def test_equal_names_all_over_the_header_are_cut_short(study: SmallStudy) -> None:
    """A header of equal names is told by five of them and a count."""
    names = "\tx" * 20
    study.write("logs/P01.tsv", log("P01").replace("\n", names + "\n", 1))
    said = study.refusal().splitlines()
    assert len([line for line in said if line.startswith("logs/")]) == 5
    assert said[-1] == "20 problems; nothing was written"
