"""The rules explained on the terminal. In: a rule's name; out: its page, or the list of all."""

from __future__ import annotations

from rich.table import Table
from rich.text import Text

from impcheck.checks.explain import explain, rule_names, summary
from impcheck.report.terminal import console


def print_rules() -> None:
    """Prints every rule with the first line of its page."""
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), show_header=False)
    for name in rule_names():
        table.add_row(Text(name, style="bold"), Text(summary(name)))
    console().print(table)
    console().print(Text("impcheck rules RULE explains one.", style="dim"))


def print_rule(name: str) -> None:
    """Prints the page of one rule. Raises InputError where no rule has that name."""
    console().print(Text(explain(name)))
