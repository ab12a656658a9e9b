"""Rules about ``[screen]``, ``[regions]`` and ``[lines]``: where a fixation was."""

from __future__ import annotations

from collections.abc import Iterator

from etl.study.lines import WITH_SETTINGS
from etl.study.models import StudyFile
from etl.study.rule import Problem, Rule, quoted, rule

#: Kinds of regions that the text itself gives, by its layout.
TEXT_KINDS = ("marked_text", "words")
_GEOMETRY = ("vertical", "tolerance_px", "overlap")


def absent_positions(study: StudyFile) -> list[str]:
    """Which of x and y the regions need and the log does not have.

    Parameters
    ----------
    study : StudyFile
        The study.

    Returns
    -------
    list of str
    """
    columns, regions = study.logs.columns, study.regions
    if regions.kind == "labels" and columns.x is None and columns.y is None:
        return []
    needed = ["x", "y"] if regions.vertical == "box" else ["x"]
    return [name for name in needed if getattr(columns, name) is None]


@rule("regions.kind", "regions.vertical", "logs.columns.x", "logs.columns.y", "logs.columns.label")
def place_is_known(study: StudyFile) -> Iterator[Problem]:
    """Each fixation has a label or a position, whichever the regions need."""
    columns, regions = study.logs.columns, study.regions
    if regions.kind == "labels" and columns.label is None:
        yield Problem(
            ("logs", "columns"),
            'regions.kind = "labels" needs the label that the log gives each fixation',
            expected="label",
            fix='add label = "…" with the header of the column, or define regions by coordinates',
        )
    by_position = regions.kind != "labels"
    absent = absent_positions(study)
    if absent:
        instead = (
            ', or write kind = "labels" in [regions] if regions are to come from the label'
            if by_position and columns.label is not None
            else ""
        )
        yield Problem(
            ("logs", "columns"),
            f'regions.kind = "{regions.kind}" needs the position of each fixation'
            if by_position
            else "x and y are given together or not at all",
            expected=" and ".join(absent),
            fix="add "
            + " and ".join(f'{name} = "…"' for name in absent)
            + f" with the header of the column{instead}",
        )


@rule("logs.columns.x.unit", "logs.columns.y.unit")
def positions_share_a_unit(study: StudyFile) -> Iterator[Problem]:
    """X and y are both in pixels or both in degrees."""
    x, y = study.logs.columns.x, study.logs.columns.y
    if x is not None and y is not None and x.unit != y.unit:
        yield Problem(
            ("logs", "columns", "y", "unit"),
            f'x is in "{x.unit}" and y is not',
            found=y.unit,
            expected=quoted(x.unit),
            fix="give both the same unit",
        )


def in_degrees(study: StudyFile) -> bool:
    """Whether the log's positions are in degrees.

    Parameters
    ----------
    study : StudyFile
        The study.

    Returns
    -------
    bool
    """
    columns = study.logs.columns
    return any(column is not None and column.unit == "deg" for column in (columns.x, columns.y))


@rule("logs.columns.x.unit", "logs.columns.y.unit", "screen")
def degrees_have_a_screen(study: StudyFile) -> Iterator[Problem]:
    """Degrees become pixels only by the size and the distance of the screen."""
    if in_degrees(study) and study.screen is None:
        yield Problem(
            ("logs", "columns", "x"),
            "positions in degrees need the size and the distance of the screen",
            found="deg",
            expected="[screen]",
            fix="add [screen] with width_px, height_px, width_cm and distance_cm",
        )


def _needed_for_degrees(key: str) -> Rule:
    """Make the rule that angles need a size of the screen, or the distance from it."""

    @rule("logs.columns.x.unit", "logs.columns.y.unit", f"screen.{key}")
    def degrees_have_a_size(study: StudyFile) -> Iterator[Problem]:
        if in_degrees(study) and study.screen is not None and getattr(study.screen, key) is None:
            yield Problem(
                ("screen", key),
                "this key is missing, and positions in degrees need it",
                expected="a number of centimetres",
                fix=f"add {key} = … to [screen]",
            )

    return degrees_have_a_size


degrees_have_a_width = _needed_for_degrees("width_cm")
degrees_have_a_distance = _needed_for_degrees("distance_cm")


@rule("logs.columns.x.unit", "logs.columns.y.unit", "screen.origin")
def degrees_count_from_the_centre(study: StudyFile) -> Iterator[Problem]:
    """An angle is measured from straight ahead, which is the middle of the screen."""
    screen = study.screen
    if screen is None or "origin" not in screen.model_fields_set or not in_degrees(study):
        return
    if screen.origin != "centre":
        yield Problem(
            ("screen", "origin"),
            "positions in degrees are counted from the middle of the screen",
            found=screen.origin,
            expected='"centre"',
            fix='write origin = "centre", or remove the key',
        )


@rule("logs.columns.x.unit", "logs.columns.y.unit", "screen.origin", "screen.y_axis")
def axis_fits_the_origin(study: StudyFile) -> Iterator[Problem]:
    """Y grows into the screen.

    Counted upwards from the top or downwards from the bottom, every point on the screen would
    have a y of zero or below. No log is written like that; one of the two keys is a slip, and
    taken at its word it would put every fixation off the text.
    """
    screen = study.screen
    if screen is None or in_degrees(study) or screen.origin == "centre":
        return
    fitting = "up" if screen.origin == "bottom-left" else "down"
    if screen.y_axis != fitting:
        given = "y_axis" if "y_axis" in screen.model_fields_set else "origin"
        other = "top-left" if screen.origin == "bottom-left" else "bottom-left"
        yield Problem(
            ("screen", given),
            f'with origin = "{screen.origin}" and y_axis = "{screen.y_axis}" no point of the '
            "screen has a y above 0",
            found=getattr(screen, given),
            expected=f'y_axis = "{fitting}" with this origin',
            fix=f'write y_axis = "{fitting}", or origin = "{other}"',
        )


@rule("regions.kind", "regions.layout")
def layout_goes_with_text(study: StudyFile) -> Iterator[Problem]:
    """Text becomes places by the layout; the other kinds bring their own places, or need none."""
    regions = study.regions
    if regions.kind in TEXT_KINDS and regions.layout is None:
        yield Problem(
            ("regions",),
            f'regions.kind = "{regions.kind}" needs to know where the text stood',
            expected="[regions.layout]",
            fix="add [regions.layout] with left_px, top_px, character_width_px and line_height_px",
        )
    if regions.kind not in TEXT_KINDS and regions.layout is not None:
        yield Problem(
            ("regions", "layout"),
            f'a layout does nothing with regions.kind = "{regions.kind}"',
            expected=" or ".join(f'kind = "{kind}"' for kind in TEXT_KINDS),
            fix="remove [regions.layout], or correct kind",
        )


@rule("regions.kind", "regions.vertical", "lines")
def lines_have_a_height(study: StudyFile) -> Iterator[Problem]:
    """Lines are told apart by y, where regions are laid out in lines."""
    if study.lines is None:
        return
    if study.regions.kind == "labels":
        yield Problem(
            ("lines",),
            'regions.kind = "labels" has no lines',
            expected="a kind of regions that have positions",
            fix="remove [lines], or correct kind",
        )
    elif study.regions.vertical == "any":
        yield Problem(
            ("lines",),
            'with regions.vertical = "any" no line can be told from another',
            expected='vertical = "box"',
            fix='remove [lines] for texts of one line, or write vertical = "box"',
        )


@rule("lines.method", *(f"lines.{method}" for method in WITH_SETTINGS))
def line_method_reads_its_own_keys(study: StudyFile) -> Iterator[Problem]:
    """No settings are given of a method that is not asked; the consensus asks all."""
    lines = study.lines
    if lines is None or lines.method == "consensus":
        return
    for method in WITH_SETTINGS:
        if method != lines.method and method in lines.model_fields_set:
            yield Problem(
                ("lines", method),
                f'this means nothing with method = "{lines.method}"',
                expected=f'method = "{method}" or "consensus"',
                fix="correct the method, or remove the table",
            )


@rule("lines.method", "regions.kind")
def text_is_read_by_lines(study: StudyFile) -> Iterator[Problem]:
    """Regions of a laid-out text are found by lines; boxes and polygons may be by themselves."""
    if study.lines is None or study.lines.method != "none" or study.regions.kind not in TEXT_KINDS:
        return
    yield Problem(
        ("lines", "method"),
        f'regions.kind = "{study.regions.kind}" is laid out by lines, so each fixation needs one',
        found="none",
        expected='another method; "none" is for boxes and polygons',
        fix='write method = "consensus", or "nearest"',
    )


@rule("regions.kind", "regions.vertical", "regions.tolerance_px", "regions.overlap")
def labels_have_no_geometry(study: StudyFile) -> Iterator[Problem]:
    """Where the log says which area was fixated, nothing is left to be found by position."""
    if study.regions.kind != "labels":
        return
    for key in _GEOMETRY:
        if key in study.regions.model_fields_set:
            yield Problem(
                ("regions", key),
                'this does nothing with regions.kind = "labels"',
                found=str(getattr(study.regions, key)),
                expected="a kind of regions that have positions",
                fix=f"remove {key}, or correct kind",
            )
