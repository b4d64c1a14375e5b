"""YAML text to a tree whose leaves are all text, with the file and line of every key path.

Nothing is guessed: ``NO``, ``1e5`` and ``-30:14:16`` stay as written until the schema types them. The
file is read as a stream of YAML events into a tree of our own, so that no tag can construct anything and
no nesting can exhaust the stack. Duplicate keys, anchors, aliases, tags, several documents, characters that
steer a terminal or turn the direction of writing, files above 1 MB, nesting deeper than 12 and keys longer
than 100 characters are refused, all mistakes at once.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, TypeAlias

import yaml

from coldglow.errors import DescriptionError, NotFoundError, Problem
from coldglow.units import quoted

Node: TypeAlias = "str | list[Node] | dict[str, Node]"

LARGEST_BYTES = 1_000_000
DEEPEST = 12
LONGEST_KEY = 100
MOST_PROBLEMS = 100
HIDDEN = re.compile(r"[\x00-\x08\x0b-\x1f\x7f-\x84\x86-\x9f\u061c\u200e\u200f\u202a-\u202e\u2066-\u2069]")
_LOADER: Any = getattr(yaml, "CSafeLoader", yaml.SafeLoader)


@dataclass(slots=True)
class Tree:
    """A description as written: nested dicts, lists and texts; `lines` maps key path -> (file, line)."""

    file: str
    data: dict[str, Node] = field(default_factory=dict)
    lines: dict[str, tuple[str, int]] = field(default_factory=dict)

    def locate(self, key: str) -> tuple[str, int]:
        """Return file and line of a key path, or of the nearest enclosing one that was written."""
        while key:
            if key in self.lines:
                return self.lines[key]
            key = key.rpartition(".")[0]
        return self.lines.get("", (self.file, 1))

    def problem(self, key: str, what: str, accepted: str = "") -> Problem:
        """Return a problem that cites where the value of that key path was written."""
        file, line = self.locate(key)
        return Problem(file, line, key, what, accepted)

    def branch(self, key: str) -> Tree:
        """Return the mapping below a key path as a tree of its own (paths relative to it)."""
        node: Any = self.data
        for part in key.split("."):
            node = node[int(part)] if isinstance(node, list) else node[part]
        prefix = key + "."
        lines = {path[len(prefix) :]: at for path, at in self.lines.items() if path.startswith(prefix)}
        lines[""] = self.locate(key)
        return Tree(self.file, node, lines)


def read_tree(path: Path) -> Tree:
    """Return the tree of a file.

    Raises `NotFoundError` when the file cannot be opened, `DescriptionError` with all mistakes of form.
    """
    if path.exists() and not path.is_file() and not path.is_dir():
        raise NotFoundError(f"{path}: a pipe or device cannot be read; save the description as a file first")
    try:
        with path.open("rb") as file:
            content = file.read(LARGEST_BYTES + 1)
    except OSError as error:
        raise NotFoundError(f"{path}: this file cannot be read ({error.strerror})") from None
    return parse_tree(content, str(path))


def parse_tree(content: bytes, file: str) -> Tree:
    """Return the tree of a file's content (see `read_tree`)."""
    if len(content) > LARGEST_BYTES:
        raise DescriptionError([Problem(file, 1, "", "this file is larger than 1 MB", "split it")])
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
        what = f"byte {error.start} is not UTF-8 text"
        raise DescriptionError([Problem(file, line, "", what, "save the file as UTF-8")]) from None
    tree = Tree(file)
    builder = _Builder(tree)
    try:
        builder.build(yaml.parse(text, Loader=_LOADER))
    except yaml.MarkedYAMLError as error:
        mark = error.problem_mark or error.context_mark
        what = f"this is not YAML: {error.problem or error.context}"
        builder.problems.append(Problem(file, mark.line + 1 if mark else 1, "", what))
    except yaml.reader.ReaderError as error:
        line = _line_of_character(text, error)
        builder.problems.append(Problem(file, line, "", _not_allowed(int(error.character))))
    if builder.problems:
        raise DescriptionError(capped(builder.problems))
    return tree


def capped(problems: list[Problem]) -> list[Problem]:
    """Return at most `MOST_PROBLEMS` problems in order of file and line, saying how many are left out."""
    ordered = sorted(dict.fromkeys(problems), key=lambda problem: (problem.file, problem.line))
    if len(ordered) <= MOST_PROBLEMS:
        return ordered
    last = ordered[MOST_PROBLEMS]
    more = f"and {len(ordered) - MOST_PROBLEMS} more mistakes"
    return [*ordered[:MOST_PROBLEMS], Problem(last.file, last.line, "", more)]


def _not_allowed(character: int) -> str:
    return f"the character U+{character:04X} is not allowed here"


def _line_of_character(text: str, error: yaml.reader.ReaderError) -> int:
    found = text.find(chr(error.character)) if isinstance(error.character, int) else -1
    return text.count("\n", 0, max(found, 0)) + 1


class _Builder:
    """Turns the stream of events into the tree; one stack entry per open mapping or list."""

    def __init__(self, tree: Tree) -> None:
        self.tree = tree
        self.problems: list[Problem] = []

    def complain(self, event: Any, key: str, what: str, accepted: str = "") -> None:
        self.problems.append(Problem(self.tree.file, _line(event), key, what, accepted))

    def build(self, events: Iterator[Any]) -> None:
        """Consume all events, up to a mistake after which reading cannot go on."""
        documents = 0
        for event in events:
            if isinstance(event, yaml.DocumentStartEvent):
                documents += 1
                if documents > 1:
                    self.complain(event, "", "a second document begins here", "one description a file")
                    return
            elif isinstance(event, yaml.MappingStartEvent):
                self.check_mark(event, "")
                self.tree.lines[""] = (self.tree.file, _line(event))
                if not self.fill_mapping(events, self.tree.data):
                    return
            elif isinstance(event, yaml.NodeEvent):
                self.complain(event, "", "this is not a description", "`key: value` lines")
                return
        if not self.tree.data and not self.problems:
            self.problems.append(Problem(self.tree.file, 1, "", "this file is empty", "`key: value` lines"))

    def fill_mapping(self, events: Iterator[Any], root: dict[str, Node]) -> bool:
        """Consume events up to the end of the root mapping; False when reading cannot go on."""
        stack: list[tuple[dict[str, Node] | list[Node], str]] = [(root, "")]
        key: str | None = None  # waiting for its value, in a mapping
        while True:
            event = next(events)  # the parser closes what it opened, or raises
            holder, path = stack[-1]
            if isinstance(event, yaml.MappingEndEvent | yaml.SequenceEndEvent):
                stack.pop()
                if not stack:
                    return True
            elif isinstance(holder, dict) and key is None:
                key = self.take_key(event, holder, path)
                if key is None:
                    return False
            else:
                child = _join(path, str(len(holder)) if key is None else key)
                self.check_mark(event, child)
                node = _node_of(event)
                if isinstance(holder, list):
                    self.tree.lines[child] = (self.tree.file, _line(event))
                    holder.append(node)
                else:
                    assert key is not None  # the branch above took it
                    holder[key] = node
                key = None
                if isinstance(node, dict | list):
                    if len(stack) == DEEPEST:
                        what = f"more than {DEEPEST} levels of nesting"
                        self.complain(event, child, what, "a flatter file")
                        return False
                    stack.append((node, child))

    def take_key(self, event: Any, holder: dict[str, Node], path: str) -> str | None:
        """Return the key of the next entry; None when it is none and reading cannot go on."""
        if not isinstance(event, yaml.ScalarEvent) or len(event.value) > LONGEST_KEY:
            self.complain(event, path, "this is not a plain key", "a word, then a colon")
            return None
        self.check_mark(event, path)
        child = _join(path, event.value)
        if event.value in holder:
            first = self.tree.lines[child][1]
            self.complain(event, child, f"this key was already given in line {first}", "give it once")
        self.tree.lines[child] = (self.tree.file, _line(event))
        return str(event.value)

    def check_mark(self, event: Any, key: str) -> None:
        """Complain of anchors, aliases, tags and hidden characters."""
        if isinstance(event, yaml.ScalarEvent) and (hidden := HIDDEN.search(event.value)):
            self.complain(event, key, _not_allowed(ord(hidden[0])), "remove it")
        if isinstance(event, yaml.AliasEvent):
            what = f"aliases such as {quoted(f'*{event.anchor}')} are not read"
            self.complain(event, key, what, "write it out")
        elif event.anchor is not None:
            what = f"anchors such as {quoted(f'&{event.anchor}')} are not read"
            self.complain(event, key, what, "remove it")
        elif event.tag is not None:
            self.complain(event, key, f"tags such as {quoted(event.tag)} are not read", "remove it")


def _node_of(event: Any) -> Node:
    """Return the text of a scalar, an empty text for an alias, a new mapping or list otherwise."""
    if isinstance(event, yaml.ScalarEvent):
        return str(event.value)
    if isinstance(event, yaml.AliasEvent):
        return ""
    return {} if isinstance(event, yaml.MappingStartEvent) else []


def _line(event: Any) -> int:
    return int(event.start_mark.line) + 1


def _join(path: str, part: str) -> str:
    return f"{path}.{part}" if path else part
