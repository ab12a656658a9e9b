"""The screen of a recording of the open standard (BIDS), held against the study's own."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, cast

from etl.errors import Findings
from etl.parsers.bids_sidecars import Sidecar

if TYPE_CHECKING:
    from etl.study.models import Screen

#: Fields of ``StimulusPresentation`` that a recording of gaze on a screen must have (BIDS 1.11
#: schema, ``rules.checks.eyetrack.EyetrackingStimulusPresentation``).
SCREEN_FIELDS = ("ScreenDistance", "ScreenOrigin", "ScreenResolution", "ScreenSize")
_KEY = "StimulusPresentation"
#: Origins that are understood, and which way y grows from them.
_ORIGINS = {
    frozenset(("top", "left")): ("top-left", "down"),
    frozenset(("bottom", "left")): ("bottom-left", "up"),
    frozenset(("center",)): ("centre", ""),
}
#: How far the study's sizes may be from the sidecar's, in cm: sizes are rounded to a millimetre
#: and the distance of the eye to a centimetre (common practice, no source).
_SIZE_CM, _DISTANCE_CM = 0.1, 1.0
#: How far the sides of the screen may be from square pixels.
_SQUARE = 0.02


@dataclass(frozen=True, slots=True)
class RecordedScreen:
    """A screen as positions are read by it: what the study states goes before the sidecar.

    Attributes
    ----------
    width_px, height_px : int
        Its extent in pixels; 0 where neither says it.
    width_cm, distance_cm : float or None
        Its width and its distance.
    y_axis : {"down", "up"}
        Which way y grows.
    origin : {"top-left", "bottom-left", "centre"}
        Where positions are counted from.
    """

    width_px: int = 0
    height_px: int = 0
    width_cm: float | None = None
    distance_cm: float | None = None
    y_axis: str = "down"
    origin: str = "top-left"


def find_screen(
    sidecar: Sidecar | None, study: Screen | None, unit: str, place: str, findings: Findings
) -> Screen | None:
    """The screen that positions are read by.

    Parameters
    ----------
    sidecar : Sidecar or None
        What is said of the events of the task, where anything is.
    study : Screen or None
        The study's ``[screen]``.
    unit : {"px", "deg"}
        The unit of the positions.
    place : str
        The recording, for messages.
    findings : Findings
        Where contradictions, and what is not said but needed, are recorded.

    Returns
    -------
    Screen or None
        None where a problem was recorded.
    """
    before = findings.count("error")
    told = _Told(sidecar, findings)
    stated = {} if study is None else {k: getattr(study, k) for k in study.model_fields_set}
    stated = {key: value for key, value in stated.items() if value is not None}
    said = told.values()
    if findings.count("error") > before:
        return None
    for key, value in stated.items():
        if key in said and not _same(key, value, said[key]):
            told.refuse(
                _FIELD_OF[key],
                "the sidecar and the study say different things of the screen",
                f"{key} = {value} as in [screen]",
                "correct one of the two, or take the key out of [screen]",
            )
    merged: dict[str, Any] = {**said, **stated}
    if unit == "deg":
        merged.setdefault("origin", "centre")
    _check_complete(merged, study is not None, unit, place, findings)
    if unit == "deg" and told.aspect is not None and "width_px" in merged:
        told.check_square(merged["width_px"] / merged["height_px"])
    if findings.count("error") > before:
        return None
    return cast("Screen", RecordedScreen(**merged))


_FIELD_OF = {
    "width_px": "ScreenResolution",
    "height_px": "ScreenResolution",
    "width_cm": "ScreenSize",
    "distance_cm": "ScreenDistance",
    "origin": "ScreenOrigin",
    "y_axis": "ScreenOrigin",
}


def _same(key: str, one: Any, other: Any) -> bool:
    """Whether two values of a key say the same, as exactly as screens are measured."""
    if key == "width_cm":
        return bool(abs(one - other) <= _SIZE_CM)
    if key == "distance_cm":
        return bool(abs(one - other) <= _DISTANCE_CM)
    return bool(one == other)


def _check_complete(
    merged: dict[str, Any],
    in_study: bool,  # noqa: FBT001
    unit: str,
    place: str,
    findings: Findings,
) -> None:
    """Record what positions need and nothing says."""
    origin = merged.get("origin", "top-left" if in_study else None)
    if origin is None:
        _tell_unsaid("where positions are counted from", "ScreenOrigin", "origin", place, findings)
        return
    if unit == "deg" and origin != "centre":
        findings.error(
            "degrees are counted from the middle of the screen, and the origin is another",
            path=place,
            where=f"{_KEY}.ScreenOrigin",
            found=str(origin),
            expected='["center", "center"]',
            fix="correct the origin, or the units of the positions",
        )
        return
    if origin == "centre" and "y_axis" not in merged and not in_study:
        _tell_unsaid("which way y grows from the middle", "", "y_axis", place, findings)
    needed = ["width_px", "height_px"] if origin != "top-left" else []
    needed += ["width_cm", "distance_cm"] if unit == "deg" else []
    for key in needed:
        if key not in merged:
            _tell_unsaid(f"{key} of the screen", _FIELD_OF[key], key, place, findings)


def _tell_unsaid(what: str, field: str, key: str, place: str, findings: Findings) -> None:
    """Record that nothing says something of the screen."""
    also = f"{field} in {_KEY} of the events' sidecar, or " if field else ""
    findings.error(
        f"nothing says {what}",
        path=place,
        where=f"{_KEY}.{field}" if field else f"screen.{key}",
        expected=f"{also}{key} in [screen] of the study",
        fix=f"add {also}{key} to [screen]",
    )


@dataclass(slots=True)
class _Told:
    """What the sidecar of the events says of the screen."""

    sidecar: Sidecar | None
    findings: Findings
    aspect: float | None = None

    def refuse(self, field: str, problem: str, expected: str, fix: str) -> None:
        """Record that a field cannot be used."""
        assert self.sidecar is not None  # noqa: S101
        path, line = self.sidecar.place(_KEY)
        about = self.sidecar.values[_KEY]
        self.findings.error(
            problem,
            path=path,
            line=line,
            where=f"{_KEY}.{field}",
            found=str(about.get(field) if isinstance(about, dict) else about),
            expected=expected,
            fix=fix,
        )

    def values(self) -> dict[str, Any]:
        """The fields, by the study's own keys; without those that are not said."""
        about = None if self.sidecar is None else self.sidecar.values.get(_KEY)
        if about is None:
            return {}
        if not isinstance(about, dict):
            self.refuse(_KEY, "this is no JSON object", "an object", "correct the sidecar")
            return {}
        said: dict[str, Any] = {}
        resolution = self._pair("ScreenResolution", about, "two whole numbers of pixels")
        if resolution is not None:
            said["width_px"], said["height_px"] = (round(side) for side in resolution)
        size = self._pair("ScreenSize", about, "width and height in metres")
        if size is not None:
            said["width_cm"] = 100.0 * size[0]
            self.aspect = size[0] / size[1]
        distance = about.get("ScreenDistance", "n/a")
        if isinstance(distance, list):
            # Three distances, of which one only can be along the line of sight.
            across = [one for one in distance if one not in (0, "n/a")]
            distance = across[0] if len(across) == 1 else "n/a"
        if _is_length(distance):
            said["distance_cm"] = 100.0 * distance
        elif distance != "n/a":
            self.refuse("ScreenDistance", "this is no distance", "metres", "correct the sidecar")
        if "ScreenOrigin" in about:
            origin = about["ScreenOrigin"]
            known = _ORIGINS.get(frozenset(origin)) if _is_texts(origin) else None
            if known is None:
                self.refuse(
                    "ScreenOrigin",
                    "this origin is not understood",
                    '["top", "left"], ["bottom", "left"] or ["center", "center"]',
                    "count positions from one of these corners, and say so",
                )
            else:
                said["origin"] = known[0]
                said |= {"y_axis": known[1]} if known[1] else {}
        return said

    def check_square(self, ratio: float) -> None:
        """Record that pixels are not square: degrees are turned into pixels by the width alone."""
        assert self.aspect is not None  # noqa: S101
        if abs(self.aspect / ratio - 1) > _SQUARE:
            self.refuse(
                "ScreenSize",
                "the pixels of the screen are not square",
                f"width by height as {ratio:.3f} to 1, as the pixels have it",
                "correct ScreenSize or ScreenResolution",
            )

    def _pair(self, field: str, about: dict[str, Any], expected: str) -> list[float] | None:
        """Two lengths above 0; None where they are not said."""
        value = about.get(field, "n/a")
        if value == "n/a":
            return None
        if isinstance(value, list) and len(value) == 2 and all(map(_is_length, value)):
            return [float(one) for one in value]
        self.refuse(field, "this is no extent of a screen", expected, "correct the sidecar")
        return None


def _is_length(value: Any) -> bool:
    """Whether a value is a number above 0."""
    return isinstance(value, (int, float)) and not isinstance(value, bool) and value > 0


def _is_texts(value: Any) -> bool:
    """Whether a value is a list of texts."""
    return isinstance(value, list) and all(isinstance(one, str) for one in value)
