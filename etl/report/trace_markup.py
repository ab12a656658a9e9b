"""Elements of SVG and HTML as text; whatever comes from a study is escaped here and only here."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

from etl.report.trace_glyphs import printable

Attributes = Mapping[str, str | float]


def number(value: float) -> str:
    """A length with two digits after the point at most; the same on every system.

    Examples
    --------
    >>> number(12.0), number(1 / 3), number(-0.001)
    ('12', '0.33', '0')
    """
    shown = f"{value:.2f}".rstrip("0").rstrip(".")
    return "0" if shown == "-0" else shown


def text(words: str) -> str:
    """A text as content of an element.

    Examples
    --------
    >>> text("<b>pears & plums</b>")
    '&lt;b&gt;pears &amp; plums&lt;/b&gt;'
    """
    safe = printable(words)
    return safe.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")


def _attributes(values: Attributes) -> str:
    """Attributes with a blank before each."""
    shown = {
        name: value if isinstance(value, str) else number(value) for name, value in values.items()
    }
    return "".join(
        f' {name}="{text(value).replace(chr(34), "&quot;")}"' for name, value in shown.items()
    )


def tag(name: str, values: Attributes) -> str:
    """An element without content.

    Examples
    --------
    >>> tag("rect", {"x": 1.5, "class": "bar"})
    '<rect x="1.5" class="bar"/>'
    """
    return f"<{name}{_attributes(values)}/>"


def wrapped(name: str, values: Attributes, content: Sequence[str]) -> str:
    """An element with content, which is markup already."""
    return f"<{name}{_attributes(values)}>{''.join(content)}</{name}>"


def straight(x1: float, y1: float, x2: float, y2: float) -> str:
    """The path of a straight line.

    Examples
    --------
    >>> straight(0, 1, 2.5, 3)
    'M0 1 L2.5 3'
    """
    return f"M{number(x1)} {number(y1)} L{number(x2)} {number(y2)}"
