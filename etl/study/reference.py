"""The reference of keys, made from the models."""

from __future__ import annotations

from typing import Annotated, Any, get_args, get_origin

from pydantic.fields import FieldInfo
from pydantic_core import PydanticUndefined

from etl.study.columns import Column
from etl.study.contrasts import Contrast
from etl.study.shape import choices_in, known_keys, table_in
from etl.study.wording import dotted, toml_text

_KINDS: dict[Any, str] = {
    bool: "true or false",
    int: "whole number",
    float: "number",
    str: "text",
    get_args(Contrast)[0]: "contrasts",
}


def key_reference() -> str:
    """Make a table of all keys of the study file.

    Returns
    -------
    str
        Markdown: key, type, default, meaning; a row for each key, in the order of the file.

    Examples
    --------
    >>> [row] = [row for row in key_reference().splitlines() if "`screen.y_axis`" in row]
    >>> row.split(" | ")[:3]
    ['| `screen.y_axis`', '`"down"`, `"up"`', '`"down"`']
    """
    rows = ["| Key | Type | Default | Meaning |", "|---|---|---|---|"]
    for path, field in known_keys():
        cells = (f"`{dotted(path)}`", _type_of(field), _default_of(field), str(field.description))
        rows.append("| " + " | ".join(cell.replace("|", r"\|") for cell in cells) + " |")
    return "\n".join(rows) + "\n"


def _type_of(field: FieldInfo) -> str:
    """The kind of value, with its bounds or choices."""
    table = table_in(field.annotation)
    if table is not None and issubclass(table, Column):
        units = choices_in(table.model_fields["unit"].annotation)
        if not units:
            return "header of a column"
        return f"header of a column, or `{{ column = …, unit = … }}`; unit {_quoted(units)}"
    if table is not None:
        return "table"
    choices = _quoted(choices_in(field.annotation))
    kind = _kind_of(field.annotation)
    if choices:
        return f"list of {choices}" if kind.startswith("list") else choices
    return kind + _bounds_of(field)


def _kind_of(annotation: Any) -> str:
    """The kind of value of an annotation."""
    origin, inner = get_origin(annotation), get_args(annotation)
    if origin is Annotated:
        return _kind_of(inner[0])
    if origin is tuple and ... not in inner:
        return f"list of {len(inner)} {_kind_of(inner[0])}s"
    if origin is tuple:
        return f"list of {_kind_of(inner[0])}"
    if origin is dict:
        return f"table of {_kind_of(inner[1])}"
    if annotation in _KINDS:
        return _KINDS[annotation]
    return next((_kind_of(part) for part in inner if part is not type(None)), "text")


def _bounds_of(field: FieldInfo) -> str:
    """The bounds of a number."""
    bounds = []
    for limit in field.metadata:
        for name, words in (("gt", "above"), ("ge", "at least"), ("le", "at most")):
            value = getattr(limit, name, None)
            if value is not None:
                bounds.append(f"{words} {value:g}" if value < 1e5 else f"{words} {value}")
    return "".join(f", {bound}" for bound in bounds)


def _default_of(field: FieldInfo) -> str:
    """The default as TOML writes it."""
    if field.is_required():
        return "(needed)"
    default = field.get_default(call_default_factory=True)
    if default is None or default is PydanticUndefined:
        return "(absent)"
    if table_in(field.annotation) is not None:
        return "(its keys' defaults)"
    return f"`{toml_text(default)}`"


def _quoted(choices: tuple[str, ...]) -> str:
    """Choices in quotes, as code."""
    return ", ".join(f"`{toml_text(choice)}`" for choice in choices)
