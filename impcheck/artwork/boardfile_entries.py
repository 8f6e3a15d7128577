"""Checks the entries of a board file one by one. In: the tree of a YAML file; out: those of the right shape, and a problem a mistake."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Annotated, Any, get_args

from pydantic import BaseModel, TypeAdapter, ValidationError
from pydantic_core import ErrorDetails

from impcheck.artwork import schema
from impcheck.artwork.lines import Node
from impcheck.artwork.names import did_you_mean
from impcheck.errors import Problems

_MODELS: dict[str, type[BaseModel]] = {
    "<mask>": schema.MaskEntry,
    "<copper>": schema.CopperEntry,
    "<dielectric>": schema.DielectricEntry,
    "<net>": schema.NetEntry,
    "<pair>": schema.PairEntry,
    "<place>": schema.PlaceEntry,
    "backdrill": schema.BackdrillEntry,
}
_SECTION_MODELS: dict[str, type[BaseModel]] = {"drills": schema.DrillEntry, "classes": schema.ClassEntry, "groups": schema.GroupEntry}
_CALLED = {
    "<mask>": "this mask", "<copper>": "this copper layer",
    "<dielectric>": "this dielectric", "<net>": "this net", "<pair>": "this pair", "<place>": "this place",
}  # fmt: skip
_EXAMPLES = {
    "impcheck": "impcheck: 1",
    "thickness": "thickness: 35um",
    "er": "er: 4.2",
    "class": "class: and the name of one of the classes",
    "file": "file: board-pth.drl",
    "match": "match: 20ps",
    "keep": "keep: and the copper layer up to which the barrel stays",
    "from": "from: and the outer layer the drill comes from",
    "p": "p: and the name of the positive leg's net",
    "n": "n: and the name of the negative leg's net",
    "x": "x: 12.5mm",
    "y": "y: 30mm",
}  # fmt: skip
_NEEDED = {
    "stackup": "an item of the stackup is `{mask: 20um, ...}`, `{copper: L1, ...}` or `{dielectric: 110um, ...}`",
    "nets": "an entry is `{net: NAME, class: ...}` or `{pair: NAME, p: ..., n: ..., class: ...}`",
}


@dataclass
class Sections:
    """What of a board file has the right shape."""

    root: Node
    singles: dict[str, Any] = field(default_factory=dict)
    entries: dict[str, list[tuple[Any, Node]]] = field(default_factory=dict)
    classes: dict[str, tuple[schema.ClassEntry, int]] = field(default_factory=dict)
    broken: set[str] = field(default_factory=set)  # sections with at least one entry of the wrong shape

    def one(self, key: str) -> str | None:
        """The text of a top-level key that holds one value."""
        value = self.singles.get(key)
        return None if value is None else str(value)

    def many(self, key: str) -> Iterator[tuple[Any, int]]:
        """The entries of a list, with their lines."""
        for item, node in self.entries.get(key, ()):
            yield item, node.line

    def line(self, key: str) -> int:
        """The line of a top-level key, 0 where the file does not have it."""
        return self.root.keys.get(key, 0)

    def keys(self, key: str) -> tuple[str, ...]:
        """The names under a key, of entries with mistakes too."""
        node = self.root.value.get(key) if isinstance(self.root.value, dict) else None
        return tuple(node.value) if node is not None and isinstance(node.value, dict) else ()

    def layer_names(self) -> tuple[str, ...]:
        """The names of the copper layers, of items with mistakes too."""
        node = self.root.value.get("stackup") if isinstance(self.root.value, dict) else None
        items = node.value if node is not None and isinstance(node.value, list) else []
        found = []
        for item in items:
            if isinstance(item.value, dict) and "copper" in item.value:
                name = item.value["copper"].value
                if isinstance(name, str) and name.strip():
                    found.append(name.strip())
        return tuple(found)


def read_sections(root: Node, file: str, problems: Problems) -> Sections:
    """Checks every entry by itself, so that a mistake in one hides none in another."""
    sections = Sections(root)
    checker = _Checker(root, file, problems)
    values = root.value if isinstance(root.value, dict) else {}
    fields = schema.BoardFile.model_fields
    for key in values:
        if key not in fields:
            problems.add(file, root.keys[key], f"unknown key '{key}'", did_you_mean(key, fields))
    if values.get("impcheck") is None:
        problems.add(file, root.line, "the key 'impcheck' is missing", "write `impcheck: 1` in the first line")
    for key, info in fields.items():
        node = values.get(key)
        if node is None or (node.value is None and key != "impcheck"):
            continue
        arguments = get_args(info.annotation)
        if len(arguments) == 2 and arguments[1] is Ellipsis:
            _read_list(sections, checker, key, node, arguments[0])
        elif key == "classes":
            _read_classes(sections, checker, node)
        else:
            kind: Any = Annotated[(info.annotation, *info.metadata)] if info.metadata else info.annotation
            adapter: TypeAdapter[Any] = TypeAdapter(kind)
            ok, value = checker.check(adapter, node, (key,))
            if ok:
                sections.singles[key] = value
            else:
                sections.broken.add(key)
    return sections


def _read_list(sections: Sections, checker: _Checker, key: str, node: Node, kind: Any) -> None:
    if not isinstance(node.value, list):
        sections.broken.add(key)
        line = sections.root.keys[key]
        said = f"'{key}' must be a list, not {schema.described(node.data())}"
        checker.problems.add(checker.file, line, said, "write each entry as `- ...` or all of them in [ ]")
        return
    adapter: TypeAdapter[Any] = TypeAdapter(kind)
    for index, item in enumerate(node.value):
        ok, value = checker.check(adapter, item, (key, index))
        if ok:
            sections.entries.setdefault(key, []).append((value, item))
        else:
            sections.broken.add(key)


def _read_classes(sections: Sections, checker: _Checker, node: Node) -> None:
    if not isinstance(node.value, dict):
        sections.broken.add("classes")
        line = sections.root.keys["classes"]
        said = f"'classes' must be a mapping, not {schema.described(node.data())}"
        checker.problems.add(checker.file, line, said, "write `name: {impedance: 50 ohm, ...}`")
        return
    adapter = TypeAdapter(schema.ClassEntry)
    for name, item in node.value.items():
        if isinstance(item.value, dict) and "use" in item.value:
            said = f"class '{name}' cannot be taken over from elsewhere"
            checker.problems.add(checker.file, item.keys["use"], said, "this version knows no `use`; write the class out")
            continue
        ok, value = checker.check(adapter, item, ("classes", name))
        if ok:
            sections.classes[name] = (value, node.keys[name])


class _Checker:
    """Validates one node at a time and turns what pydantic says into problems with lines and remedies."""

    def __init__(self, root: Node, file: str, problems: Problems) -> None:
        self.root, self.file, self.problems = root, file, problems

    def check(self, adapter: TypeAdapter[Any], node: Node, path: tuple[int | str, ...]) -> tuple[bool, Any]:
        try:
            return True, adapter.validate_python(node.data())
        except ValidationError as error:
            for detail in error.errors(include_url=False):
                self.tell(detail, (*path, *detail["loc"]))
            return False, None

    def tell(self, detail: ErrorDetails, path: tuple[int | str, ...]) -> None:
        node, line = self.root.find(path)
        last = path[-1]
        kind = detail["type"]
        message, remedy = detail["msg"], ""
        if kind == "value_error":
            message = str(detail.get("ctx", {}).get("error", message))
            if last == "class" and isinstance(node.value, dict):
                message, remedy = "a class is named here, not written out", "this version knows no `use`; write the class under `classes:`"
        elif kind == "missing" and isinstance(last, int):
            line = self.root.find(path[:-1])[1]
            message, remedy = f"'{_key(path)}' takes two entries", "write [first, second]"
        elif kind == "too_long":
            message, remedy = f"'{_key(path)}' takes two entries", "write [first, second]"
        elif kind == "missing":
            called = next((_CALLED[step] for step in reversed(path) if step in _CALLED), "this entry")
            message = f"the key '{last}' is missing in {called}"
            remedy = f"write `{_EXAMPLES[last]}`" if last in _EXAMPLES else ""
        elif kind == "extra_forbidden":
            message, remedy = f"unknown key '{last}'", did_you_mean(str(last), self.keys_at(path[:-1]))
        elif kind in ("union_tag_not_found", "union_tag_invalid"):
            remedy = _NEEDED.get(str(path[0]), "")
            if isinstance(node.value, dict):
                message = "this entry says not what it is" if node.value else "this entry is empty"
            else:
                message = f"an entry of '{path[0]}' must be a mapping, not {schema.described(node.data())}"
        elif kind in ("model_type", "model_attributes_type", "dict_type"):
            message, remedy = f"'{last}' must be a mapping, not {schema.described(node.data())}", "write `{key: value, ...}`"
            if isinstance(last, int):
                message = f"an entry of '{path[0]}' must be a mapping, not {schema.described(node.data())}"
        elif kind in ("tuple_type", "list_type"):
            message, remedy = f"'{_key(path)}' must be a list, not {schema.described(node.data())}", "write [first, second]"
        elif kind == "too_short":
            message, remedy = f"'{_key(path)}' is empty", "name at least one"
        elif kind == "string_too_long":
            message, remedy = f"the name '{_key(path)}' is too long", "at most 500 characters"
        self.problems.add(self.file, line, message, remedy)

    def keys_at(self, path: tuple[int | str, ...]) -> list[str]:
        model = next((_MODELS[str(step)] for step in reversed(path) if str(step) in _MODELS), None) or _SECTION_MODELS.get(str(path[0]))
        return [] if model is None else [info.alias or name for name, info in model.model_fields.items()]


def _key(path: tuple[int | str, ...]) -> str:
    """The last key of a path, leaving out indices and tags."""
    return next((step for step in reversed(path) if isinstance(step, str) and not step.startswith("<")), str(path[0]))
