"""What a simulated study is made of: who reads what, how, and what goes wrong on the way."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

from tests.simulator.layout import Layout


@dataclass(frozen=True, slots=True)
class Habits:
    """How the simulated readers read.

    The defaults lie in published ranges (Rayner 1998, doi:10.1037/0033-2909.124.3.372): fixations
    of 200-250 ms on average and skewed to the right, forward saccades of 7-9 characters, 10-15 % of
    saccades regressive, short words often skipped and long ones often fixated twice.

    Attributes
    ----------
    median_duration_ms : float
        Median fixation duration of the average reader.
    duration_sigma : float
        Standard deviation of the log of a reader's durations.
    reader_pace_sd : float
        Standard deviation between readers, on the same scale.
    skip_log_odds : float
        Log-odds of skipping a word of no letters ...
    skip_log_odds_per_letter : float
        ... and the change with every letter.
    refixation_per_letter : float
        Probability of another fixation on a word, for every letter beyond the fourth.
    regression_probability : float
        Probability that the eyes go back from a fixation, where no known log-odds govern it.
    undersweep_probability : float
        Probability that a return sweep falls short of the start of the line.
    vertical_sd_px, vertical_limit_px : float
        Vertical scatter around the middle of the line, and its limit.
    drift_sd_px, drift_limit_px : float
        Vertical drift gathered by the end of a trial, and its limit.
    """

    median_duration_ms: float = 208.0
    duration_sigma: float = 0.36
    reader_pace_sd: float = 0.08
    skip_log_odds: float = 1.9
    skip_log_odds_per_letter: float = -0.5
    refixation_per_letter: float = 0.045
    regression_probability: float = 0.07
    undersweep_probability: float = 0.45
    vertical_sd_px: float = 7.0
    vertical_limit_px: float = 20.0
    drift_sd_px: float = 2.0
    drift_limit_px: float = 6.0


@dataclass(frozen=True, slots=True)
class Effects:
    """What governs a regression at the end of a region's first pass, on the log-odds scale.

    Whether the saccade that ends the first pass on one of these regions goes back to an earlier
    region is one draw with exactly this probability. So a logistic model with these terms is the
    true one.

    Attributes
    ----------
    intercepts : mapping of str to float
        Region to its log-odds at the reference levels.
    levels : mapping of str to float
        ``"fit=odd"``, or ``"cue=late:fit=odd"`` for an interaction, to the change in log-odds.
    covariates : mapping of str to (float, float)
        Covariate to its centre and to the change in log-odds per unit.
    reader_sd, item_sd : float
        Standard deviations of the random intercepts.
    reader_slope_sd : mapping of str to float
        Term of ``levels`` to the standard deviation of its random slope over readers.
    durations : mapping of str to float
        Term of ``levels`` to the change in the log of durations on these regions.
    """

    intercepts: Mapping[str, float] = field(default_factory=dict)
    levels: Mapping[str, float] = field(default_factory=dict)
    covariates: Mapping[str, tuple[float, float]] = field(default_factory=dict)
    reader_sd: float = 0.0
    item_sd: float = 0.0
    reader_slope_sd: Mapping[str, float] = field(default_factory=dict)
    durations: Mapping[str, float] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Mess:
    """What goes wrong in a laboratory; shares are probabilities.

    Attributes
    ----------
    blink_share : float
        Share of gaps between two fixations that are blinks; both neighbours carry the flag.
    off_screen_share : float
        Share of gaps in which the reader glances past the edge of the screen.
    before_text_share, after_text_share : float
        Share of trials with a fixation before the text came up (on the starting mark) or after it
        went away.
    scattered : frozenset of (str, int)
        Trials, by participant and number, in which the recording went astray.
    unrecorded : frozenset of (str, int)
        Trials that the list has and the log has not.
    """

    blink_share: float = 0.0
    off_screen_share: float = 0.0
    before_text_share: float = 0.0
    after_text_share: float = 0.0
    scattered: frozenset[tuple[str, int]] = frozenset()
    unrecorded: frozenset[tuple[str, int]] = frozenset()


@dataclass(frozen=True, slots=True)
class PlannedReader:
    """A reader: id, facts (between-readers factors and covariates), log-odds of a right answer."""

    participant: str
    facts: Mapping[str, str | int] = field(default_factory=dict)
    answer_log_odds: float = 2.6


@dataclass(frozen=True, slots=True)
class PlannedTrial:
    """A trial as the experimenter planned it; ``text`` is the key of its layout."""

    participant: str
    trial: int
    item: str
    text: str
    facts: Mapping[str, str] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class StudySpec:
    """A whole study before anybody has read anything."""

    readers: tuple[PlannedReader, ...]
    trials: tuple[PlannedTrial, ...]
    layouts: Mapping[str, Layout]
    effects: Effects = field(default_factory=Effects)
    habits: Habits = field(default_factory=Habits)
    mess: Mess = field(default_factory=Mess)
    screen_px: tuple[int, int] = (1920, 1080)


@dataclass(frozen=True, slots=True)
class SimulatedFixation:
    """One fixation and the truth about it.

    Attributes
    ----------
    fixation : int
        Its number in the trial, from 1.
    onset_ms, duration_ms : int
        In log time; fixations of a reader never overlap.
    x_px, y_px : float
        With one decimal, origin at the top left.
    blink : bool
        Whether a blink touches it.
    word : int or None
        The number of the word that was looked at; none off the text.
    region, region_order : str or None, int or None
        The region of that word; none outside every region.
    line : int or None
        The line that was read, from 1.
    regressive : bool
        Whether the saccade that led here was meant to go back in the text.
    mess : str
        What went wrong: "off_screen", "before_text", "after_text" or "scattered"; else empty.
    """

    fixation: int
    onset_ms: int
    duration_ms: int
    x_px: float
    y_px: float
    blink: bool
    word: int | None
    region: str | None
    region_order: int | None
    line: int | None
    regressive: bool
    mess: str

    @property
    def end_ms(self) -> int:
        """When it ends, in log time."""
        return self.onset_ms + self.duration_ms


@dataclass(frozen=True, slots=True)
class SimulatedTrial:
    """A trial that was read; ``exit_probability`` is the truth behind first-pass regressions."""

    plan: PlannedTrial
    answer_ok: bool
    text_on_ms: int
    text_off_ms: int
    recorded: bool
    exit_probability: Mapping[str, float]
    fixations: tuple[SimulatedFixation, ...]

    @property
    def disturbed(self) -> bool:
        """Whether the recorded places are not where the reader looked."""
        return any(fixation.mess == "scattered" for fixation in self.fixations)


@dataclass(frozen=True, slots=True)
class SimulatedReader:
    """A reader with the true random effects behind the logs."""

    plan: PlannedReader
    intercept: float
    slopes: Mapping[str, float]
    log_pace: float


@dataclass(frozen=True, slots=True)
class SimulatedStudy:
    """A study that was read, and all that is true of it."""

    spec: StudySpec
    readers: tuple[SimulatedReader, ...]
    item_intercepts: Mapping[str, float]
    trials: tuple[SimulatedTrial, ...]

    def trial(self, participant: str, number: int) -> SimulatedTrial:
        """One trial by reader and number."""
        for trial in self.trials:
            if trial.plan.participant == participant and trial.plan.trial == number:
                return trial
        raise KeyError((participant, number))


def true_orders(trial: SimulatedTrial) -> tuple[int | None, ...]:
    """The region order of every fixation of a trial in time order, none outside every region.

    Holds for the recorded coordinates unless the trial is ``disturbed``.
    """
    return tuple(fixation.region_order for fixation in trial.fixations)
