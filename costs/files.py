"""Opening the files that the user named, and nothing else: bytes, text, and trees of YAML."""

import hashlib
from dataclasses import dataclass
from pathlib import Path

import yaml

from costs.faults import Fault, Faults, Spot
from costs.located import Entries, Items, Located, Node, Scalar, Source, shortened

__all__ = ["NamedFile", "read_file", "yaml_tree"]

LARGEST_FILE = 10_000_000
"""Bytes. A study of 10,000 variables takes about 2 MB."""
MOST_VALUES = 300_000
"""Values in a file once its aliases are written out: 20,000 variables with fifteen each."""
MOST_REPEATED = 3
"""A long file may become so many times as long by its aliases."""
LONG_FILE = 50_000
"""Values from which on a file is long."""
START = Spot(1, 1)
PLAIN_TAGS = frozenset(["!"]) | frozenset(
    f"tag:yaml.org,2002:{kind}"
    for kind in ("str", "int", "float", "bool", "null", "timestamp", "merge", "value", "seq", "map")
)

# libyaml where PyYAML was built with it: ten times as fast, and it refuses to nest without end.
Loader: type = getattr(yaml, "CSafeLoader", yaml.SafeLoader)


@dataclass(frozen=True, slots=True)
class NamedFile:
    """A file that was read, as bytes."""

    path: Path
    content: bytes

    @property
    def digest(self) -> str:
        """The SHA-256 of the content, as it stands in answers."""
        return f"sha256:{hashlib.sha256(self.content).hexdigest()}"


def read_file(path: Path, faults: Faults) -> NamedFile | None:
    """Return the file at ``path``; None, with a fault, where it cannot be read or is too large."""
    wrong = None
    try:
        if not path.exists():
            wrong = "there is no such file."
        elif not path.is_file():
            wrong = "is a folder, not a file." if path.is_dir() else "is not an ordinary file."
        else:
            # Not by its size, which some files do not tell.
            with path.open("rb") as file:
                content = file.read(LARGEST_FILE + 1)
            if len(content) <= LARGEST_FILE:
                return NamedFile(path, content)
            wrong = f"is larger than {LARGEST_FILE // 10**6} MB."
    except (OSError, ValueError) as error:
        wrong = f"cannot be read: {getattr(error, 'strerror', None) or error}."
    faults.add(fault_of(path, START, wrong, "Name a readable file of a study or a price list."))
    return None


def text_of(file: NamedFile, faults: Faults) -> str | None:
    """Return the text of a UTF-8 file; None, with a fault at the first bad byte, if it is none."""
    try:
        return file.content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        spot = Spot(file.content.count(b"\n", 0, error.start) + 1)
        mend = "Save the file as UTF-8 (in a spreadsheet: 'CSV UTF-8')."
        faults.add(fault_of(file.path, spot, "is not written in UTF-8.", mend))
        return None


def yaml_tree(file: NamedFile, faults: Faults) -> Located | None:
    """Return the tree of a YAML file, aliases shared; None, with a fault, where there is none."""
    text = text_of(file, faults)
    if text is None:
        return None
    builder = TreeBuilder(file.path, faults)
    fault = fault_of_events(file.path, text, builder)
    if fault is not None:
        faults.add(fault)
    if fault is not None or builder.root is None or builder.documents > 1:
        return None
    return Located(builder.root, "", Source(str(file.path), faults))


def fault_of_events(path: Path, text: str, builder: "TreeBuilder") -> Fault | None:
    """Build the tree of a text; return what makes it useless as a whole, if anything does."""
    try:
        for event in yaml.parse(text, Loader=Loader):
            builder.take(event)
    except yaml.YAMLError as error:
        return syntax_fault(path, text, error)
    except RecursionError:  # where PyYAML has no libyaml to refuse it
        wrong = "nests its values too deeply."
        return fault_of(path, START, wrong, "No key needs more than eight levels.")
    if builder.root is None:
        return fault_of(path, START, "is empty.", "'measurewise new' writes a study to fill in.")
    if builder.values > builder.most_values:
        wrong = f"stands for {builder.values:,} values; at most {builder.most_values:,} are read."
        return fault_of(path, START, wrong, "Write the entries without aliases, or fewer of them.")
    return None


class Unfinished:
    """A list or a mapping whose end has not been read yet."""

    __slots__ = ("anchor", "is_mapping", "parts", "spot", "values")

    def __init__(self, event: yaml.CollectionStartEvent) -> None:
        self.spot = spot_of(event)
        self.anchor: str | None = event.anchor
        self.is_mapping = isinstance(event, yaml.MappingStartEvent)
        self.parts: list[Node] = []
        """Items, or keys and values in turn."""
        self.values = 1
        """How many values it stands for so far, aliases written out."""

    def node(self) -> Node:
        """Return the node, now that all of it has been read."""
        parts = tuple(self.parts)
        if self.is_mapping:
            return Entries(self.spot, tuple(zip(parts[::2], parts[1::2], strict=True)))
        return Items(self.spot, parts)


class TreeBuilder:
    """Builds the tree of a file from the events of the YAML reader.

    An alias gives the same node again and counts it anew, so that a file of nested aliases costs no
    more than its length. No tag is ever followed: a study is data, never code.
    """

    def __init__(self, path: Path, faults: Faults) -> None:
        self._path = path
        self._faults = faults
        self._open: list[Unfinished] = []
        self._anchors: dict[str, tuple[Node, int]] = {}
        self.documents = 0
        self._written = 0
        self.root: Node | None = None
        self.values = 0

    @property
    def most_values(self) -> int:
        """The most values that the file may stand for, by how many it writes out itself."""
        return min(MOST_VALUES, max(LONG_FILE, MOST_REPEATED * self._written))

    def take(self, event: yaml.Event) -> None:
        """Take one event."""
        match event:
            case yaml.ScalarEvent():
                self._begin(event)
                scalar = Scalar(spot_of(event), event.value, not event.style)
                self._add(scalar, 1, event.anchor)
            case yaml.CollectionStartEvent():
                self._begin(event)
                self._open.append(Unfinished(event))
            case yaml.CollectionEndEvent():
                done = self._open.pop()
                self._add(done.node(), done.values, done.anchor)
            case yaml.AliasEvent():
                self._add_alias(event)
            case yaml.DocumentStartEvent():
                self.documents += 1
                if self.documents == 2:
                    wrong = "holds a second document, after '---'."
                    self._say(event, wrong, "Put each study into a file of its own.")
            case _:
                pass

    def _add(self, node: Node, values: int, anchor: str | None) -> None:
        if anchor is not None:
            self._anchors[anchor] = node, values
        if self._open:
            self._open[-1].parts.append(node)
            self._open[-1].values += values
        elif self.documents == 1 and not (isinstance(node, Scalar) and node.is_empty):
            self.root, self.values = node, values

    def _add_alias(self, event: yaml.AliasEvent) -> None:
        anchor = event.anchor or ""
        if anchor in self._anchors:
            self._add(*self._anchors[anchor], None)
            return
        wrong = f"uses '*{shortened(anchor)}', which stands for nothing before it."
        self._say(event, wrong, "Write the value itself.")
        self._add(Scalar(spot_of(event), ""), 1, None)

    def _begin(self, event: yaml.ScalarEvent | yaml.CollectionStartEvent) -> None:
        """Count a value, and refuse a tag that asks for more than data."""
        self._written += 1
        tag = event.tag
        if tag is not None and tag not in PLAIN_TAGS:
            shown = shortened(tag.replace("tag:yaml.org,2002:", "!!"))
            wrong = f"carries the tag '{shown}': a study is data, never code."
            self._say(event, wrong, "Leave the tag out.")

    def _say(self, event: yaml.Event, wrong: str, mend: str) -> None:
        self._faults.add(fault_of(self._path, spot_of(event), wrong, mend))


def spot_of(event: yaml.Event) -> Spot:
    """Return where an event begins."""
    mark = event.start_mark
    assert mark is not None, "the reader marks every event"
    return Spot(mark.line + 1, mark.column + 1)


def syntax_fault(path: Path, text: str, error: yaml.YAMLError) -> Fault:
    """Word what the YAML reader stumbled over, with the line where it did."""
    mark = getattr(error, "problem_mark", None)
    problem = getattr(error, "problem", None) or getattr(error, "reason", None) or "cannot be read"
    position = getattr(error, "position", None)
    row = mark.line + 1 if mark else text.count("\n", 0, position or 0) + 1
    mend = (
        "Look at this line and the one above: indentation, a missing colon, an open quote or"
        " bracket."
    )
    return fault_of(path, Spot(row), f"is no YAML here: {problem}.", mend)


def fault_of(path: Path, spot: Spot, wrong: str, mend: str) -> Fault:
    """Return a fault of a file as a whole; its key is ``file``."""
    return Fault(file=str(path), spot=spot, key="file", wrong=wrong, mend=mend)
