"""The small orchard study as gaze samples, in which the very fixations are to be found again."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from tests.simulator.dialects.recorded import Fixated, ReadTrial, RecordedStudy, in_unit
from tests.simulator.dialects.study_files import StudyFile
from tests.simulator.dialects.tables import put_documents, zipped
from tests.simulator.samples import samples_of
from tests.simulator.writing import put


@dataclass(frozen=True, slots=True)
class SampleDialect:
    """How samples are written: with which interval, separator and unit of time."""

    interval_ms: int = 1
    delimiter: str = "\t"
    unit: str = "ms"
    missing: str = "."
    compressed: bool = False
    study: Callable[[str], StudyFile] = StudyFile


SAMPLE_DIALECTS: dict[str, SampleDialect] = {
    "samples": SampleDialect(),
    "samples, gzipped, seconds, semicolons": SampleDialect(
        delimiter=";", unit="s", missing="NA", compressed=True
    ),
}


def on_grid(study: RecordedStudy, interval_ms: int) -> RecordedStudy:
    """The study with all times on whole sampling intervals, so that few samples can carry it.

    Parameters
    ----------
    study : RecordedStudy
        As recorded.
    interval_ms : int
        The interval.

    Returns
    -------
    RecordedStudy
        Fixations begin and end at whole intervals, one interval apart at least.
    """

    def down(time: int) -> int:
        return time - time % interval_ms

    def moved(trial: ReadTrial) -> ReadTrial:
        fixations = tuple(
            replace(f, onset_ms=down(f.onset_ms), duration_ms=down(f.duration_ms))
            for f in trial.fixations
        )
        return replace(trial, fixations=fixations)

    return replace(study, trials=tuple(moved(trial) for trial in study.trials))


def samples_of_trial(
    fixations: Sequence[Fixated], interval_ms: int
) -> list[tuple[int, float | None, float | None]]:
    """The samples of a trial: time, x and y; fixations without a position leave none."""
    placed = [f for f in fixations if f.x_px is not None]
    made = samples_of(
        [(f.onset_ms, f.duration_ms, f.x_px or 0.0, f.y_px or 0.0) for f in placed],
        1000.0 / interval_ms,
    )
    known = (made.fixation >= 0) | (made.x_px == made.x_px)
    return [
        (round(t), x if ok else None, y if ok else None)
        for t, x, y, ok in zip(
            made.t_ms.tolist(), made.x_px.tolist(), made.y_px.tolist(), known.tolist(), strict=True
        )
    ]


def write_samples(study: RecordedStudy, folder: Path, dialect: SampleDialect) -> Path:
    """Write a study whose logs are gaze samples, a row each.

    Parameters
    ----------
    study : RecordedStudy
        What was recorded, on whole sampling intervals.
    folder : Path
        Made where it is missing.
    dialect : SampleDialect
        How.

    Returns
    -------
    Path
        The study file.
    """
    ending = ".tsv.gz" if dialect.compressed else ".tsv"
    for reader in study.readers:
        rows = [["reader", "trial_no", "sentence", "t", "gx", "gy", "lids"]]
        for trial in study.of(reader.participant):
            for time, x, y in samples_of_trial(trial.fixations, dialect.interval_ms):
                closed = any(onset <= time < end for onset, end in trial.blinks)
                places = [dialect.missing if p is None else f"{p:.3f}" for p in (x, y)]
                rows.append(
                    [
                        *(trial.participant, str(trial.trial), trial.item),
                        *(in_unit(time, dialect.unit), *places, str(int(closed))),
                    ]
                )
        content = "".join(dialect.delimiter.join(row) + "\n" for row in rows).encode("utf-8")
        name = folder / f"logs/{reader.participant}{ending}"
        put(name, zipped(content) if dialect.compressed else content)
    put_documents(study, folder, unit=dialect.unit)
    path = folder / "study.toml"
    put(path, dialect.study(logs_table(dialect)).text().encode("utf-8"))
    return path


def logs_table(dialect: SampleDialect) -> str:
    """The tables ``[logs]`` and below of a study file."""
    ending = ".tsv.gz" if dialect.compressed else ".tsv"
    return f"""\
[logs]
files = ["logs/*{ending}"]

[logs.columns]
participant = "reader"
trial = "trial_no"
item = "sentence"
onset = {{ column = "t", unit = "{dialect.unit}" }}
x = {{ column = "gx", unit = "px" }}
y = {{ column = "gy", unit = "px" }}
blink = "lids"

[logs.samples]
method = "engbert_kliegl"
shortest_fixation_ms = 30
"""
