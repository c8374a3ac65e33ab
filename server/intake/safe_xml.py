"""XML from outside, read within bounds: no DOCTYPE, no entities, so much text and no more."""

from collections.abc import Iterator
from dataclasses import dataclass, field
from xml.parsers import expat

from server.lab.refusal import Unacceptable


@dataclass(frozen=True, slots=True)
class Bounds:
    """How large a document may be: bytes, elements, depth of nesting, attributes of an element."""

    most_bytes: int = 2_000_000
    most_elements: int = 60_000
    most_depth: int = 60
    most_attributes: int = 60


@dataclass(slots=True, eq=False)
class Node:
    """An element: its namespace, local name, attributes by local name, own text, children.

    ``seen`` is set by whoever reads it, so that what nobody reads can be told.
    """

    space: str
    name: str
    attributes: dict[str, str]
    parent: "Node | None" = field(repr=False, default=None)
    text: str = ""
    children: list["Node"] = field(default_factory=list)
    seen: bool = False

    def all(self, name: str, space: str | None = None) -> list["Node"]:
        """Return the children of a local name, in order; ``space`` narrows to a namespace."""
        return [
            one
            for one in self.children
            if one.name == name and (space is None or one.space == space)
        ]

    def one(self, name: str, space: str | None = None) -> "Node | None":
        """Return the first child of a local name, or None."""
        found = self.all(name, space)
        return found[0] if found else None

    def walk(self) -> Iterator["Node"]:
        """Yield this element and all below it, in the order of the document."""
        stack = [self]
        while stack:
            node = stack.pop()
            yield node
            stack.extend(reversed(node.children))

    def path(self) -> str:
        """Return the local names from below the root down to here."""
        names: list[str] = []
        node: Node | None = self
        while node is not None and node.parent is not None:
            names.append(node.name)
            node = node.parent
        return "/".join(reversed(names))


def read_xml(data: bytes, *, bounds: Bounds | None = None, what: str = "The file") -> Node:
    """Return the root element of an XML document in UTF-8.

    A DOCTYPE is refused before anything is parsed, so that no entity can be declared, neither one
    that grows nor one that reads a file or a host.

    Raises:
        Unacceptable: too large, not UTF-8, a DOCTYPE, not well-formed, too deep, too many elements.
    """
    limits = bounds or Bounds()
    if len(data) > limits.most_bytes:
        most = limits.most_bytes / 1e6
        says = f"{what} has {len(data) / 1e6:.1f} MB; at most {most:g} MB are read."
        raise Unacceptable(says, field="file")
    try:
        data.decode("utf-8-sig")
    except UnicodeDecodeError as problem:
        says = f"{what} is not UTF-8 text at byte {problem.start}."
        raise Unacceptable(says, field="file") from problem
    upper = data.upper()
    for forbidden in (b"<!DOCTYPE", b"<!ENTITY"):
        if forbidden in upper:
            line = upper.count(b"\n", 0, upper.index(forbidden)) + 1
            says = (
                f"{what} has {forbidden.decode()[2:]} in line {line}; such a declaration can make "
                "a file grow or read other files, so it is not read at all."
            )
            raise Unacceptable(says, field="file")
    return _Reader(limits, what).read(data)


class _Reader:
    """A tree built from expat's events, counted as it grows."""

    def __init__(self, bounds: Bounds, what: str) -> None:
        self._bounds = bounds
        self._what = what
        self._open: list[Node] = []
        self._parts: list[list[str]] = []
        self._root: Node | None = None
        self._elements = 0

    def read(self, data: bytes) -> Node:
        parser = expat.ParserCreate(encoding="utf-8", namespace_separator=" ")
        parser.buffer_text = True
        parser.ordered_attributes = True
        parser.StartElementHandler = self._start
        parser.EndElementHandler = self._end
        parser.CharacterDataHandler = self._text
        # never reached after the search above; kept, for the search reads bytes and this reads XML
        parser.StartDoctypeDeclHandler = self._refuse_declaration
        parser.EntityDeclHandler = self._refuse_declaration
        try:
            parser.Parse(data.removeprefix(b"\xef\xbb\xbf"), True)
        except expat.ExpatError as problem:
            says = (
                f"{self._what} is not well-formed XML: {expat.ErrorString(problem.code)} in line "
                f"{problem.lineno}, column {problem.offset + 1}."
            )
            raise Unacceptable(says, field="file") from problem
        if self._root is None:
            raise Unacceptable(f"{self._what} holds no element.", field="file")
        return self._root

    def _start(self, tag: str, attributes: list[str]) -> None:
        self._elements += 1
        if self._elements > self._bounds.most_elements:
            self._refuse(f"more than {self._bounds.most_elements} elements")
        if len(self._open) >= self._bounds.most_depth:
            self._refuse(f"elements more than {self._bounds.most_depth} deep")
        if len(attributes) > 2 * self._bounds.most_attributes:
            self._refuse(f"an element with more than {self._bounds.most_attributes} attributes")
        space, _, name = tag.rpartition(" ")
        pairs = zip(attributes[::2], attributes[1::2], strict=True)
        own = {key.rpartition(" ")[2]: value for key, value in pairs}
        parent = self._open[-1] if self._open else None
        node = Node(space, name, own, parent)
        if parent is None:
            self._root = node
        else:
            parent.children.append(node)
        self._open.append(node)
        self._parts.append([])

    def _end(self, _tag: str) -> None:
        self._open.pop().text = "".join(self._parts.pop()).strip()

    def _text(self, text: str) -> None:
        self._parts[-1].append(text)

    def _refuse_declaration(self, *_: object) -> None:
        self._refuse("a DOCTYPE or an entity")

    def _refuse(self, why: str) -> None:
        raise Unacceptable(f"{self._what} has {why}; it is not read.", field="file")
