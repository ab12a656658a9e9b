"""The job of ``trialwright vary``: the same study under other decisions, side by side."""

from __future__ import annotations

import os
import time
from contextlib import nullcontext
from dataclasses import replace
from pathlib import Path

from etl.errors import DataError, Findings
from etl.export.earlier import record_of
from etl.export.publish import published
from etl.export.run_record import RunRecord
from etl.measures import MEASURES, SELECTABLE, TRIAL_MEASURES, select
from etl.session.crew import PUBLISHED, Progress, Room, silent
from etl.session.examining import LogsRead, own_faults, read_study
from etl.session.inputs_read import inputs_read
from etl.session.kept_places import kept_folder
from etl.session.log_tellings import log_counts
from etl.session.pseudonym_key import known_by, open_key, refuse_key_inside, save_key
from etl.session.variant_run import VariantRun
from etl.session.varied import Varied
from etl.study import Study, StudyVariants, load_variants


def vary(
    study: Study,
    variants: str | os.PathLike[str],
    *,
    into: str | os.PathLike[str] | None = None,
    workers: int | None = 1,
    progress: Progress = silent,
) -> Varied:
    """Compute the binary outcomes of a study under other decisions.

    Parameters
    ----------
    study : Study
        From :func:`etl.load_study`.
    variants : path
        The variants file: alternatives for settings of the study file.
    into : path, optional
        The output folder; beside the variants file, with its name without the ending, where
        absent. What an earlier run wrote there is replaced as a whole.
    workers : int or None
        Number of processes; None finds one out. The output is the same bytes with any number. With
        more than one, the calling script must guard its work by ``if __name__ == "__main__":``.
    progress : callable, optional
        Called with a stage's name, how much of it is done, and how much there is.

    Returns
    -------
    Varied
        Where tables and page are, and what they say.

    Raises
    ------
    StudyError
        If the variants file is wrong: all problems at once, each with its line.
    DataError
        If anything is wrong with an input, or the output folder may not be replaced.

    References
    ----------
    Steegen, Tuerlinckx, Gelman & Vanpaemel (2016). Increasing transparency through a multiverse
    analysis. Perspectives on Psychological Science, 11, 702-712. doi:10.1177/1745691616658637
    """
    started = time.perf_counter()
    chosen = _loaded(variants, study)
    path = Path(variants)
    target = Path(into) if into is not None else path.with_name(path.stem)
    try:
        refuse_key_inside(study, target)
        _refuse_build(target)
        return _varied(study, chosen, target, workers, progress, started)
    except DataError as wrong:
        raise DataError(_for_variants(wrong.findings)) from wrong


def _varied(
    study: Study,
    chosen: StudyVariants,
    target: Path,
    workers: int | None,
    progress: Progress,
    started: float,
) -> Varied:
    """Work on all variants and publish what they say."""
    findings = Findings()
    built = study.folder / study.output.folder
    with (
        published(target, str(target)) as shop,
        own_faults(),
        nullcontext(open_key(study, findings, target=target)) as held,
        Room(shop.kept, workers, progress, kept_folder(built, held)) as room,
    ):
        read = read_study(study, room, findings, held, turns=len(chosen.crossing))
        if read is None or findings.failed:
            raise DataError(findings)
        _hold_kept(room, read)
        run = VariantRun(chosen, read, findings, shop.fresh, progress)
        varied = run.done(target)
        told = run.recorded(("warning", "note"))
        own = {"file": run.shown, "role": "variants file", "sha256": chosen.sha256}
        RunRecord(
            read.plan.understood(),
            inputs_read(read.plan, run.notes(), read.told, [own]),
            {**log_counts(read.told), "variants": len(chosen.crossing)},
            varied.rows,
            told,
            [],
            time.perf_counter() - started,
            "" if held is None else known_by(held.pseudonyms.key),
        ).write(shop.fresh)
        progress("publishing", 1, 1)
        shop.settle()
        if held is not None:
            save_key(held)
    progress(PUBLISHED, 1, 1)
    return varied


def _refuse_build(target: Path) -> None:
    """Refuse to put variants in the place of a build of a study."""
    record = record_of(target)
    if record is None or "variants" in record.get("counts", {}):
        return
    findings = Findings()
    findings.error(
        "the output folder holds a build of a study",
        path=str(target),
        expected="a new or empty folder, or one with variants",
        fix="name another folder by --into",
    )
    raise DataError(findings)


def _for_variants(findings: Findings) -> Findings:
    """What is said of a build, said of variants: they have no key in the study file."""
    said = Findings(names=findings.names)
    for one in findings:
        fix = one.fix
        for words, others in (
            ("by [output] folder or --into", "by --into"),
            ("and build again", "and try again"),
        ):
            fix = fix.replace(words, others)
        said.items.append(replace(one, fix=fix))
    said.more = findings.more
    return said


def _hold_kept(room: Room, read: LogsRead) -> None:
    """Keep what a build of the study has kept from going while it is used."""
    names = [name for answer in read.answers for name, _ in answer.entries()]
    try:
        room.store.hold(names)
    except OSError as gone:
        findings = Findings()
        findings.error(
            "what the study's build has kept is being removed by another build",
            path=room.store.earlier.name,
            fix="wait until the build of the study is done, and try again",
        )
        raise DataError(findings) from gone


def _loaded(variants: str | os.PathLike[str], study: Study) -> StudyVariants:
    """The variants file, read with the outcomes that there are."""
    chosen = select(study.measures.outcomes)
    return load_variants(
        Path(variants),
        study,
        region_outcomes=[name for name in chosen if MEASURES[name].kind == "binary"],
        trial_outcomes=[m.name for m in TRIAL_MEASURES.values() if m.kind == "binary"],
        known_outcomes=SELECTABLE,
    )
