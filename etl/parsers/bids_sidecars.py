"""What the sidecars of the open standard (BIDS) say of a file, with what they inherit."""

from __future__ import annotations

import hashlib
import json
import math
import re
from collections.abc import Collection, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from etl.errors import Findings
from etl.files.steady import ChangedError, read_steady
from etl.files.text_faults import tell_unreadable
from etl.parsers.bids_names import BidsName, Place, described_by

#: What a sidecar must say of any continuous recording, of one of the eyes, and of the events that
#: were found in it (BIDS 1.11 schema, ``rules.sidecars.continuous``: ``Continuous``, ``EyeTrack``,
#: ``PhysioEvents``).
RECORDING_FIELDS = ("SamplingFrequency", "StartTime", "Columns")
EYE_FIELDS = ("RecordedEye", "SampleCoordinateSystem")
EVENTS_FIELDS = ("Columns", "OnsetSource")
#: Columns that only a recording of gaze has.
GAZE = ("x_coordinate", "y_coordinate")
#: The type of a recording of the eyes, and that of one whose sidecar says nothing (schema,
#: ``objects.metadata.PhysioType``).
EYE_TRACK, ANY_TYPE = "eyetrack", "generic"

#: Units of time and of place as sidecars spell them. The standard recommends the symbols of
#: CMIXF-12; the words are common practice, no source.
TIME_UNITS = {
    **dict.fromkeys(("s", "sec", "secs", "second", "seconds"), "s"),
    **dict.fromkeys(("ms", "msec", "msecs", "millisecond", "milliseconds"), "ms"),
    **dict.fromkeys(
        ("us", "\u00b5s", "\u03bcs", "usec", "usecs", "microsecond", "microseconds"), "us"
    ),
}
PLACE_UNITS = {
    **dict.fromkeys(("px", "pix", "pixel", "pixels"), "px"),
    **dict.fromkeys(("deg", "degree", "degrees", "\u00b0"), "deg"),
}


@dataclass(slots=True)
class JsonFile:
    """One sidecar as it lies in its folder.

    Attributes
    ----------
    shown : str
        Its name in messages.
    values : dict
        What it says.
    text : str
        Its text.
    sha256 : str
        Its digest.
    """

    shown: str
    values: dict[str, Any]
    text: str
    sha256: str

    def line_of(self, key: str) -> int | None:
        """The line on which a key first stands."""
        found = re.search(re.escape(json.dumps(key, ensure_ascii=False)) + r"\s*:", self.text)
        return None if found is None else self.text.count("\n", 0, found.start()) + 1


@dataclass(slots=True)
class Sidecar:
    """What all sidecars that apply to a file say of it together.

    Attributes
    ----------
    of : str
        The file that is described, for messages.
    files : list of JsonFile
        From the dataset's own folder to the file's; a later one goes before an earlier one.
    values : dict
        What they say, key by key.
    """

    of: str
    files: list[JsonFile] = field(default_factory=list)
    values: dict[str, Any] = field(default_factory=dict)

    @property
    def parts(self) -> tuple[tuple[str, str, str], ...]:
        """Name, role and digest of each file, for the run record."""
        return tuple((file.shown, "sidecar", file.sha256) for file in self.files)

    def place(self, key: str) -> tuple[str, int | None]:
        """File and line that say something; the file nearest by where none does."""
        for file in reversed(self.files):
            if key in file.values:
                return file.shown, file.line_of(key)
        return self.files[-1].shown, None

    def refuse(self, key: str, problem: str, expected: str, fix: str, findings: Findings) -> None:
        """Record that what is said, or not said, cannot be used."""
        path, line = self.place(key)
        said = self.values.get(key)
        found = None if key not in self.values else json.dumps(said, ensure_ascii=False)
        findings.error(
            problem, path=path, line=line, where=key, found=found, expected=expected, fix=fix
        )

    def require(self, keys: Collection[str], findings: Findings) -> bool:
        """Whether all keys are there; says which are not."""
        lacking = [key for key in keys if key not in self.values]
        for key in lacking:
            self.refuse(
                key,
                f"the sidecar does not say {key}, which the standard requires",
                f"{key} for {self.of}",
                f"add {key} to this file, or to one in a folder above",
                findings,
            )
        return not lacking

    def number(self, key: str, findings: Findings, *, above: float = -math.inf) -> float | None:
        """A number that the sidecar must say."""
        value = self.values.get(key)
        if isinstance(value, (int, float)) and not isinstance(value, bool) and value > above:
            return float(value)
        wanted = "a number" if above == -math.inf else f"a number above {above:g}"
        self.refuse(key, "this is no such number", wanted, "correct the sidecar", findings)
        return None

    def names(self, key: str, needed: Collection[str], findings: Findings) -> tuple[str, ...]:
        """A list of names of columns, each once, some of them needed; empty where it is not so."""
        value = self.values.get(key)
        sound = isinstance(value, list) and all(isinstance(one, str) and one for one in value)
        if not sound or not value:
            self.refuse(
                key,
                "this is no list of names",
                "the name of each column of the file",
                "correct the sidecar",
                findings,
            )
            return ()
        names = tuple(value)
        twice = sorted({name for name in names if names.count(name) > 1})
        lacking = [name for name in needed if name not in names]
        if twice:
            self.refuse(
                key,
                f"two columns have the same name: {', '.join(twice)}",
                "each name once",
                "correct the sidecar",
                findings,
            )
        for name in lacking:
            self.refuse(
                key,
                f'there is no column "{name}"',
                f'a column "{name}" in {self.of}, as the standard has it',
                "correct the names in the sidecar, or write the column",
                findings,
            )
        return () if twice or lacking else names

    def choice(self, key: str, known: Collection[str], fix: str, findings: Findings) -> str | None:
        """One of some words; None where it is another."""
        value = self.values.get(key)
        if isinstance(value, str) and value in known:
            return value
        wanted = " or ".join(f'"{one}"' for one in known)
        self.refuse(key, "this cannot be used", wanted, fix, findings)
        return None

    def unit(self, column: str, known: Mapping[str, str], findings: Findings) -> str | None:
        """The unit of a column; None where the sidecar is silent, or says one not known."""
        about = self.values.get(column)
        said = about.get("Units") if isinstance(about, dict) else None
        if said is None:
            return None
        spelled = str(said).strip()
        unit = known.get(spelled) or known.get(spelled.casefold())
        if unit is None:
            path, line = self.place(column)
            findings.error(
                "the unit is not known",
                path=path,
                line=line,
                where=f"{column}.Units",
                found=spelled,
                expected=" or ".join(f'"{one}"' for one in dict.fromkeys(known.values())),
                fix="correct the unit in the sidecar, or convert the column",
            )
        return unit


def read_sidecar(path: Path, place: Place, findings: Findings) -> Sidecar | None:
    """Read all sidecars that apply to a file.

    Parameters
    ----------
    path : Path
        The file that is described.
    place : Place
        How files are called in messages.
    findings : Findings
        Where sidecars that cannot be read, and two that apply in one folder, are recorded.

    Returns
    -------
    Sidecar or None
        None where a problem was recorded; that there is none at all is one.

    References
    ----------
    BIDS 1.11, Common principles, "The inheritance principle": a sidecar applies to the files of
    its folder and of those below whose names have all its entities; what is nearer goes before
    what is farther, key by key; in one folder at most one applies.
    """
    name = BidsName.of(path.name)
    before = findings.count("error")
    sidecar = Sidecar(place.of(path))
    for own in described_by(path, name.suffix, ".json") if name is not None else ():
        if len(own) > 1:
            findings.error(
                f"two sidecars of one folder describe {sidecar.of}",
                path=place.of(own[1]),
                expected=f"one of each folder for a file; {place.of(own[0])} applies too",
                fix="put what both say into one, or move the more general one a folder up",
            )
        file = read_json(own[0], place.of(own[0]), findings)
        if file is not None:
            sidecar.files.append(file)
            sidecar.values.update(file.values)
    if findings.count("error") > before:
        return None
    if not sidecar.files:
        findings.error(
            "no sidecar describes this file",
            path=sidecar.of,
            expected=f"{path.name.split('.')[0]}.json beside it, or one in a folder above",
            fix="write the sidecar, with the names and the units of the columns",
        )
        return None
    return sidecar


def read_json(path: Path, shown: str, findings: Findings) -> JsonFile | None:
    """Read one sidecar.

    Parameters
    ----------
    path : Path
        The file.
    shown : str
        Its name for messages.
    findings : Findings
        Where it is recorded what is wrong with it.

    Returns
    -------
    JsonFile or None
        None where a problem was recorded.
    """
    line: int | None = None
    try:
        stored = read_steady(path)
        text = stored.decode("utf-8-sig")
        values = json.loads(text, object_pairs_hook=_once, parse_constant=_no_number)
    except json.JSONDecodeError as why:
        line, problem = why.lineno, f"this is no JSON: {why.msg}"
    except ChangedError as why:
        tell_unreadable(path, shown, why, findings)
        return None
    except OSError as why:
        problem = f"the file cannot be read ({why.strerror or type(why).__name__})"
    except UnicodeDecodeError:
        problem = "the text is not valid UTF-8"
    except ValueError as why:
        problem = str(why)
    except RecursionError:
        problem = "the values are nested too deeply"
    else:
        if isinstance(values, dict):
            return JsonFile(shown, values, text, hashlib.sha256(stored).hexdigest())
        problem = "this is no JSON object"
    findings.error(
        problem,
        path=shown,
        line=line,
        expected="a JSON object in UTF-8, each key once",
        fix="correct the sidecar, or copy it again",
    )
    return None


def recording_type(path: Path) -> str:
    """The type of a recording, as far as its sidecars can be read.

    Parameters
    ----------
    path : Path
        The recording.

    Returns
    -------
    str
        Its ``PhysioType``, which is ``"generic"`` where nothing says one. Where no sidecar can be
        read, or it names columns of gaze and no type, ``"eyetrack"``: it is then told what is
        wrong when the recording is read.
    """
    findings = Findings()
    values: dict[str, Any] = {}
    for one in (one for own in described_by(path, "physio", ".json") for one in own):
        file = read_json(one, one.name, findings)
        values.update({} if file is None else file.values)
    columns = values.get("Columns")
    of_gaze = isinstance(columns, list) and all(name in columns for name in GAZE)
    untold = EYE_TRACK if of_gaze or not values else ANY_TYPE
    return EYE_TRACK if findings.failed else str(values.get("PhysioType", untold))


def _once(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    """An object in which each key stands once."""
    values = dict(pairs)
    if len(values) < len(pairs):
        keys = [key for key, _ in pairs]
        twice = next(key for key in keys if keys.count(key) > 1)
        raise ValueError(f'the key "{twice}" stands there twice')
    return values


def _no_number(constant: str) -> Any:
    """Refuse what JSON does not have, though some programs write it."""
    raise ValueError(f"this is no JSON: {constant} is no number")
