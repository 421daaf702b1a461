"""A report read back: HTML text as a tree of elements, end tags that HTML leaves out put in."""

from collections.abc import Iterator
from dataclasses import dataclass, field
from html.parser import HTMLParser

_VOID = {"meta", "input", "br", "hr", "link", "img"}
#: What a start tag ends when it is still open, looking no further out than the second set.
_ENDS: dict[str, tuple[set[str], set[str]]] = {
    "td": ({"td", "th", "p"}, {"tr"}),
    "th": ({"td", "th", "p"}, {"tr"}),
    "tr": ({"tr"}, {"thead", "tbody", "table"}),
    "tbody": ({"thead", "tbody"}, {"table"}),
    "p": ({"p"}, {"div", "td", "details", "section"}),
    "figure": ({"p"}, {"div", "td", "details", "section"}),
    "table": ({"p"}, {"div", "td", "details", "section"}),
    "div": ({"p"}, {"div", "td", "details", "section"}),
    "dl": ({"p"}, {"div", "td", "details", "section"}),
    "h3": ({"p"}, {"div", "details", "section"}),
}


@dataclass
class Element:
    """One element; `parts` are its texts and elements in order."""

    tag: str
    attributes: dict[str, str] = field(default_factory=dict)
    parts: list["str | Element"] = field(default_factory=list)

    @property
    def text(self) -> str:
        """All text inside, blanks folded."""
        return " ".join("".join(self.texts()).split())

    @property
    def classes(self) -> set[str]:
        return set(self.attributes.get("class", "").split())

    def texts(self) -> Iterator[str]:
        for part in self.parts:
            if isinstance(part, str):
                yield part
            else:
                yield from part.texts()

    def all(self, tag: str = "", *, css: str = "") -> list["Element"]:
        """Return the elements inside, at any depth, of a tag and a class."""
        return [e for e in self.walk() if tag in ("", e.tag) and (not css or css in e.classes)]

    def one(self, tag: str = "", *, css: str = "") -> "Element":
        (found,) = self.all(tag, css=css)
        return found

    def by_id(self, name: str) -> "Element":
        (found,) = [e for e in self.walk() if e.attributes.get("id") == name]
        return found

    def children(self, *tags: str) -> list["Element"]:
        return [e for e in self.parts if isinstance(e, Element) and e.tag in tags]

    def walk(self) -> Iterator["Element"]:
        for part in self.parts:
            if isinstance(part, Element):
                yield part
                yield from part.walk()

    def rows(self) -> list[list["Element"]]:
        """Return the cells of a table's body, row by row."""
        return [row.children("td", "th") for row in self.one("tbody").children("tr")]


class _Builder(HTMLParser):
    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.open = [Element("document")]

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        names = [name for name, _ in attrs]
        assert len(names) == len(set(names)), f"an attribute stands twice in <{tag}>: {names}"
        self._imply_ends(tag)
        element = Element(tag, {name: value or "" for name, value in attrs})
        self.open[-1].parts.append(element)
        if tag not in _VOID:
            self.open.append(element)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.handle_starttag(tag, attrs)
        if self.open[-1].tag == tag:
            self.open.pop()

    def handle_endtag(self, tag: str) -> None:
        tags = [e.tag for e in self.open]
        assert tag in tags, f"</{tag}> ends nothing; open are {tags}"
        while self.open.pop().tag != tag:
            pass

    def handle_data(self, data: str) -> None:
        self.open[-1].parts.append(data)

    def _imply_ends(self, tag: str) -> None:
        ends, within = _ENDS.get(tag, (set(), set()))
        for i in range(len(self.open) - 1, 0, -1):
            if self.open[i].tag in within:
                return
            if self.open[i].tag in ends:
                del self.open[i:]
                if tag not in ("td", "th"):
                    return


def parse_page(text: str) -> Element:
    """Return a page as a tree; markup that does not nest is a fault of the page."""
    builder = _Builder()
    builder.feed(text)
    builder.close()
    left = [e.tag for e in builder.open[1:]]
    assert not left, f"never closed: {left}"
    return builder.open[0]
