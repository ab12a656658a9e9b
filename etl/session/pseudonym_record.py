"""What a study with pseudonyms tells in its output: no reader, log or file by its own name.

Most of it holds pseudonyms from the start, since ids are replaced where they enter. What is left
are texts that people wrote: names of files, free text, the study file itself.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from etl.errors import Finding, Findings, Kind
from etl.pseudonyms import Pseudonyms
from etl.screening import Limits
from etl.session.pseudonym_key import key_path
from etl.session.pseudonym_study import FILE_KEYS
from etl.trials import FactTable
from etl.trials.facts import shown_path

if TYPE_CHECKING:
    from etl.report import NotRecorded
    from etl.session.plan import Plan
    from etl.study import Study


def reader_columns(study: Study) -> tuple[str, ...]:
    """What a study calls the readers by: our name for their column, and that of the logs.

    Parameters
    ----------
    study : Study
        As loaded.

    Returns
    -------
    tuple of str
    """
    column = study.logs.columns.participant
    return ("participant", *(() if column is None else (column.column,)))


def under_pseudonyms(plan: Plan) -> Plan:
    """A plan whose tables have names that tell nothing, when all readers of the logs are known.

    Parameters
    ----------
    plan : Plan
        A study made ready for its logs.

    Returns
    -------
    Plan
        The same where the study asks for no pseudonyms. Names of files with an id in them are
        replaced; lines that were set by hand, and texts that are of one reader each, are matched
        by pseudonym.
    """
    pseudonyms = plan.pseudonyms
    if pseudonyms is None:
        return plan
    book, made, library = plan.facts, plan.corrections, plan.library

    def renamed(table: FactTable | None) -> FactTable | None:
        return table and replace(table, shown=pseudonyms.shown_file(table.shown))

    book = replace(
        book,
        trial_list=renamed(book.trial_list),
        participants=renamed(book.participants),
        items=renamed(book.items),
    )
    if made is not None:
        readers = pseudonyms.readers_of(made.ids["participant"], either=True)
        shown = pseudonyms.shown_file(made.shown)
        made = replace(made, shown=shown, ids={**made.ids, "participant": readers})
    if "participant" in library.keys:
        at = library.keys.index("participant")

        def by_pseudonym(values: tuple[str, ...]) -> tuple[str, ...]:
            return (*values[:at], pseudonyms.of_reader(values[at]), *values[at + 1 :])

        texts = tuple(
            replace(
                text,
                keys={**text.keys, "participant": pseudonyms.of_reader(text.keys["participant"])},
            )
            for text in library.texts
        )
        text_of = {by_pseudonym(values): text for values, text in library.text_of.items()}
        library = replace(library, texts=texts, text_of=text_of)
    return replace(
        plan,
        facts=book,
        corrections=made,
        library=library,
        limits=hidden_limits(plan.limits, plan.study, pseudonyms),
    )


def hidden_limits(limits: Limits, study: Study, pseudonyms: Pseudonyms | None) -> Limits:
    """Limits as the ledger may show them: files of notes have names that may be told.

    Parameters
    ----------
    limits : Limits
        Those of the study.
    study : Study
        As loaded.
    pseudonyms : Pseudonyms or None
        Those of the study.

    Returns
    -------
    Limits
    """
    if pseudonyms is None:
        return limits
    notes = set(_files_of(study))
    shown = {
        rule: pseudonyms.shown_file(limit) if limit in notes else limit
        for rule, limit in limits.shown.items()
    }
    return replace(limits, shown=shown)


def told_study(study: Study, pseudonyms: Pseudonyms | None) -> Study:
    """A study as traced trials tell of it: the table of lines set by hand has a name that may be.

    Parameters
    ----------
    study : Study
        As loaded.
    pseudonyms : Pseudonyms or None
        Those of the study.

    Returns
    -------
    Study
    """
    lines = study.lines
    if pseudonyms is None or lines is None or lines.corrections is None:
        return study
    shown = pseudonyms.shown_file(lines.corrections)
    return study.model_copy(update={"lines": lines.model_copy(update={"corrections": shown})})


def for_record(findings: Findings, plan: Plan) -> Findings:
    """Findings as they may stand in the output.

    Parameters
    ----------
    findings : Findings
        All that was found.
    plan : Plan
        The study.

    Returns
    -------
    Findings
        Where the study was when it was built is nobody's affair who gets the tables; with
        pseudonyms, it tells of no reader, log or file by name, of no line of a table that lists
        readers, and in an order that has nothing to do with that of the ids.
    """
    noticed = findings.with_path(plan.study.shown, plan.study.path.name)
    if plan.pseudonyms is None:
        return noticed
    hiding = _Hiding(plan, plan.pseudonyms)
    place: dict[tuple[str, str, str], int] = {}
    for one in noticed:
        place.setdefault((one.severity, one.where, one.problem), len(place))
    items = [(place[one.severity, one.where, one.problem], hiding.of(one)) for one in noticed]
    items.sort(key=lambda pair: (pair[0], pair[1].path, pair[1].line or 0, pair[1].found or ""))
    record = Findings([one for _, one in items])
    for (severity, path, where, problem), count in noticed.more.items():
        record.more[hiding.of_kind((severity, path, where, problem))] += count
    return record


class _Hiding:
    """Takes from single findings what would tell of whom they are."""

    def __init__(self, plan: Plan, pseudonyms: Pseudonyms) -> None:
        study = plan.study
        self._pseudonyms = pseudonyms
        own, key = study.path.name, key_path(study).name
        files = [*_files_of(study), own, key]
        files += [shown_path(study, name) for name in files]
        names = {name: pseudonyms.shown_file(name) for name in files}
        names[study.shown] = names[own]
        # A longer name may hold a shorter one.
        self._names = sorted(names.items(), key=lambda pair: -len(pair[0]))
        self._of_readers = {f'column "{header}"' for header in reader_columns(study)}
        self._listing = {pseudonyms.shown_file(name) for name in _tables_of_readers(plan)}

    def of(self, one: Finding) -> Finding:
        """A finding as it may stand in the output."""
        path, hidden = self._named(one.path), self._pseudonyms.hidden
        cell = one.where in self._of_readers
        return replace(
            one,
            problem=self._sentence(one.problem),
            path=path,
            line=None if path in self._listing else one.line,
            where=self._sentence(one.where),
            # A cell of the readers' column is an id, as it stands in the file.
            found=None if one.found is None or cell else hidden(self._named(one.found)),
            expected="" if cell else hidden(self._named(one.expected)),
            fix=self._sentence(one.fix),
            files=tuple(sorted(hidden(self._named(file)) for file in one.files)),
        )

    def of_kind(self, kind: Kind) -> Kind:
        """A kind of findings as :meth:`of` leaves it."""
        severity, path, where, problem = kind
        return severity, self._named(path), self._sentence(where), self._sentence(problem)

    def _sentence(self, text: str) -> str:
        return self._pseudonyms.hidden_in_sentence(self._named(text))

    def _named(self, text: str) -> str:
        """A text with other names for the files that need one."""
        for name, shown in self._names:
            if name != shown and name in text:
                text = text.replace(name, shown)
        return text


def _files_of(study: Study) -> list[str]:
    """The names of files and folders that a study file gives, besides the logs."""
    found = []
    for *tables, key in FILE_KEYS:
        inner: Any = study
        for table in tables:
            inner = None if inner is None else getattr(inner, table)
        name = None if inner is None else getattr(inner, key)
        if name is not None:
            found.append(str(name))
    return found


def _tables_of_readers(plan: Plan) -> list[str]:
    """The tables in which a row is of one reader: its line would tell which."""
    study, screening = plan.study, plan.study.screening
    tables = [table.shown for table in plan.facts.tables() if "participant" in table.keys]
    rules = () if screening is None else (screening.trials, screening.participants)
    notes = [rule.notes for rule in rules if rule is not None and rule.notes is not None]
    made = [] if study.lines is None else [study.lines.corrections]
    return [*tables, *(shown_path(study, name) for name in (*notes, *made) if name is not None)]


def hidden_inputs(inputs: Iterable[Mapping[str, Any]], plan: Plan) -> list[dict[str, Any]]:
    """The files that were read, with keyed digests of those that tell of readers.

    Parameters
    ----------
    inputs : iterable of mapping
        Each with ``file``, ``role``, ``sha256``.
    plan : Plan
        The study.

    Returns
    -------
    list of dict
        As they are where the study asks for no pseudonyms. With them, ``hmac_sha256`` takes the
        place of ``sha256``, but for region definitions and tables in which no reader is: who
        guesses what a short table holds could see by a plain digest whether the guess is right.
    """
    pseudonyms = plan.pseudonyms
    if pseudonyms is None:
        return [dict(one) for one in inputs]
    open_tables = {t.shown for t in plan.facts.tables() if "participant" not in t.columns}
    out = []
    for one in inputs:
        named = {**one, "file": pseudonyms.shown_file(one["file"])}
        if one["role"] != "regions" and not (one["role"] == "facts" and one["file"] in open_tables):
            digest = pseudonyms.digest_of(named["sha256"])
            named = {
                ("hmac_sha256" if key == "sha256" else key): (digest if key == "sha256" else value)
                for key, value in named.items()
            }
        out.append(named)
    return out


def in_order_of_readers(
    unrecorded: list[NotRecorded], pseudonyms: Pseudonyms | None
) -> list[NotRecorded]:
    """Trials that were not recorded: with pseudonyms, not in the order of the list of trials.

    Parameters
    ----------
    unrecorded : list of NotRecorded
        In the order of the list.
    pseudonyms : Pseudonyms or None
        Those of the study.

    Returns
    -------
    list of NotRecorded
        By reader, where readers go by pseudonyms.
    """
    if pseudonyms is None:
        return unrecorded
    return sorted(unrecorded, key=lambda one: one.participant)
