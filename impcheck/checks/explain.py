"""The rules explained. In: a rule's name; out: its page with its limits and their source."""

from __future__ import annotations

import re

from impcheck.artwork.names import did_you_mean
from impcheck.checks.deck import deck_folder
from impcheck.checks.discover import all_rules
from impcheck.errors import InputError, Problem


def rule_names() -> tuple[str, ...]:
    """Every rule."""
    return tuple(all_rules())


def summary(name: str) -> str:
    """The first sentence of a rule's page."""
    return all_rules()[name].page.strip().split("\n", 1)[0]


def explain(name: str) -> str:
    """The page of a rule: what it measures, why it matters, what to do, its limits in the standard deck. Raises InputError where there
    is none."""
    rules = all_rules()
    if name not in rules:
        raise InputError(Problem("rules", 0, f"no rule is called '{name}'", did_you_mean(name, rules)))
    paragraphs = [" ".join(paragraph.split()) for paragraph in rules[name].page.strip().split("\n\n")]
    lines = [name, "", "\n\n".join(paragraphs), "", "Limits of the standard deck:"]
    lines += [f"  {key}: {value}" + (f"   ({source})" if source else "") for key, value, source in limits_with_source(name)]
    return "\n".join(lines)


def limits_with_source(name: str) -> list[tuple[str, str, str]]:
    """Limit, value and the comment behind it in the standard deck."""
    found: list[tuple[str, str, str]] = []
    inside = False
    for line in (deck_folder() / "standard.yaml").read_text(encoding="utf-8").splitlines():
        if re.match(r"  \S", line):
            inside = line.strip() == f"{name}:"
        elif inside and (match := re.match(r"    (\w+): ([^#]*?)\s*(?:#\s*(.*))?$", line)):
            found.append((match[1], match[2], match[3] or ""))
    return found
