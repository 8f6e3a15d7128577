"""YAML read safely, with the line of every value. In: text; out: a tree of plain text, lists and mappings, each with its 1-based line."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import yaml

from impcheck.artwork.limits import Limits
from impcheck.errors import InputError, Problem, Problems

_DEPTH = 40  # a board file is four levels deep
_LOADER = getattr(yaml, "CSafeLoader", yaml.SafeLoader)  # the same events, faster where libyaml is there
_NULLS = ("", "~", "null", "Null", "NULL")


@dataclass
class Node:
    """One value of a YAML file. Scalars stay text as written, for what they mean is the schema's matter (a net may be called NO or 1e3)."""

    line: int
    value: str | list[Node] | dict[str, Node] | None
    keys: dict[str, int] = field(default_factory=dict)  # line of each key of a mapping
    plain: bool = False  # a scalar without quotes
    size: int = 1  # nodes in it, aliases counted each time
    height: int = 0  # levels below it

    def data(self) -> Any:
        """The same without lines: str, None, list, dict."""
        if isinstance(self.value, list):
            return [item.data() for item in self.value]
        if isinstance(self.value, dict):
            return {key: item.data() for key, item in self.value.items()}
        return self.value

    def native(self) -> Any:
        """The same with unquoted numbers and true/false as such (YAML 1.2 core schema, without its less usual spellings)."""
        if isinstance(self.value, list):
            return [item.native() for item in self.value]
        if isinstance(self.value, dict):
            return {key: item.native() for key, item in self.value.items()}
        if not self.plain or self.value is None:
            return self.value
        if self.value.lower() in ("true", "false"):
            return self.value.lower() == "true"
        for kind in (int, float):
            try:
                return kind(self.value) if self.value.strip("+-")[:1] in "0123456789." else self.value
            except ValueError:
                continue
        return self.value

    def find(self, path: tuple[int | str, ...]) -> tuple[Node, int]:
        """The node deepest along a path of keys and indices, and the line to name for it: of the key for the last step. Steps that are no
        key here are passed over."""
        node, line = self, self.line
        for step in path:
            if isinstance(node.value, dict) and isinstance(step, str) and step in node.value:
                line, node = node.keys[step], node.value[step]
            elif isinstance(node.value, list) and isinstance(step, int) and step < len(node.value):
                node = node.value[step]
                line = node.line
        return node, line


def compose(text: str, file: str, limits: Limits, problems: Problems | None = None) -> Node:
    """The tree of a YAML document.

    Raises InputError, with every mistake found so far, where the text is no YAML, holds a tag, more than one document, more than
    limits.yaml_nodes values with aliases counted each time, or is nested absurdly deep. A key that stands twice, a merge key or one that
    is no word goes to `problems`, and reading goes on without it; where no `problems` are given it raises too.
    """
    composer = _Composer(file, limits)
    try:
        root = composer.document(text)
    except yaml.YAMLError as error:
        mark = getattr(error, "problem_mark", None)
        what = getattr(error, "problem", None) or str(error).split("\n", 1)[0]
        context = getattr(error, "context", None)
        said = f"this is no YAML: {context}, {what}" if context else f"this is no YAML: {what}"
        composer.problems.add(file, mark.line + 1 if mark else 0, said, "check brackets, quotes and indentation here and above")
        raise InputError(composer.problems.found) from None
    if composer.tagged or problems is None:
        composer.problems.raise_if_any()
    else:
        problems.found.extend(composer.problems.found)
    return root


class _Composer:
    def __init__(self, file: str, limits: Limits) -> None:
        self.file, self.limits = file, limits
        self.problems = Problems()
        self.anchors: dict[str, Node] = {}
        self.open: set[str] = set()
        self.count = 0
        self.tagged = False

    def document(self, text: str) -> Node:
        self.events = iter(yaml.parse(text, Loader=_LOADER))
        root: Node | None = None
        for event in self.events:
            if isinstance(event, yaml.DocumentStartEvent) and root is not None:
                raise self.fatal(_line(event), "a second document starts here", "keep one document in the file")
            if isinstance(event, yaml.NodeEvent):
                root = self.node(event, 0)
        return root if root is not None else Node(1, None, plain=True)

    def fatal(self, line: int, message: str, remedy: str) -> InputError:
        return InputError([*self.problems.found, Problem(self.file, line, message, remedy)])

    def node(self, event: Any, depth: int) -> Node:
        line = _line(event)
        if isinstance(event, yaml.AliasEvent):
            return self.alias(event, line, depth)
        self.deepen(depth, line)
        if event.tag is not None and event.tag != "!":
            self.tagged = True
            self.problems.add(self.file, line, f"the tag '{event.tag}' is not allowed", "leave the tag out and write the plain value")
        self.grow(1, line)
        if event.anchor:
            self.open.add(event.anchor)
        if isinstance(event, yaml.ScalarEvent):
            plain = event.style in (None, "")
            node = Node(line, None if plain and event.value in _NULLS else event.value, plain=plain)
        elif isinstance(event, yaml.SequenceStartEvent):
            node = self.sequence(line, depth)
        else:
            node = self.mapping(line, depth)
        if event.anchor:
            self.open.discard(event.anchor)
            self.anchors[event.anchor] = node
        return node

    def alias(self, event: Any, line: int, depth: int) -> Node:
        if event.anchor in self.open:
            raise self.fatal(line, f"the alias '*{event.anchor}' stands inside the value it stands for", "write the value out")
        if event.anchor not in self.anchors:
            raise self.fatal(line, f"the alias '*{event.anchor}' has no anchor above", f"write &{event.anchor} at the value it stands for")
        node = self.anchors[event.anchor]
        self.deepen(depth + node.height, line)
        self.grow(node.size, line)
        return node

    def deepen(self, depth: int, line: int) -> None:
        if depth > _DEPTH:
            raise self.fatal(line, f"values are nested more than {_DEPTH} deep", "a board file is four levels deep")

    def grow(self, nodes: int, line: int) -> None:
        self.count += nodes
        if self.count > self.limits.yaml_nodes:
            said = f"the file holds more than {self.limits.yaml_nodes:,} values, aliases counted each time"
            raise self.fatal(line, said, f"limit yaml_nodes = {self.limits.yaml_nodes:,}")

    def sequence(self, line: int, depth: int) -> Node:
        items: list[Node] = []
        for event in self.events:
            if isinstance(event, yaml.SequenceEndEvent):
                break
            items.append(self.node(event, depth + 1))
        return Node(line, items, size=1 + sum(item.size for item in items), height=1 + max((item.height for item in items), default=0))

    def mapping(self, line: int, depth: int) -> Node:
        values: dict[str, Node] = {}
        keys: dict[str, int] = {}
        size, height = 1, 0
        for event in self.events:
            if isinstance(event, yaml.MappingEndEvent):
                break
            key = self.node(event, depth + 1)
            value = self.node(next(self.events), depth + 1)
            size += key.size + value.size
            height = max(height, value.height)
            if not isinstance(key.value, str):
                self.problems.add(self.file, key.line, "a key must be a word", "write `key: value`")
            elif key.value == "<<":
                self.problems.add(self.file, key.line, "merge keys (<<) are not allowed", "write the keys out")
            elif key.value in values:
                said = f"the key '{key.value}' stands here already in line {keys[key.value]}"
                self.problems.add(self.file, key.line, said, "keep one of the two")
            else:
                values[key.value], keys[key.value] = value, key.line
        return Node(line, values, keys, size=size, height=height + 1)


def _line(event: Any) -> int:
    return int(event.start_mark.line) + 1
