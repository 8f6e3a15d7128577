"""Which rules there are. In: the modules of this folder; out: every rule, found and never listed by hand."""

from __future__ import annotations

import importlib
import pkgutil
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import cache
from typing import Any

import impcheck.checks
from impcheck.checks.finding import Finding


@dataclass(frozen=True)
class Rule:
    """One rule module: its page, the type of its limits, and its check of one net or of the whole board."""

    name: str
    page: str
    limits: type
    check: Callable[..., Iterator[Finding]] | None  # (track, limits, context)
    check_board: Callable[..., Iterator[Finding]] | None  # (limits, context)


@cache
def all_rules() -> dict[str, Rule]:
    """Name -> rule, by name. A rule is a module of this folder named rule_* that says RULE and Limits."""
    found: dict[str, Rule] = {}
    for module in pkgutil.iter_modules(impcheck.checks.__path__):
        if module.name.startswith("rule_"):
            loaded: Any = importlib.import_module(f"impcheck.checks.{module.name}")
            rule = Rule(loaded.RULE, loaded.__doc__, loaded.Limits, getattr(loaded, "check", None), getattr(loaded, "check_board", None))
            found[rule.name] = rule
    return dict(sorted(found.items()))
