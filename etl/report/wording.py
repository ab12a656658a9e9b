"""Numbers and names as the audit page writes them."""

from __future__ import annotations

from collections.abc import Sequence

from markupsafe import Markup, escape

#: Stands where there is no number.
NOTHING = "–"
#: Names longer than this are cut in drawings; the table of readers has them whole.
MOST_LETTERS = 16


def count(number: int) -> str:
    """A whole number, thousands apart.

    Examples
    --------
    >>> count(10744)
    '10,744'
    """
    return f"{number:,}"


def counted(number: int, thing: str) -> str:
    """A number of things, in the right number.

    Examples
    --------
    >>> counted(1, "reader"), counted(24, "reader")
    ('1 reader', '24 readers')
    """
    return f"{number:,} {thing}{'' if number == 1 else 's'}"


def percent(share: float | None) -> str:
    """A share between 0 and 1 in percent, to one place.

    Examples
    --------
    >>> percent(0.0337), percent(None)
    ('3.4%', '–')
    """
    return NOTHING if share is None else f"{number(100 * share, 1)}%"


def number(value: float | None, digits: int, unit: str = "", *, signed: bool = False) -> str:
    r"""A number with its unit.

    Parameters
    ----------
    value : float or None
        The number.
    digits : int
        Places after the point.
    unit : str
        Set apart by a space that does not break.
    signed : bool
        Whether positive numbers bear a sign.

    Examples
    --------
    >>> number(-2.25, 1, "px", signed=True) == "−2.2\N{NO-BREAK SPACE}px"
    True
    """
    if value is None:
        return NOTHING
    # Adding 0 turns -0.0, as rounding leaves it, into 0.0.
    text = f"{round(value, digits) + 0.0:{'+' if signed else ''},.{digits}f}".replace("-", "−")
    return f"{text}\N{NO-BREAK SPACE}{unit}" if unit else text


def probability(p: float) -> str:
    """A p value as papers write it.

    Examples
    --------
    >>> probability(0.0123), probability(0.00001), probability(1.0)
    ('p = .012', 'p < .001', 'p = 1')
    """
    if p < 0.001:
        return "p < .001"
    rounded = f"{p:.3f}"
    return "p = 1" if rounded == "1.000" else f"p = {rounded.removeprefix('0')}"


def name(text: str) -> Markup:
    """A name from the data, escaped, whose direction of writing stays its own.

    Examples
    --------
    >>> name("<b>")
    Markup('<bdi>&lt;b&gt;</bdi>')
    """
    return Markup("<bdi>{}</bdi>").format(text)


def listed(parts: Sequence[str | Markup], most: int = 8) -> Markup:
    """Names in a sentence; those beyond the first few are counted.

    Examples
    --------
    >>> listed(["a", "b", "c"]), listed(["a", "b", "c"], most=1)
    (Markup('a, b and c'), Markup('a and 2 more'))
    """
    shown = [escape(part) for part in parts[:most]]
    if len(parts) > most:
        shown.append(Markup("{} more").format(count(len(parts) - most)))
    if len(shown) < 2:
        return Markup("").join(shown)
    return Markup("{} and {}").format(Markup(", ").join(shown[:-1]), shown[-1])


def cut(text: str) -> str:
    """A name short enough for a drawing.

    Examples
    --------
    >>> cut("P07"), cut("a name that goes on")
    ('P07', 'a name that goe…')
    """
    return text if len(text) <= MOST_LETTERS else text[: MOST_LETTERS - 1] + "…"
