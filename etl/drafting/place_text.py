"""The screen and the regions of a drafted study file: what is proposed, and what is asked."""

from __future__ import annotations

from collections.abc import Mapping

from etl.drafting.layout_guess import Extent
from etl.drafting.meanings import Meaning, Understanding, listed
from etl.drafting.toml_text import StudyText

_ASKED = {
    "width_px": "how wide was the screen, in pixels?",
    "height_px": "how high was the screen, in pixels?",
    "width_cm": "how wide was the screen, in centimetres?",
    "distance_cm": "how far was the screen from the eyes, in centimetres?",
}
_WHICH_WAY = (
    '"down" or "up": do the logs count y downwards or upwards? Counted from the middle, either is '
    "common, and a wrong answer turns the screen upside down"
)


def write_screen(out: StudyText, found: Understanding, extent: Extent | None) -> None:
    """The screen: asked for where positions need it, an example elsewhere.

    Parameters
    ----------
    out : StudyText
        The study file.
    found : Understanding
        How the logs are understood.
    extent : Extent or None
        Where nearly all fixations lie.
    """
    unit = next((one.unit for one in _positions(found) if one.unit), "")
    sizes = [] if extent is None or unit == "deg" else extent.screens()
    perhaps = listed((f"{width} × {height}" for width, height in sizes), "or")
    bounds = (
        ""
        if extent is None
        else f"99 of 100 fixations lie within x {extent.left:,.0f} to {extent.right:,.0f} and y "
        f"{extent.top:,.0f} to {extent.bottom:,.0f}"
    )
    if unit == "deg":
        told = "positions in degrees are counted from the middle of the screen"
        write_centred_screen(out, tuple(_ASKED), {}, told)
    elif extent is not None and extent.centred:
        told = f"{bounds}, as counted from the middle of the screen"
        hint = f" Perhaps it was {perhaps}" if sizes else ""
        write_centred_screen(out, ("width_px", "height_px"), {}, told, hint)
    else:
        out.section("The screen")
        told = "Needed for what lies off the screen and for pictures; pixels are counted from the "
        told += "top left corner, y downwards, unless you say otherwise."
        if bounds:
            told += f" {bounds}"
            told += f": perhaps it was {perhaps}." if sizes else "."
        out.example_table("screen", told)
        width, height = sizes[0] if sizes else (1920, 1080)
        out.example("width_px", width)
        out.example("height_px", height)
        out.example("y_axis", "down", 'or "up", with origin = "bottom-left"')


def write_centred_screen(
    out: StudyText,
    needed: tuple[str, ...],
    known: Mapping[str, tuple[float, str]],
    why: str,
    hint: str = "",
) -> None:
    """The screen where positions are counted from its middle.

    Parameters
    ----------
    out : StudyText
        The study file.
    needed : tuple of str
        The keys that positions need.
    known : mapping of str to tuple of float and str
        Those that are known, with the evidence.
    why : str
        What says that positions are counted from the middle.
    hint : str, optional
        What the size may be.
    """
    out.section("The screen")
    out.begin("screen", "Positions become pixels by the size of the screen.")
    for key in needed:
        if key in known:
            out.guess(key, *known[key])
        else:
            out.ask(key, _ASKED[key] + (hint if key == "width_px" else ""))
    out.guess("origin", "centre", why)
    out.ask("y_axis", _WHICH_WAY)


def _positions(found: Understanding) -> list[Meaning]:
    """The columns of positions, of either eye."""
    own = [*found.eyes.values(), found.meanings]
    return [columns[name] for columns in own for name in ("x", "y") if name in columns]


def write_regions(out: StudyText, found: Understanding, extent: Extent | None) -> None:
    """The regions of the texts: what nobody but the lab knows.

    Parameters
    ----------
    out : StudyText
        The study file.
    found : Understanding
        How the logs are understood.
    extent : Extent or None
        Where nearly all fixations lie.
    """
    positions = _positions(found)
    if extent is not None and (extent.centred or any(one.unit == "deg" for one in positions)):
        extent = None  # what lies where is only known once the screen is
    out.section("The regions of each text")
    out.begin("regions")
    label = found.meanings.get("label")
    out.ask("file", "which file defines the regions of each text?")
    by_label = label is not None and not _positions(found) and not {"x", "y"} & set(found.questions)
    if by_label and label is not None:
        told = f'the logs name the area of each fixation ("{label.header}") and have no coordinates'
        out.guess("kind", "labels", told)
    else:
        also = ' or "labels" (the areas that the logs name)' if label is not None else ""
        out.ask(
            "kind",
            'of which kind is that file? "marked_text" (a text a row, its regions in braces), '
            f'"words" (a text a row, every word a region), "boxes" or "wkt" (a region a row){also}',
        )
        out.example("vertical", "any", "for texts of one line: only x decides")
        out.example("tolerance_px", 20, "a fixation this close to a region is taken to it")
        out.example_table(
            "regions.layout",
            "Needed for the kinds marked_text and words: where the text stood on the screen, in "
            "pixels from the top left corner. Measure it; these numbers are only examples."
            + (
                f" (The leftmost fixations lie {extent.left:,.0f} from the left, the uppermost "
                f"{extent.top:,.0f} from the top.)"
                if extent is not None
                else ""
            ),
        )
        out.example("left_px", 200, "left edge of the first character")
        out.example("top_px", 500, "top of the first line's box")
        out.example("character_width_px", 14, "all characters are equally wide")
        out.example("line_height_px", 60, "from the top of a line to that of the next")
    if not by_label:
        out.example_table("lines", "For texts of several lines: which line a fixation is on.")
        out.example("method", "consensus", "by all published methods together")
