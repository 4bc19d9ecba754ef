"""Opening the files that the user named, and nothing else: bytes, text and the tree of a YAML file."""

import hashlib
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import yaml

from costs.faults import Fault, Faults, Spot
from costs.located import Entries, Items, Located, Node, Scalar, Source, shortened

__all__ = ["NamedFile", "read_file", "yaml_tree"]

LARGEST_FILE = 10_000_000
"""Bytes. A study of 10,000 variables takes about 2 MB."""
MOST_VALUES = 1_000_000
"""Values in a file once its aliases are written out; a file of the largest size holds fewer."""
START = Spot(1, 1)
PLAIN_TAGS = frozenset(
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
        elif path.stat().st_size > LARGEST_FILE:
            wrong = f"is larger than {LARGEST_FILE // 10**6} MB."
        else:
            return NamedFile(path, path.read_bytes())
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
    try:
        root = yaml.compose(text, Loader=Loader)
        if root is None:
            faults.add(
                fault_of(
                    file.path, START, "is empty.", "'measurewise new' writes a study to fill in."
                )
            )
            return None
        node, values = converted(root, {})
    except yaml.YAMLError as error:
        faults.add(syntax_fault(file.path, text, error))
        return None
    except RecursionError:
        faults.add(
            fault_of(
                file.path,
                START,
                "nests its values too deeply.",
                "No key needs more than eight levels.",
            )
        )
        return None
    if values > MOST_VALUES:
        wrong = f"stands for more than {MOST_VALUES:,} values once its aliases are written out."
        faults.add(fault_of(file.path, START, wrong, "Write the entries without aliases."))
        return None
    source = Source(str(file.path), faults)
    for tagged in tags(root):
        faults.add(tag_fault(file.path, tagged))
    return Located(node, "", source)


def converted(node: yaml.Node, done: dict[int, tuple[Node, int]]) -> tuple[Node, int]:
    """Return the tree of a YAML node, and how many values it stands for.

    An alias gives the same node again, which is converted once and counted each time: a file of
    nested aliases costs no more than its length.
    """
    if id(node) in done:
        return done[id(node)]
    spot = Spot(node.start_mark.line + 1, node.start_mark.column + 1)
    match node:
        case yaml.ScalarNode():
            result: tuple[Node, int] = Scalar(spot, node.value, node.style is None), 1
        case yaml.SequenceNode():
            items = [converted(item, done) for item in node.value]
            result = (
                Items(spot, tuple(item for item, _ in items)),
                1 + sum(count for _, count in items),
            )
        case _:
            pairs = [(converted(key, done), converted(value, done)) for key, value in node.value]
            result = (
                Entries(spot, tuple((key, value) for (key, _), (value, _) in pairs)),
                1 + sum(one + other for (_, one), (_, other) in pairs),
            )
    done[id(node)] = result
    return result


def tags(root: yaml.Node) -> Iterator[yaml.Node]:
    """Return every node with a tag that is no plain value, such as ``!!python/object``."""
    stack, seen = [root], {id(root)}
    while stack:
        node = stack.pop()
        if node.tag not in PLAIN_TAGS:
            yield node
        below = node.value if isinstance(node, yaml.SequenceNode) else ()
        if isinstance(node, yaml.MappingNode):
            below = [each for pair in node.value for each in pair]
        for each in below:
            if id(each) not in seen:
                seen.add(id(each))
                stack.append(each)


def tag_fault(path: Path, node: yaml.Node) -> Fault:
    """Word a tag that asks for more than data."""
    tag = shortened(node.tag.replace("tag:yaml.org,2002:", "!!"))
    wrong = f"carries the tag '{tag}': a study is data, never code."
    return fault_of(path, Spot(node.start_mark.line + 1), wrong, "Leave the tag out.")


def syntax_fault(path: Path, text: str, error: yaml.YAMLError) -> Fault:
    """Word what the YAML reader stumbled over, with the line where it did."""
    mark = getattr(error, "problem_mark", None)
    problem = getattr(error, "problem", None) or getattr(error, "reason", None) or "cannot be read"
    position = getattr(error, "position", None)
    row = mark.line + 1 if mark else text.count("\n", 0, position or 0) + 1
    mend = "Look at this line and the one above: indentation, a missing colon, an open quote or bracket."
    return fault_of(path, Spot(row), f"is no YAML here: {problem}.", mend)


def fault_of(path: Path, spot: Spot, wrong: str, mend: str) -> Fault:
    """Return a fault of a file as a whole; its key is ``file``."""
    return Fault(file=str(path), spot=spot, key="file", wrong=wrong, mend=mend)
