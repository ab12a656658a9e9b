"""What the readers of a study add up to, and what is worth a warning."""

from __future__ import annotations

from collections import Counter
from collections.abc import Collection, Sequence

from etl.errors import Findings
from etl.export.accounts import UNITS, account_rows, account_text
from etl.files import Tally
from etl.report import AccountRow, Profiles
from etl.screening import Limits
from etl.screening.ledger import Accounts, columns_of_accounts
from etl.screening.rules import BEFORE, key_of
from etl.session.far_off import FEWEST_PLACED
from etl.session.gallery import Choice
from etl.session.labels import Unlisted, tell_unlisted
from etl.session.line_ledger import notice_lines
from etl.session.listing import first_few
from etl.session.misplaced import refuse_misplaced
from etl.session.ordering import OVERLAP_TOLERATED_MS
from etl.session.reader import ReaderTables
from etl.study import Study

#: More than this share of kept fixations outside every region is worth a warning: it is a sign of
#: a wrong layout (common practice, no source).
OUTSIDE_SHARE = 0.2
#: A rule that takes more than this share of all trials or fixations is worth a warning (common
#: practice, no source).
TAKEN_SHARE = 0.1
#: A rule on fixations that takes more than this share of one reader's is worth a warning that names
#: the reader (our choice: half of them are no matter of taste).
TAKEN_OF_READER = 0.5
#: Numbers that are left out at more than this share of the fixations are a way of numbering, as
#: where blinks are counted too (our choice).
MOST_GAPS = 0.01
#: How many logs or readers a warning lists.
MOST_LISTED = 12


class Totals:
    """Counts and accounts of all readers.

    Parameters
    ----------
    limits : Limits
        The study's rules.
    """

    def __init__(self, limits: Limits) -> None:
        self._rules = columns_of_accounts(limits)
        self.counts: Counter[str] = Counter()
        self.accounts: dict[str, dict[str, Accounts]] = {}
        self.profiles = Profiles()
        self.choice = Choice()
        self._outside: dict[int, tuple[int, int]] = {}
        self.moved: dict[int, Tally] = {}
        self.gaps: dict[int, Tally] = {}
        self._unlisted: dict[str, Unlisted] = {}

    def add(self, tables: ReaderTables) -> None:
        """Take in one reader."""
        self.counts.update({"readers": 1, **tables.counts})
        if tables.accounts:
            self.accounts[tables.participant] = tables.accounts
        if tables.profile is not None:
            self.profiles.add(tables.profile)
        self.choice.add(tables.candidates)
        for file, own in tables.outside.items():
            known = self._outside.get(file, (0, 0))
            self._outside[file] = (known[0] + own[0], known[1] + own[1])
        for file, (count, line) in tables.moved.items():
            self.moved.setdefault(file, Tally()).add(count, line)
        for file, (count, line) in tables.gaps.items():
            self.gaps.setdefault(file, Tally()).add(count, line)
        for label, found in tables.unlisted.items():
            if label in self._unlisted:
                self._unlisted[label].add(found)
            else:
                self._unlisted[label] = found

    def account_rows(self) -> list[list[str | int]]:
        """The accounts of the study, header first."""
        return account_rows(self.accounts, self._rules)

    def audit_rows(self) -> list[AccountRow]:
        """The accounts of the readers for the audit page."""
        return [
            AccountRow(
                reader,
                unit,
                units[unit].read,
                {rule: units[unit].by_rule[rule] for rule in self._rules},
                units[unit].kept,
            )
            for reader, units in self.accounts.items()
            for unit in UNITS
        ]

    def notice_places(
        self, study: Study, labels: Collection[str], logs: Sequence[str], findings: Findings
    ) -> None:
        """Record logs that lie beside the regions, and labels that no region lists.

        Parameters
        ----------
        study : Study
            As loaded.
        labels : collection of str
            The labels that the region definitions list.
        logs : sequence of str
            The names of the logs.
        findings : Findings
            Where errors, warnings and notes are recorded.
        """
        refuse_misplaced(self._outside, logs, findings)
        self._notice_gaps(logs, findings)
        tell_unlisted(self._unlisted, labels, logs, study.regions.file, findings)

    def _notice_gaps(self, logs: Sequence[str], findings: Findings) -> None:
        """Warn of fixations that seem to be missing, by their numbers.

        Where numbers are left out again and again, that is a way of numbering.
        """
        count = sum(tally.count for tally in self.gaps.values())
        if not count or count > MOST_GAPS * self.counts["fixations read"]:
            return
        files = sorted(self.gaps)
        first = self.gaps[files[0]]
        told = [f"{logs[file]} ({self.gaps[file].count:,})" for file in files]
        findings.warning(
            f"numbers of fixations are left out at {count:,} place{'' if count == 1 else 's'}: "
            "rows may be missing",
            path=logs[files[0]],
            line=first.first_line,
            found=first_few(told, MOST_LISTED, of=" logs") if len(told) > 1 else None,
            expected="numbers without a gap within a trial, as elsewhere in these logs",
        )

    def notice(self, study: Study, findings: Findings) -> None:
        """Record what is wrong or doubtful about the study as a whole.

        Parameters
        ----------
        study : Study
            As loaded.
        findings : Findings
            Where an empty result is recorded as an error, doubtful shares as warnings.
        """
        if not self.counts["trials kept"] or not self.counts["fixations kept"]:
            what = "trial" if not self.counts["trials kept"] else "fixation"
            findings.error(
                f"screening leaves no {what} of any reader ({account_text(self.account_rows())})",
                path=study.shown,
                line=study.line_of("screening"),
                where="screening",
                expected=f"some {what}s to be left",
                fix="look at the rule that takes most, and at the units of its limit",
            )
            return
        kept = self.counts["fixations kept"]
        outside = self.counts["fixations kept outside every region"]
        if outside == kept >= FEWEST_PLACED:
            findings.error(
                f"not one of {kept:,} fixations lies in a region",
                path=study.shown,
                line=study.line_of("regions"),
                where="regions",
                fix="check the layout, the boxes or the labels, and the screen's origin; x and y "
                "may be swapped in [logs.columns]",
            )
        elif outside / kept > OUTSIDE_SHARE:
            findings.warning(
                f"{outside / kept:.0%} of the fixations lie outside every region",
                path=study.shown,
                line=study.line_of("regions"),
                where="regions",
                fix="if that is more than the texts leave free, check the layout, the screen's "
                "origin and the boxes",
            )
        bare = self.counts["trials kept without a fixation"]
        if bare:
            findings.warning(
                f"{bare:,} trial{' has' if bare == 1 else 's have'} no fixation left and "
                f"{'is' if bare == 1 else 'are'} kept all the same",
                path=study.shown,
                line=study.line_of("screening", "trials"),
                where="screening.trials",
                fix="leave such trials out by fewest_fixations",
            )
        self._notice_rules(study, findings)
        self._notice_readers(study, findings)
        notice_lines(self.counts, study, findings)
        overlaps = self.counts["overlaps taken for rounding"]
        if overlaps:
            findings.note(
                f"{overlaps:,} fixation{' reaches' if overlaps == 1 else 's reach'} into the next "
                f"one by no more than {OVERLAP_TOLERATED_MS:g} ms, which is taken for rounding",
            )

    def _notice_rules(self, study: Study, findings: Findings) -> None:
        """Warn of rules that take much."""
        for unit in UNITS:
            total = Accounts()
            for own in self.accounts.values():
                total.add(own[unit])
            read = total.read - total.by_rule["skip"]
            for rule in self._rules:
                taken = total.by_rule[rule]
                if rule not in BEFORE and read and taken / read > TAKEN_SHARE:
                    findings.warning(
                        f"the rule {rule} leaves out {taken / read:.0%} of the {unit}",
                        path=study.shown,
                        line=study.line_of(*key_of(rule)),
                        where=".".join(key_of(rule)),
                        found=f"{taken:,} of {read:,}",
                        fix="see in the audit page whom and which conditions it takes them from",
                    )

    def _notice_readers(self, study: Study, findings: Findings) -> None:
        """Warn of rules that take most fixations of single readers."""
        for rule in self._rules:
            if rule in BEFORE or key_of(rule)[1] != "fixations":
                continue
            hit = []
            for reader, units in self.accounts.items():
                own = units["fixations"]
                read = own.read - own.by_rule["skip"]
                if read and own.by_rule[rule] / read > TAKEN_OF_READER:
                    hit.append(f"{reader} ({own.by_rule[rule]:,} of {read:,})")
            if hit:
                findings.warning(
                    f"the rule {rule} takes most fixations of "
                    + ("a reader" if len(hit) == 1 else f"{len(hit):,} readers"),
                    path=study.shown,
                    line=study.line_of(*key_of(rule)),
                    where=".".join(key_of(rule)),
                    found=first_few(hit, MOST_LISTED),
                    fix="check the times and units in the logs and tables of these readers",
                )
