"""Where the words of a text stand on the screen and which region each belongs to.

Written apart from the package under test, from the description of the definition files, so that the
two can be held against each other.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Grid:
    """The character grid a text is laid out on; the space before a word belongs to that word."""

    left_px: int
    top_px: int
    character_width_px: int
    line_height_px: int


@dataclass(frozen=True, slots=True)
class Word:
    """A word on the screen; ``left_px`` includes the space before it, ``right_px`` is exclusive."""

    number: int
    text: str
    line: int
    left_px: int
    right_px: int
    region: str | None
    region_order: int | None

    @property
    def letters(self) -> int:
        """How many characters other than punctuation the word has."""
        return sum(character.isalnum() for character in self.text)


@dataclass(frozen=True, slots=True)
class Layout:
    """A text laid out: its words in reading order, its regions in theirs."""

    grid: Grid
    words: tuple[Word, ...]
    regions: tuple[str, ...]

    @property
    def lines(self) -> int:
        """How many lines the text has."""
        return self.words[-1].line

    def line_centre_px(self, line: int) -> float:
        """The height of the middle of a line, counted from 1."""
        return self.grid.top_px + (line - 0.5) * self.grid.line_height_px

    def word_at(self, x_px: float, y_px: float) -> Word | None:
        """The word whose box holds a point; its left and upper edges belong to it."""
        line = (y_px - self.grid.top_px) // self.grid.line_height_px + 1
        for word in self.words:
            if word.line == line and word.left_px <= x_px < word.right_px:
                return word
        return None


def marked_characters(text: str) -> list[tuple[str, str | None]]:
    r"""Each visible character with the region it is marked for.

    Examples
    --------
    >>> marked_characters("{a: Hi} x")
    [('H', 'a'), ('i', 'a'), (' ', None), ('x', None)]
    """
    characters: list[tuple[str, str | None]] = []
    region: str | None = None
    at = 0
    while at < len(text):
        if text.startswith("{{", at):
            characters.append(("{", region))
            at += 2
        elif text[at] == "{":
            colon = text.index(": ", at)
            region = text[at + 1 : colon]
            at = colon + 2
        elif text[at] == "}" and region is not None:
            region = None
            at += 1
        else:
            characters.append((text[at], region))
            at += 1
    return characters


def lay_out(text: str, grid: Grid, *, every_word: bool = False) -> Layout:
    """Lay out a text with marked regions, or one in which every word is a region of its own.

    Parameters
    ----------
    text : str
        With regions marked as ``{name: words}``, or plain with ``every_word``. Line breaks are line
        breaks on the screen.
    grid : Grid
        Where the first character stands and how large a character is.
    every_word : bool
        Whether each word is a region, named ``w1``, ``w2``, … in reading order.

    Returns
    -------
    Layout

    Raises
    ------
    ValueError
        If a word lies in two regions: the simulator could not say where its reader looks.

    Examples
    --------
    >>> layout = lay_out("{a: Old trees} {b: bend} low", Grid(100, 0, 10, 50))
    >>> [(word.text, word.left_px, word.right_px, word.region_order) for word in layout.words]
    [('Old', 100, 130, 1), ('trees', 130, 190, 1), ('bend', 190, 240, 2), ('low', 240, 280, None)]
    """
    characters = (
        [(character, None) for character in text] if every_word else marked_characters(text)
    )
    regions: list[str] = []
    words: list[Word] = []
    line, column = 1, 0
    start, spelled, marks = 0, "", []
    for character, region in [*characters, ("\n", None)]:
        if not character.isspace():
            if not spelled:
                start = column
            spelled += character
            marks.append(region)
        elif spelled:
            if len(set(marks)) > 1:
                raise ValueError(f"the word {spelled!r} lies in two regions of {text!r}")
            name = f"w{len(words) + 1}" if every_word else marks[0]
            if name is not None and name not in regions:
                regions.append(name)
            order = None if name is None else regions.index(name) + 1
            # The first word of a line has no space before it.
            left = grid.left_px + max(start - 1, 0) * grid.character_width_px
            right = grid.left_px + column * grid.character_width_px
            words.append(Word(len(words) + 1, spelled, line, left, right, name, order))
            spelled, marks = "", []
        column += 1
        if character == "\n":
            line, column = line + 1, 0
    return Layout(grid, tuple(words), tuple(regions))
