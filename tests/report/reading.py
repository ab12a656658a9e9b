"""A page read back with the standard parser, as a tree that can be asked."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from html.parser import HTMLParser

_VOID = {"meta", "link", "br", "img", "input", "hr", "col", "wbr"}
#: Elements of drawings that are written as closed by themselves arrive as such; those of HTML that
#: may be left open do not occur on the page.


@dataclass
class Node:
    """An element with its attributes, its own words and its children."""

    tag: str
    attributes: dict[str, str] = field(default_factory=dict)
    children: list[Node | str] = field(default_factory=list)

    @property
    def text(self) -> str:
        """All words within, spaces as one."""
        parts = [c if isinstance(c, str) else c.text for c in self.children]
        return " ".join("".join(parts).replace("\N{NO-BREAK SPACE}", " ").split())

    def all(self, tag: str = "", **attributes: str | None) -> Iterator[Node]:
        """Every element within of a tag, with attributes (``_`` for ``-``; None: whatever)."""
        for child in self.children:
            if isinstance(child, str):
                continue
            wanted = {k.rstrip("_").replace("_", "-"): v for k, v in attributes.items()}
            fits = all(
                name in child.attributes and value in (None, child.attributes[name])
                for name, value in wanted.items()
            )
            if fits and tag in ("", child.tag):
                yield child
            yield from child.all(tag, **attributes)

    def one(self, tag: str = "", **attributes: str | None) -> Node:
        """The only such element."""
        found = list(self.all(tag, **attributes))
        assert len(found) == 1, f"{len(found)} elements {tag} {attributes}"
        return found[0]

    def cells(self) -> list[str]:
        """The words of a table row's cells."""
        return [c.text for c in self.children if isinstance(c, Node) and c.tag in ("td", "th")]


class _Builder(HTMLParser):
    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.root = Node("")
        self.open = [self.root]

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        node = Node(tag, {name: value or "" for name, value in attrs})
        self.open[-1].children.append(node)
        if tag not in _VOID:
            self.open.append(node)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.open[-1].children.append(Node(tag, {name: value or "" for name, value in attrs}))

    def handle_endtag(self, tag: str) -> None:
        assert self.open[-1].tag == tag, f"</{tag}> closes <{self.open[-1].tag}>"
        self.open.pop()

    def handle_data(self, data: str) -> None:
        self.open[-1].children.append(data)


def read(page: str) -> Node:
    """The page as a tree; an element that is not closed, or closed twice, fails."""
    builder = _Builder()
    builder.feed(page)
    builder.close()
    assert builder.open == [builder.root]
    return builder.root


def figure(text: str) -> int:
    """A whole number as the page writes it; a dash is 0."""
    return 0 if text == "–" else int(text.replace(",", ""))
