"""Patterns that describe the lines of a log of events."""

from __future__ import annotations

from collections import Counter
from collections.abc import Collection, Mapping

from etl.drafting.event_shapes import Shape
from etl.drafting.event_tokens import NO_NUMBER, Token

_SPECIAL = frozenset("\\.^$*+?{}[]|()")


def pattern_of_line(
    shape: Shape,
    groups: Mapping[int, str],
    *,
    wide: Mapping[int, int] | None = None,
    spelled_out: Collection[int] = (),
) -> str:
    r"""The pattern that describes the lines of a shape.

    Parameters
    ----------
    shape : Shape
        The lines.
    groups : mapping of int to str
        The name of each token that tells something, by its place.
    wide : mapping of int to int, optional
        For tokens whose group begins with a token before them, the place of that one.
    spelled_out : collection of int, optional
        The tokens of which every value is written out.

    Returns
    -------
    str

    Examples
    --------
    >>> from etl.drafting.event_clusters import shapes_of
    >>> shape = shapes_of(["blinked 12 40", "blinked 900 990"])[0]
    >>> pattern_of_line(shape, {2: "onset", 4: "end"})
    '^blinked (?P<onset>\\d+) (?P<end>\\d+)$'
    """
    opened = {begin: groups[place] for place, begin in (wide or {}).items()}
    parts = ["^"]
    for place, token in enumerate(shape.tokens):
        body = _described(shape, place, token, spelled_out)
        if place in opened:
            body = f"(?P<{opened[place]}>{body}"
        if place in groups:
            body = f"{body})" if wide and place in wide else _grouped(groups[place], body, token)
        parts.append(body)
    return "".join(parts) + "$"


def _grouped(name: str, body: str, token: Token) -> str:
    """What a token may be, as a group; quote marks stay outside."""
    if token.kind == "quoted":
        return f'"(?P<{name}>{body[1:-1]})"'
    return f"(?P<{name}>{body})"


def _described(shape: Shape, place: int, token: Token, spelled_out: Collection[int]) -> str:
    """What stands at a place of the lines."""
    quote = '"' if token.kind == "quoted" else ""
    if place in spelled_out:
        values = [escaped(text) for text in dict.fromkeys(shape.cells[place])]
        return f"{quote}(?:{'|'.join(values)}){quote}" if len(values) > 1 else quote + values[0]
    if shape.varies(place):
        return f"{quote}{_body(shape, place)}{quote}"
    if token.kind == "blank":
        return token.text if len(set(shape.cells[place])) == 1 else " +"
    return f"{quote}{escaped(token.text)}{quote}"


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
        return ".*" if "" in cells else ".+"
    if token.kind == "quoted":
        return '[^"]*'
    following = shape.tokens[place + 1] if place + 1 < len(shape.tokens) else None
    joined = following is not None and following.kind == "sign"
    if token.kind == "number":
        marks = cells & NO_NUMBER
        if not marks and not any(set(cell) & set("+-.,") for cell in cells):
            return r"\d+"
        if not marks - {".", "-"}:
            digits = f"0-9.{',' if ',' in Counter(''.join(cells)) else ''}"
            # Of two numbers with a hyphen between them, the first must not take the hyphen.
            hyphen = joined and following is not None and "-" in following.text and not marks
            return f"[-+]?[{digits}]+" if hyphen else f"[-+{digits}]+"
    if joined and following is not None:
        return rf"[^\s{_in_brackets(following.text[0])}]+"
    return r"\S+"


def _in_brackets(sign: str) -> str:
    """A sign as it stands within brackets."""
    if sign == "\t":
        return ""
    return f"\\{sign}" if sign in "\\]^-[&~|" and sign != "|" else sign
