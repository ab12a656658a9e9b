"""Random small studies and random rules for the whole build."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from hypothesis import strategies as st

from tests.screening.building import Trial

FIXATION_LIMITS: dict[str, st.SearchStrategy[str]] = {
    "outside_text_time": st.just("true"),
    "off_screen": st.just("true"),
    "first": st.sampled_from(["1", "2"]),
    "last": st.sampled_from(["1", "2"]),
    "blink": st.just('"drop"'),
    "undersweep": st.just('"drop"'),
    "merge": st.builds(
        "{{ under_ms = {}, within_px = {} }}".format,
        st.sampled_from([60, 80, 150]),
        st.sampled_from([10, 50, 120]),
    ),
    "under_ms": st.sampled_from(["50", "80"]),
    "over_ms": st.sampled_from(["300", "600"]),
}
_REGIONS = st.sampled_from(['["verb"]', '["who", "fruit"]', '["fruit"]'])
TRIAL_LIMITS: dict[str, st.SearchStrategy[str]] = {
    "notes": st.just('"notes.csv"'),
    "fewest_fixations": st.sampled_from(["1", "2", "3"]),
    "line_confidence_under": st.sampled_from(["0.5", "1"]),
    "outside_share_over": st.sampled_from(["0", "0.25", "0.5"]),
    "duration_ms": st.sampled_from(["[0, 900]", "[200, 5000]"]),
    "blink_in_first_pass_of": _REGIONS,
    "no_first_pass_on": _REGIONS,
    "answer_wrong": st.just("true"),
}
READER_LIMITS: dict[str, st.SearchStrategy[str]] = {
    "notes": st.just('"notes.csv"'),
    "correct_share_under": st.sampled_from(["0.5", "0.75"]),
    "lost_trials_share_over": st.sampled_from(["0.3", "0.6"]),
    "fewest_trials_per_cell": st.sampled_from(["1", "2"]),
}
VALUE_LIMITS: dict[str, st.SearchStrategy[str]] = {"outlier_sd": st.sampled_from(["1", "1.2"])}
TABLES = {
    "fixations": FIXATION_LIMITS,
    "trials": TRIAL_LIMITS,
    "participants": READER_LIMITS,
    "values": VALUE_LIMITS,
}
Place = tuple[str, str]


@dataclass(frozen=True)
class Rules:
    """Rules by table and key, with their limits as the study file has them."""

    limits: Mapping[Place, str]

    def __str__(self) -> str:
        lines = []
        for name in TABLES:
            own = [
                f"{key} = {limit}" for (table, key), limit in self.limits.items() if table == name
            ]
            lines += [f"[screening.{name}]", *own]
        return "\n".join([*lines, ""])

    def without(self, *places: Place) -> Rules:
        """The rules but for some."""
        return Rules({place: v for place, v in self.limits.items() if place not in places})

    def limit(self, table: str, key: str) -> str:
        """A limit, empty where the rule is off."""
        return self.limits.get((table, key), "")


@st.composite
def rules(draw: st.DrawFn) -> Rules:
    """Each rule is on or off; those for trials and readers are on less often."""
    limits = {}
    for table, keys in TABLES.items():
        often = (
            st.booleans()
            if table in ("fixations", "values")
            else st.integers(0, 3).map(lambda n: n == 0)
        )
        for key, limit in keys.items():
            if draw(often):
                limits[table, key] = draw(limit)
    return Rules(limits)


@dataclass(frozen=True)
class Lab:
    """A random study: its trials and the experimenter's notes."""

    trials: tuple[Trial, ...]
    notes: str
    sessions: bool


_LOOK = st.builds(
    "{}:{}{}".format,
    st.sampled_from([-5, 10, 50, 58, 100, 104, 112, 150, 190, 205, 250, 262, 310, 330]),
    st.sampled_from([20, 40, 40, 50, 60, 79, 80, 120, 160, 200, 240, 300, 400, 610]),
    st.sampled_from(["", "", "", "", "", "", "b"]),
)
_LOOKS = st.lists(_LOOK, min_size=1, max_size=8).map(" ".join)


@st.composite
def labs(draw: st.DrawFn) -> Lab:
    """Up to three readers with up to four trials each, some of them recorded twice or practice."""
    sessions = draw(st.booleans())
    trials: list[Trial] = []
    noted = []
    for who in draw(st.sampled_from([("R1",), ("R1", "R2"), ("R10", "R2", "R3")])):
        count = draw(st.integers(1, 4))
        for number in range(1, count + 1):
            place = number - 1
            twice = draw(st.integers(0, 5)) == 0
            start_ms = 10 * place * 100_000 + 1000
            trials.append(
                Trial(
                    who,
                    number,
                    tuple(draw(_LOOKS) for _ in range(2 if twice else 1)),
                    item=draw(st.sampled_from(["pear", "pear", "plum"])),
                    cue=draw(st.sampled_from(["early", "late"])),
                    ok=draw(st.sampled_from(["1", "1", "0", ""])),
                    on=draw(st.sampled_from(["", str(start_ms + 100)])),
                    off=draw(st.sampled_from(["", str(start_ms + 900), str(start_ms + 1500)])),
                    block=draw(st.sampled_from(["main", "main", "main", "main", "practice"])),
                    session=draw(st.sampled_from("ab")) if sessions else "",
                )
            )
            if draw(st.integers(0, 5)) == 0:
                noted.append(f"{who},{trials[-1].session},{number},sneezed")
        if draw(st.integers(0, 5)) == 0:
            noted.append(f"{who},,,asleep")
    return Lab(tuple(trials), "\n".join(["participant,session,trial,reason", *noted, ""]), sessions)


def usable(lab: Lab, given: Rules) -> Rules:
    """The rules without notes of one kind where the file has notes of the other kind too.

    A note that no rule asks for is an error, so that both keys name the file, or none.
    """
    both = (("trials", "notes"), ("participants", "notes"))
    if all(place in given.limits for place in both) or lab.notes.count("\n") == 1:
        return given
    return given.without(*both)


def everything(draw_from: Mapping[str, Any] = TABLES) -> list[Place]:
    """All rules in order of application."""
    return [(table, key) for table, keys in draw_from.items() for key in keys]
