"""Two nets that are declared or named differently are one piece of copper.

Measured: whether a piece of copper, over all layers and barrels, carries more than one name from the artwork's attributes or from the
netlist. A net tie (one two-pin part whose pads of two nets overlap, or one pad named for both) is a note, and so are shorts of nets the
board file does not declare.

Why it matters: the two nets are one net. On a signal net nothing else that is said of it holds.

What to do: look at the place where they meet; if the joint is meant, make it a net tie in the layout.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from impcheck.checks.context import Context
from impcheck.checks.finding import Finding
from impcheck.checks.limits import Level

RULE = "short"


@dataclass(frozen=True)
class Limits:
    """Limits of the rule."""

    level: Level


def check_board(limits: Limits, context: Context) -> Iterator[Finding]:
    """Findings of the whole board."""
    declared = {net.name for net in context.nets.declared}
    for fault in context.nets.faults:
        if fault.kind != "short":
            continue
        level = limits.level if fault.declared and not fault.net_tie else "note"
        name = next((net for net in fault.nets if net in declared), fault.nets[0])
        layer = "" if fault.layer is None else context.layer(fault.layer)
        yield Finding(RULE, level, name, layer, fault.at, (fault.at, fault.at), None, None, None, "", fault.message)
