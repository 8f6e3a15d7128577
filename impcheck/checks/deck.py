"""Rule decks. In: YAML files of limits and a board's overrides; out: the limits of every rule, typed, with each mistake told by file
and line."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from impcheck import units
from impcheck.artwork.board import Board
from impcheck.artwork.limits import Limits as InputLimits
from impcheck.artwork.lines import Node, compose
from impcheck.artwork.names import did_you_mean
from impcheck.checks.discover import Rule, all_rules
from impcheck.checks.limits import READERS
from impcheck.errors import InputError, Problem, Problems

VERSION = "1"


@dataclass(frozen=True)
class Deck:
    """Limits of every rule, and the rise time taken where a class states none."""

    limits: Mapping[str, Any]  # rule -> its Limits dataclass
    rise_time: float  # s


def deck_folder() -> Path:
    """Where the shipped decks lie: inside the installed package, or beside it in a source tree."""
    here = Path(__file__).parent.parent
    return next(folder for folder in (here / "rules", here.parent / "rules") if (folder / "standard.yaml").is_file())


def load_deck(board: Board) -> Deck:
    """The decks a board names, one over the other, and its own overrides. Raises InputError with every mistake found."""
    problems = Problems()
    values: dict[str, dict[str, tuple[str, str, int]]] = {}
    rise = ("500ps", "", 0)
    for name in board.decks:
        path = Path(name) if Path(name).is_absolute() else deck_folder() / f"{name}.yaml"
        if not path.is_file():
            known = sorted(found.stem for found in deck_folder().glob("*.yaml"))
            problems.add(board.file, 0, f"rule deck '{name}' is nowhere", did_you_mean(name, known))
            continue
        try:
            deck, deck_rise = _read(str(path), f"rules/{path.name}" if not Path(name).is_absolute() else path.name, problems)
        except InputError as error:
            problems.take(error)
            continue
        rise = deck_rise or rise
        for rule, limits in deck.items():
            values.setdefault(rule, {}).update(limits)
    for override in board.overrides:
        values.setdefault(override.rule, {}).update(
            {key: (_written(value), board.file, override.line) for key, value in override.limits.items()}
        )
        if override.rule not in all_rules():
            problems.add(board.file, override.line, f"rule '{override.rule}' is not known", did_you_mean(override.rule, all_rules()))
            del values[override.rule]
    whole = not problems.found  # what a deck that could not be read leaves out is no mistake of its own
    rules = {name: _typed(rule, values.get(name, {}), whole, problems) for name, rule in all_rules().items()}
    rise_time = 0.0
    try:
        rise_time = units.time(rise[0], "rise_time")
        if rise_time <= 0:
            raise ValueError(f"rise_time '{rise[0]}' is not over zero")
    except ValueError as error:
        problems.add(rise[1], rise[2], str(error), "write a time, as in 500ps")
    problems.raise_if_any()
    return Deck(rules, rise_time)


def _written(value: object) -> str:
    return f"{value:g}" if isinstance(value, float) else str(value)


def _tree(path: str, file: str) -> Node:
    limits = InputLimits()
    try:
        if Path(path).stat().st_size > limits.board_file_bytes:
            raise InputError(Problem(file, 0, "the rule deck is too big", f"limit board_file_bytes = {limits.board_file_bytes:,}"))
        return compose(Path(path).read_text(encoding="utf-8"), file, limits)
    except (OSError, UnicodeDecodeError):
        raise InputError(Problem(file, 0, "the rule deck cannot be read", "name a YAML file of limits")) from None


def _read(path: str, file: str, problems: Problems) -> tuple[dict[str, dict[str, tuple[str, str, int]]], tuple[str, str, int] | None]:
    root = _tree(path, file)
    if not isinstance(root.value, dict) or "impcheck-rules" not in root.value or root.value["impcheck-rules"].data() != VERSION:
        problems.add(file, root.line, "this is no rule deck of format 1", f"begin it with impcheck-rules: {VERSION}")
        return {}, None
    for key in root.value.keys() - {"impcheck-rules", "rise_time", "rules"}:
        problems.add(file, root.keys[key], f"'{key}' is not known in a rule deck", did_you_mean(key, ["rise_time", "rules"]))
    rise = None
    if "rise_time" in root.value:
        rise = (str(root.value["rise_time"].data()), file, root.keys["rise_time"])
    found: dict[str, dict[str, tuple[str, str, int]]] = {}
    rules = root.value.get("rules")
    if rules is None or not isinstance(rules.value, dict):
        said = "write rules: and below it a mapping of limits for each"
        problems.add(file, root.keys.get("rules", root.line), "the deck holds no rules", said)
        return found, rise
    for name, node in rules.value.items():
        line = rules.keys[name]
        if name not in all_rules():
            problems.add(file, line, f"rule '{name}' is not known", did_you_mean(name, all_rules()))
        elif not isinstance(node.value, dict):
            problems.add(file, line, f"the limits of rule '{name}' are no mapping", "write each limit as `name: value` below the rule")
        else:
            found[name] = {key: (str(value.data()), file, node.keys[key]) for key, value in node.value.items()}
    return found, rise


def _typed(rule: Rule, values: dict[str, tuple[str, str, int]], whole: bool, problems: Problems) -> Any:
    fields = {field.name: str(field.type) for field in dataclasses.fields(rule.limits)}
    found: dict[str, Any] = {}
    for key, (text, file, line) in values.items():
        if key not in fields:
            problems.add(file, line, f"rule {rule.name} has no limit '{key}'", did_you_mean(key, fields))
            continue
        try:
            found[key] = READERS[fields[key]](text)
        except ValueError as error:
            problems.add(file, line, f"{rule.name}: {key}: {error}", f"for example {_example(fields[key])}")
    missing = fields.keys() - values.keys()
    if missing and whole:
        said = f"no deck gives the limit '{min(missing)}' of the rule {rule.name}"
        problems.add("rules", 0, said, "put the deck `standard` first in the board file's rules")
    return rule.limits(**found) if not fields.keys() - found.keys() else None


def _example(kind: str) -> str:
    return {"Length": "0.5mm or 5% rise", "Share": "10%", "Factor": "1.0", "Level": "warning"}[kind]
