"""Patterns that describe the lines of a log of events."""

from __future__ import annotations

from collections import Counter

from etl.drafting.event_shapes import NO_NUMBER, Shape

_SPECIAL = frozenset("\\.^$*+?{}[]|()")


def pattern_of_line(shape: Shape, groups: dict[int, str], *, whole: bool = True) -> str:
    r"""The pattern that describes the lines of a shape.

    Parameters
    ----------
    shape : Shape
        The lines.
    groups : dict of int to str
        The name of each token that tells something, by its place.
    whole : bool
        Whether the pattern describes the whole line; otherwise it ends where the line changes.

    Returns
    -------
    str

    Examples
    --------
    >>> from etl.drafting.event_shapes import shapes_of
    >>> shape = shapes_of(["blinked 12 40", "blinked 900 990"])[0]
    >>> pattern_of_line(shape, {2: "onset", 4: "end"})
    '^blinked (?P<onset>\\d+) (?P<end>\\d+)$'
    >>> pattern_of_line(shape, {}, whole=False)
    '^blinked '
    """
    parts = ["^"]
    for place, token in enumerate(shape.tokens):
        if shape.varies(place):
            if not whole and any(any(c.isalpha() for c in part) for part in parts):
                return "".join(parts)
            body = _body(shape, place)
            name = groups.get(place)
            body = f"(?P<{name}>{body})" if name else body
            parts.append(f'"{body}"' if token.kind == "quoted" else body)
        elif token.kind == "quoted":
            parts.append(f'"{escaped(token.text)}"')
        elif token.kind == "blank":
            alike = len(set(shape.cells[place])) == 1
            parts.append(token.text if alike else " +")
        else:
            parts.append(escaped(token.text))
    return "".join(parts) + "$"


def escaped(text: str) -> str:
    r"""A text as it stands in a pattern.

    Examples
    --------
    >>> escaped("a|b")
    'a\\|b'
    """
    signs = {"\t": r"\t"}
    return "".join(signs.get(sign, f"\\{sign}" if sign in _SPECIAL else sign) for sign in text)


def _body(shape: Shape, place: int) -> str:
    """What a token that changes may be."""
    token, cells = shape.tokens[place], set(shape.cells[place])
    if token.kind == "rest":
        return ".+"
    if token.kind == "quoted":
        return '[^"]*'
    if token.kind == "number":
        marks = cells & NO_NUMBER
        if not marks and not any(set(cell) & set("+-.,") for cell in cells):
            return r"\d+"
        signs = Counter("".join(cells))
        if not marks - {".", "-"}:
            return f"[-+0-9.{',' if signs[','] else ''}]+"
    following = shape.tokens[place + 1] if place + 1 < len(shape.tokens) else None
    if following is not None and following.kind == "sign":
        return f"[^{_in_brackets(following.text)}]+"
    return r"\S+"


def _in_brackets(sign: str) -> str:
    """A sign as it stands within brackets."""
    if sign == "\t":
        return r"\t"
    return f"\\{sign}" if sign in "\\]^-[&~|" and sign != "|" else sign
