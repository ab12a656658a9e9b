"""The dialects of tables, by a name for each."""

from __future__ import annotations

from functools import partial

from tests.simulator.dialects.study_files import StudyFile
from tests.simulator.dialects.tables import COLUMNS, FACTS, WORD, Column, TableDialect

#: What all other dialects are compared with: UTF-8, tabs, a log a reader.
PLAIN = TableDialect()

WORDY = (*COLUMNS, WORD)
NUMBERED = (*COLUMNS[:3], Column("n", "number"), *COLUMNS[3:])
UNTIMED = tuple(column for column in NUMBERED if column.fact != "onset")
ENDS = tuple(
    Column("stop", "end", "ms") if column.fact == "duration" else column for column in COLUMNS
)
LABELLED = (
    *(column for column in COLUMNS if column.fact not in ("x", "y")),
    Column("area", "label"),
)
EYED = (*COLUMNS, Column("eye", "eye"))
SESSIONS = (Column("visit", "session"), *COLUMNS)
BINOCULAR = (
    *COLUMNS[:3],
    *(
        Column(f"{header}_{eye.lower()}", f"{fact}:{eye}", unit)
        for eye in "LR"
        for header, fact, unit in (
            ("start", "onset", "ms"),
            ("dur", "duration", "ms"),
            ("gx", "x", "px"),
            ("gy", "y", "px"),
        )
    ),
    COLUMNS[-1],
)
BANNER = ("# orchard notes, reading room", "# times in ms; places in px")
BARE_BANNER = ("Orchard notes, reading room", "recorded in May", "")


def in_units(time: str, *, headers: bool = False) -> tuple[Column, ...]:
    """The usual columns with times in a unit, which the headers name if asked for."""
    named = {
        "onset": f"start [{time}]",
        "duration": f"dur [{time}]",
        "x": "gx [px]",
        "y": "gy [px]",
    }
    return tuple(
        Column(
            named.get(column.fact, column.header) if headers else column.header,
            column.fact,
            time if column.unit == "ms" else column.unit,
        )
        for column in COLUMNS
    )


def in_degrees() -> tuple[Column, ...]:
    """The usual columns with places in degrees of visual angle."""
    return tuple(
        Column(column.header, column.fact, "deg" if column.unit == "px" else column.unit)
        for column in COLUMNS
    )


NO_TABLES = partial(StudyFile, trials="", tables={})
WORKBOOKS = partial(
    StudyFile, trials='table = "trial_list.xlsx"\n', tables={"participants": "participants.xlsx"}
)
BY_SESSION = partial(
    StudyFile, trials='table = "trial_list.csv"\nkeys = ["participant", "session", "trial"]\n'
)

TABLE_DIALECTS: dict[str, TableDialect] = {
    "plain": PLAIN,
    # Encodings, with letters that differ between them in the column of items.
    "utf-8 with mark": TableDialect(mark=True),
    "utf-16 little-endian with mark": TableDialect(encoding="utf-16-le", mark=True),
    "utf-16 big-endian with mark": TableDialect(encoding="utf-16-be", mark=True),
    "utf-16 little-endian": TableDialect(encoding="utf-16-le"),
    "utf-16 big-endian": TableDialect(encoding="utf-16-be"),
    "utf-16 stated": TableDialect(encoding="utf-16-le", state_encoding=True),
    "utf-32 with mark": TableDialect(encoding="utf-32-le", mark=True),
    "windows-1252": TableDialect(encoding="cp1252"),
    "windows-1252 stated": TableDialect(encoding="cp1252", state_encoding=True),
    "latin-1 stated": TableDialect(encoding="latin-1", state_encoding=True),
    "utf-8 gzipped": TableDialect(compressed=True),
    "utf-16 gzipped": TableDialect(encoding="utf-16-le", mark=True, compressed=True),
    # Line ends.
    "carriage return and line feed": TableDialect(newline="\r\n"),
    "carriage return": TableDialect(newline="\r"),
    "utf-16, carriage return and line feed": TableDialect(
        encoding="utf-16-le", mark=True, newline="\r\n"
    ),
    # Separators.
    "commas": TableDialect(delimiter=",", ending=".csv"),
    "semicolons": TableDialect(delimiter=";", ending=".csv"),
    "bars": TableDialect(delimiter="|", ending=".txt"),
    "single blanks": TableDialect(delimiter=" ", ending=".txt"),
    "aligned by blanks": TableDialect(delimiter=" ", aligned=True, ending=".txt"),
    "aligned, decimal commas": TableDialect(
        columns=in_units("s"), delimiter=" ", aligned=True, decimal=",", ending=".txt"
    ),
    "semicolons, decimal commas": TableDialect(delimiter=";", decimal=",", ending=".csv"),
    "tabs, decimal commas, seconds": TableDialect(columns=in_units("s"), decimal=","),
    # Quoted cells.
    "quoted": TableDialect(columns=WORDY, delimiter=",", quoting="all", ending=".csv"),
    "quoted with tabs": TableDialect(columns=WORDY, quoting="all"),
    "quoted, decimal commas": TableDialect(
        columns=WORDY, delimiter=";", decimal=",", quoting="all", ending=".csv"
    ),
    "a quote mark not doubled": TableDialect(
        columns=WORDY, delimiter=",", quoting="undoubled", ending=".csv"
    ),
    "a quote mark not doubled, tabs": TableDialect(columns=WORDY, quoting="undoubled"),
    "a quote mark not doubled, utf-16": TableDialect(
        columns=WORDY, quoting="undoubled", encoding="utf-16-le", mark=True, newline="\r\n"
    ),
    # What stands around the rows.
    "remarks above": TableDialect(banner=BANNER),
    "remarks among rows": TableDialect(remarks=7),
    "banner": TableDialect(banner=BARE_BANNER),
    "banner, commas": TableDialect(banner=BARE_BANNER, delimiter=",", ending=".csv"),
    "repeated headers": TableDialect(repeat_header=40),
    "repeated headers, quoted": TableDialect(
        columns=WORDY, delimiter=",", quoting="all", repeat_header=40, ending=".csv"
    ),
    "everything at once": TableDialect(
        columns=WORDY,
        delimiter=";",
        decimal=",",
        encoding="utf-16-le",
        mark=True,
        newline="\r\n",
        quoting="undoubled",
        banner=BANNER,
        remarks=11,
        repeat_header=40,
        missing="-",
        ending=".csv",
        compressed=True,
    ),
    "units in headers": TableDialect(columns=in_units("ms", headers=True)),
    "three thousand columns too many": TableDialect(unneeded=3000),
    # Missing values.
    "NA for missing": TableDialect(missing="NA"),
    "- for missing": TableDialect(missing="-"),
    "empty for missing": TableDialect(missing=""),
    # Units and axes.
    "seconds": TableDialect(columns=in_units("s")),
    "microseconds": TableDialect(columns=in_units("us")),
    "end in place of duration": TableDialect(columns=ENDS),
    "degrees": TableDialect(columns=in_degrees(), screen={"origin": '"centre"'}),
    "degrees, y upwards": TableDialect(
        columns=in_degrees(), screen={"origin": '"centre"', "y_axis": '"up"'}
    ),
    "origin in the centre": TableDialect(screen={"origin": '"centre"'}),
    "origin in the centre, y upwards": TableDialect(
        screen={"origin": '"centre"', "y_axis": '"up"'}
    ),
    "origin at the bottom, y upwards": TableDialect(
        screen={"origin": '"bottom-left"', "y_axis": '"up"'}
    ),
    # Files.
    "a log a trial": TableDialect(layout="trial"),
    "a log a trial, named so": TableDialect(
        columns=COLUMNS[2:], layout="trial", name_says=r"(?P<participant>P\d+)_(?P<trial>\d+)"
    ),
    "one log": TableDialect(layout="one"),
    "trials that straddle logs": TableDialect(layout="straddling"),
    "numbered trials that straddle logs": TableDialect(columns=NUMBERED, layout="straddling"),
    "a trial begun again": TableDialect(
        columns=NUMBERED,
        layout="restarted",
        study=partial(StudyFile, trials='table = "trial_list.csv"\nrepeated = "last"\n'),
    ),
    "two sessions": TableDialect(columns=SESSIONS, layout="sessions", study=BY_SESSION),
    "facts in workbooks": TableDialect(workbooks=True, study=WORKBOOKS),
    # Eyes.
    "a row an eye": TableDialect(columns=EYED, eyes="rows"),
    "a row an eye, by the table": TableDialect(columns=EYED, eyes="rows", eye_from_table=True),
    "both eyes in a row": TableDialect(columns=BINOCULAR, eyes="columns"),
    "both eyes in a row, by the table": TableDialect(
        columns=BINOCULAR, eyes="columns", eye_from_table=True
    ),
    # Where facts come from.
    "facts in the log": TableDialect(columns=(*COLUMNS, *FACTS), study=NO_TABLES),
    # Order and places by other means.
    "numbers in place of onsets": TableDialect(
        columns=UNTIMED, study=partial(StudyFile, text_times=False)
    ),
    "areas": TableDialect(columns=LABELLED, study=partial(StudyFile, labels=True)),
}
